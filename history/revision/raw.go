package revision

import (
	"bytes"
	"fmt"
	"io/fs"
	"iter"

	"github.com/go-git/go-git/v5/plumbing"
)

// Whoever goes through thousands of commits reads them and their trees with what
// is here: without file systems, and without a look at what two trees have in
// common.

// Link is what a walk needs of a commit.
type Link struct {
	Tree    [20]byte
	Parents [][20]byte // as far as this clone goes
	When    int64      // of the committer, in seconds since 1970; 0 where it cannot be read
	// Boundary tells that a shallow clone ends here: there were parents.
	Boundary bool
}

// Link reads a commit.
func (r *Repo) Link(commit [20]byte) (Link, error) {
	data, err := r.read(commit, plumbing.CommitObject, maxCommit, "the history")
	if err != nil {
		return Link{}, err
	}
	l, err := parseLinks(data)
	if err != nil {
		return Link{}, corrupt(fmt.Sprintf("commit %s is malformed", plumbing.Hash(commit)), err)
	}
	out := Link{Tree: l.tree, When: l.when}
	if r.shallow[commit] {
		// What lies behind is cut off even where an object happens to be here.
		out.Boundary = len(l.parents) > 0
		return out, nil
	}
	out.Parents = make([][20]byte, len(l.parents))
	for i, p := range l.parents {
		out.Parents[i] = p
	}
	return out, nil
}

// TreeEntry is a line of a tree.
type TreeEntry struct {
	Name string
	Mode fs.FileMode // as a Snapshot has it
	Hash [20]byte
}

// Tree is a tree as it is stored. The zero Tree has no lines.
type Tree struct {
	data  []byte
	marks [][]byte // of its hash, see sumTree
}

// Tree reads a tree, and lists what it has otherwise than another one, in the
// order of trees. Only what differs is looked at: the other tree was read so, too.
// The zero hash stands for the zero Tree; what names the commit in errors.
func (r *Repo) Tree(tree [20]byte, before Tree, what string) (Tree, []TreeChange, error) {
	var t Tree
	if tree != plumbing.ZeroHash && tree != emptyTree {
		var err error
		if t, err = r.treeAfter(tree, before, what); err != nil {
			return Tree{}, nil, err
		}
	}
	list, err := t.changes(before)
	if err != nil {
		return Tree{}, nil, malformed(fmt.Sprintf("tree %s is malformed", plumbing.Hash(tree)), err)
	}
	return t, list, nil
}

// rawEntry gives the length of the first entry, 0 where it is cut short.
func rawEntry(data []byte) int {
	end := bytes.IndexByte(data, 0)
	if end < 0 || len(data)-end-1 < hashSize {
		return 0
	}
	return end + 1 + hashSize
}

// parseEntry reads an entry of its own.
func parseEntry(raw []byte) (treeEntry, error) {
	mode, rest, err := parseMode(raw)
	if err != nil {
		return treeEntry{}, err
	}
	n := len(rest) - hashSize - 1
	if n < 0 {
		return treeEntry{}, fmt.Errorf("an entry is cut short")
	}
	e := treeEntry{name: string(rest[:n]), mode: mode}
	copy(e.hash[:], rest[n+1:])
	return e, checkName(e.name)
}

func (e treeEntry) public() TreeEntry { return TreeEntry{e.name, goMode(e.mode), e.hash} }

// All runs over the lines in the order of trees.
func (t Tree) All() iter.Seq[TreeEntry] {
	return func(yield func(TreeEntry) bool) {
		for data := t.data; len(data) > 0; {
			n := rawEntry(data)
			if n == 0 {
				return
			}
			e, err := parseEntry(data[:n])
			if err != nil || !yield(e.public()) {
				return
			}
			data = data[n:]
		}
	}
}

// Find finds a line by its name.
func (t Tree) Find(name string) (TreeEntry, bool) {
	for e := range t.All() {
		if e.Name == name {
			return e, true
		}
	}
	return TreeEntry{}, false
}

// Folder gives the files of a tree, as Snapshot gives those of a commit. It is for
// trees that are looked at once: they are not kept.
func (r *Repo) Folder(tree [20]byte, what string) (fs.FS, error) {
	s := &snapshot{repo: r, root: treeEntry{name: ".", mode: modeTree, hash: tree}, what: what}
	if tree == emptyTree {
		return s, nil
	}
	data, err := r.read(tree, plumbing.TreeObject, maxTree, what)
	if err != nil {
		return nil, err
	}
	if s.top, err = parseTree(data); err != nil {
		return nil, malformed(fmt.Sprintf("tree %s is malformed", plumbing.Hash(tree)), err)
	}
	return s, nil
}
