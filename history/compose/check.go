package compose

import (
	"fmt"
	"io/fs"
	"maps"
	"slices"
	"strings"
)

// check refuses, before anything is written, a history that a repository cannot
// hold.
func check(history []Commit) error {
	if len(history) == 0 {
		return fmt.Errorf("%w: it has no commit", ErrHistory)
	}
	for i, c := range history {
		for _, p := range c.Parents {
			if p < 0 || p >= i {
				return fmt.Errorf("%w: commit %d: parent %d is not the number of an earlier commit", ErrHistory, i, p)
			}
		}
		if err := checkPaths(c.Files); err != nil {
			return fmt.Errorf("%w: commit %d: %w", ErrHistory, i, err)
		}
	}
	return nil
}

// checkPaths refuses paths that do not lead to a file below the folder, and a
// name that is both a file's and a folder's. Of several faults it is always the
// same one that is named.
func checkPaths(files map[string]string) error {
	for _, name := range slices.Sorted(maps.Keys(files)) {
		if name == "." || !fs.ValidPath(name) || strings.ContainsRune(name, 0) {
			return fmt.Errorf("%q is not the path of a file", name)
		}
		for part := range strings.SplitSeq(name, "/") {
			if strings.EqualFold(part, ".git") {
				return fmt.Errorf("%q would lie in a git folder", name)
			}
		}
		for i, r := range name {
			if r != '/' {
				continue
			}
			if _, both := files[name[:i]]; both {
				return fmt.Errorf("%q is to be a file, and a folder with %q in it", name[:i], name)
			}
		}
	}
	return nil
}
