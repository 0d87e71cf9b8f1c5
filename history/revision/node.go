package revision

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// node is one file or folder in the list of the working tree.
type node struct {
	path     string      // with slashes, from the data set folder; "." for that itself
	mode     uint32      // as Git would write it; 0 for what Git cannot keep
	special  fs.FileMode // the type where mode is 0
	children []*node     // of a folder, sorted by name

	once sync.Once
	hash plumbing.Hash
	err  error
}

func (n *node) name() string { return path.Base(n.path) }

func (n *node) fileMode() fs.FileMode {
	if n.mode == 0 {
		return n.special
	}
	return goMode(n.mode)
}

func (n *node) notFolder() error {
	if err := refusal(n.fileMode()); err != nil {
		return &stop{n.name(), err}
	}
	return &stop{n.name(), errIsFile}
}

// errNoIdentity is given for what Git cannot keep, and for submodules.
var errNoIdentity = errors.New("has no hash")

// identity is the hash of a node in hexadecimal, "" where it has none or cannot
// be read: then the caller reads the file and learns why.
func (w *working) identity(n *node) string {
	h, err := w.hash(n)
	if err != nil {
		return ""
	}
	return h.String()
}

// hash computes the hash of a node once and keeps it.
func (w *working) hash(n *node) (plumbing.Hash, error) {
	n.once.Do(func() {
		switch n.mode {
		case modeTree:
			n.hash, n.err = w.treeHash(n)
		case modeFile, modeExec:
			n.hash, n.err = w.fileHash(n)
		case modeLink:
			n.hash, n.err = w.linkHash(n)
		default:
			n.err = errNoIdentity
		}
	})
	return n.hash, n.err
}

// treeHash is the hash of the tree that the folder's listed files would make.
func (w *working) treeHash(n *node) (plumbing.Hash, error) {
	entries := make([]treeEntry, len(n.children))
	for i, c := range n.children {
		h, err := w.hash(c)
		if err != nil {
			return h, err
		}
		entries[i] = treeEntry{c.name(), c.mode, h}
	}
	data := encodeTree(entries)
	sum := newSum(plumbing.TreeObject, int64(len(data)))
	sum.Write(data)
	return plumbing.Hash(sum.Sum(nil)), nil
}

// encodeTree writes entries as the bytes of a tree object. parseTree undoes it.
func encodeTree(entries []treeEntry) []byte {
	entries = slices.Clone(entries)
	slices.SortFunc(entries, func(a, b treeEntry) int { return strings.Compare(sortKey(a), sortKey(b)) })
	var data []byte
	for _, e := range entries {
		data = strconv.AppendUint(data, uint64(e.mode), 8)
		data = append(data, ' ')
		data = append(data, e.name...)
		data = append(data, 0)
		data = append(data, e.hash[:]...)
	}
	return data
}

func (w *working) fileHash(n *node) (plumbing.Hash, error) {
	f, err := w.open(n)
	if err != nil {
		return plumbing.ZeroHash, err
	}
	defer f.Close()
	size := f.info.Size()
	sum := newSum(plumbing.BlobObject, size)
	written, err := io.Copy(sum, io.LimitReader(f.File, size+1))
	if err == nil && written != size {
		err = errLength // it is being written to
	}
	if err != nil {
		return plumbing.ZeroHash, err
	}
	return plumbing.Hash(sum.Sum(nil)), nil
}

// linkHash hashes where a link leads. Where core.symlinks is off, a link of the
// index is a file that holds the path.
func (w *working) linkHash(n *node) (plumbing.Hash, error) {
	name := w.at(n)
	info, err := os.Lstat(name)
	if err != nil {
		return plumbing.ZeroHash, err
	}
	var target string
	if info.Mode()&fs.ModeSymlink != 0 {
		target, err = os.Readlink(name)
		target = filepath.ToSlash(target)
	} else {
		target, err = readSmall(name)
	}
	if err != nil {
		return plumbing.ZeroHash, err
	}
	sum := newSum(plumbing.BlobObject, int64(len(target)))
	io.WriteString(sum, target)
	return plumbing.Hash(sum.Sum(nil)), nil
}
