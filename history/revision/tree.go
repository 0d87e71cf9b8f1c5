package revision

import (
	"bytes"
	"fmt"
	"io/fs"
	"slices"
	"sort"
	"strings"

	"github.com/go-git/go-git/v5/plumbing"
)

// maxTree bounds one tree object, in bytes: about 300,000 entries.
const maxTree = 16 << 20

// emptyTree is the object of a tree with no entry. Git knows it without storing
// it.
var emptyTree = plumbing.NewHash("4b825dc642cb6eb9a060e54bf8d69288fbee4904")

// The kinds of tree entry, as Git writes their mode.
const (
	modeTree    = 0o040000
	modeFile    = 0o100644
	modeExec    = 0o100755
	modeLink    = 0o120000
	modeGitlink = 0o160000
)

// treeEntry is one line of a tree.
type treeEntry struct {
	name string
	mode uint32 // one of the kinds above
	hash plumbing.Hash
}

// goMode gives a mode as the fs package has it.
func goMode(mode uint32) fs.FileMode {
	switch mode {
	case modeTree:
		return fs.ModeDir | 0o755
	case modeExec:
		return 0o755
	case modeLink:
		return fs.ModeSymlink | 0o777
	case modeGitlink:
		return fs.ModeIrregular
	}
	return 0o644
}

// parseTree reads the bytes of a tree object: for each entry the mode in octal,
// a space, the name, a zero byte and 20 bytes of hash. It refuses what could
// make one path mean two things: an order other than Git's, a name twice, an
// empty name, ".", "..", ".git", a slash. The entries come back sorted by name.
func parseTree(data []byte) ([]treeEntry, error) {
	entries := make([]treeEntry, 0, len(data)/40)
	for last := ""; len(data) > 0; {
		mode, rest, err := parseMode(data)
		if err != nil {
			return nil, err
		}
		end := bytes.IndexByte(rest, 0)
		if end < 0 || len(rest)-end-1 < len(plumbing.Hash{}) {
			return nil, fmt.Errorf("entry %d is cut short", len(entries)+1)
		}
		e := treeEntry{name: string(rest[:end]), mode: mode}
		if err := checkName(e.name); err != nil {
			return nil, err
		}
		copy(e.hash[:], rest[end+1:])
		data = rest[end+1+len(e.hash):]
		// Git sorts a folder as if its name ended in a slash.
		key := sortKey(e)
		if key <= last {
			return nil, fmt.Errorf("entry %q is out of order", e.name)
		}
		last = key
		entries = append(entries, e)
	}
	slices.SortFunc(entries, func(a, b treeEntry) int { return strings.Compare(a.name, b.name) })
	for i := 1; i < len(entries); i++ {
		if entries[i].name == entries[i-1].name {
			return nil, fmt.Errorf("entry %q occurs twice", entries[i].name)
		}
	}
	return entries, nil
}

func sortKey(e treeEntry) string {
	if e.mode == modeTree {
		return e.name + "/"
	}
	return e.name
}

// parseMode reads the mode and the space behind it, and maps the mode to one of
// the kinds, as Git does: of a file's permissions only the owner's x counts.
func parseMode(data []byte) (uint32, []byte, error) {
	var mode uint32
	for i, c := range data {
		switch {
		case c == ' ' && i > 0:
			kind, ok := canonicalMode(mode)
			if !ok {
				return 0, nil, fmt.Errorf("entry mode %o is not supported", mode)
			}
			return kind, data[i+1:], nil
		case c < '0' || c > '7' || i == 7:
			return 0, nil, fmt.Errorf("entry mode is not an octal number of at most 7 digits")
		}
		mode = mode<<3 | uint32(c-'0')
	}
	return 0, nil, fmt.Errorf("entry mode is cut short")
}

func canonicalMode(mode uint32) (uint32, bool) {
	switch mode & 0o170000 {
	case 0o100000:
		if mode&0o100 != 0 {
			return modeExec, true
		}
		return modeFile, true
	case modeTree, modeLink, modeGitlink:
		return mode & 0o170000, true
	}
	return 0, false
}

func checkName(name string) error {
	switch {
	case name == "", name == ".", name == "..", strings.EqualFold(name, ".git"), strings.Contains(name, "/"):
		return fmt.Errorf("entry name %q is not allowed", name)
	}
	return nil
}

// find looks up a name in entries sorted by name.
func find(entries []treeEntry, name string) (treeEntry, bool) {
	i := sort.Search(len(entries), func(i int) bool { return entries[i].name >= name })
	if i < len(entries) && entries[i].name == name {
		return entries[i], true
	}
	return treeEntry{}, false
}
