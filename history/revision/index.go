package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/go-git/go-git/v5/plumbing/format/index"
)

const maxIndexFile = 1 << 30 // bytes

// readIndex reads the list of tracked files, in no particular order.
func (r *Repo) readIndex() ([]*index.Entry, error) {
	data, err := readBounded(filepath.Join(r.at.gitDir, "index"), maxIndexFile)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, corrupt("index cannot be read", err)
	}
	idx := &index.Index{}
	err = index.NewDecoder(bytes.NewReader(data)).Decode(idx)
	switch {
	case errors.Is(err, index.ErrUnknownExtension):
		return nil, &Error{
			Kind: ErrUnsupported, Text: "the index is split or sparse, which is not supported",
			Hint: "run `git update-index --no-split-index` or `git sparse-checkout reapply --no-sparse-index`",
		}
	case errors.Is(err, index.ErrInvalidChecksum) && bytes.HasSuffix(data, make([]byte, hashSize)):
		// index.skipHash leaves the checksum zero.
	case err != nil:
		return nil, corrupt("index cannot be read", err)
	}
	return idx.Entries, nil
}

// Tracked says whether a path is a file that Git tracks, that is, one in the
// index. The path is absolute and need not exist; links in it are followed where
// they do. In a bare repository, and for a path outside the working tree, it is
// false.
func (r *Repo) Tracked(name string) (bool, error) {
	if !filepath.IsAbs(name) {
		return false, fmt.Errorf("path %q is not absolute", name)
	}
	if r.at.workTree == "" {
		return false, nil
	}
	var inside []string // as the index would name it
	for _, path := range []string{name, realPath(name)} {
		rel, err := filepath.Rel(r.at.workTree, realParent(path))
		if err != nil || !filepath.IsLocal(rel) {
			continue // on another volume, or outside
		}
		inside = append(inside, filepath.ToSlash(rel))
	}
	// Most ledgers lie outside or in .git, where Git tracks nothing: that needs no
	// look at the index, which is large.
	inside = slices.DeleteFunc(inside, func(rel string) bool {
		first, _, _ := strings.Cut(rel, "/")
		return strings.EqualFold(first, ".git")
	})
	if len(inside) == 0 {
		return false, nil
	}
	entries, err := r.readIndex()
	if err != nil {
		return false, err
	}
	fold := r.config.flag("core.ignorecase", false)
	for _, rel := range inside {
		for _, e := range entries {
			if e.Name == rel || fold && strings.EqualFold(e.Name, rel) {
				return true, nil
			}
		}
	}
	return false, nil
}

// realPath follows the links of a path as far as it exists.
func realPath(name string) string {
	if real, err := filepath.EvalSymlinks(name); err == nil {
		return real
	}
	return realParent(name)
}

// realParent follows the links of the folders above a path, as far as they
// exist, but not one that the path itself may be.
func realParent(name string) string {
	dir, base := filepath.Split(filepath.Clean(name))
	dir = filepath.Clean(dir)
	if real, err := filepath.EvalSymlinks(dir); err == nil {
		return filepath.Join(real, base)
	}
	if dir == filepath.Dir(dir) {
		return filepath.Join(dir, base)
	}
	// The folder does not exist; its own parents may.
	if _, err := os.Lstat(dir); err != nil {
		return filepath.Join(realParent(dir), base)
	}
	return filepath.Join(dir, base)
}
