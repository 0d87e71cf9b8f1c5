package revision

import (
	"errors"
	"fmt"
	"io/fs"
	"path"
	"strings"

	"github.com/go-git/go-git/v5/plumbing"
)

// Snapshot gives the files of a folder as they are in a commit. The commit is a
// full hash, as Resolve gives it; the folder a path with slashes from the root of
// the repository, "" or "." for the root itself.
//
// The result implements fs.ReadDirFS, fs.ReadFileFS and fs.StatFS. Objects are
// read as they are asked for. Stat and Lstat are the same: links are not
// followed. A file's Read checks the content against its hash at the end, so who
// stops early has read unchecked bytes.
//
// The errors are of class ErrUnknown, ErrNoFolder, ErrMissingObject,
// ErrUnsupported, ErrUnreadable or ErrCorrupt.
func (r *Repo) Snapshot(commit string, folder string) (fs.FS, error) {
	h, ok := parseHash(commit)
	if !ok {
		return nil, unknown(commit, "a full commit hash is needed here")
	}
	c, err := r.commit(h)
	if err != nil {
		return nil, err
	}
	tree, _ := parseHash(c.Tree)
	s := &snapshot{repo: r, root: treeEntry{name: ".", mode: modeTree, hash: tree}, what: "commit " + commit}
	clean, ok := cleanFolder(folder)
	if !ok {
		return nil, noFolder(s.what, folder, "it must be a path with slashes inside the repository")
	}
	at, err := s.walk(clean)
	if err == nil && at.mode != modeTree {
		err = notFolder(at)
	}
	var stopped *stop
	switch {
	case errors.As(err, &stopped):
		return nil, noFolder(s.what, folder, stopped.Error())
	case err != nil:
		return nil, err
	}
	at.name = "."
	s.root = at
	return s, nil
}

func noFolder(what, folder, why string) *Error {
	return &Error{
		Kind: ErrNoFolder, Text: fmt.Sprintf("%s has no data set folder %q: %s", what, folder, why),
		Hint: "name the folder of the data set with --data",
	}
}

// cleanFolder gives the path of a folder as fs.FS has paths.
func cleanFolder(folder string) (string, bool) {
	clean := path.Clean(folder)
	return clean, fs.ValidPath(clean) && !strings.ContainsRune(clean, 0)
}

// snapshot is the file system of a folder in a commit.
type snapshot struct {
	repo *Repo
	root treeEntry
	top  []treeEntry // of the root, where they were read; never empty then
	what string      // names the commit in errors
}

// tree gives the entries of a tree.
func (s *snapshot) tree(h plumbing.Hash) ([]treeEntry, error) {
	if h == s.root.hash && s.top != nil {
		return s.top, nil
	}
	return s.repo.tree(h, s.what)
}

// stop says at which name of a path the way ended.
type stop struct {
	name string
	why  error
}

func (e *stop) Error() string { return fmt.Sprintf("%q %v", e.name, e.why) }
func (e *stop) Unwrap() error { return e.why }

// notFolder says why an entry that is no folder has nothing below it.
func notFolder(e treeEntry) error {
	if err := refusal(goMode(e.mode)); err != nil {
		return &stop{e.name, err}
	}
	return &stop{e.name, errIsFile}
}

// walk goes down a valid path. Its error is a *stop where the path leads nowhere.
func (s *snapshot) walk(name string) (treeEntry, error) {
	at := s.root
	if name == "." {
		return at, nil
	}
	for part := range strings.SplitSeq(name, "/") {
		if at.mode != modeTree {
			return at, notFolder(at)
		}
		entries, err := s.tree(at.hash)
		if err != nil {
			return at, err
		}
		next, ok := find(entries, part)
		if !ok {
			return at, &stop{part, fs.ErrNotExist}
		}
		at = next
	}
	return at, nil
}

// lookup is walk for a path as it comes from a caller, with the error that fs.FS
// asks for.
func (s *snapshot) lookup(op, name string) (treeEntry, error) {
	if err := checkPath(op, name); err != nil {
		return treeEntry{}, err
	}
	at, err := s.walk(name)
	if err != nil {
		return at, pathError(op, name, err)
	}
	if name == "." {
		at.name = "."
	}
	return at, nil
}

// Open opens a file or a folder.
func (s *snapshot) Open(name string) (fs.File, error) {
	at, err := s.lookup("open", name)
	if err != nil {
		return nil, err
	}
	if at.mode == modeTree {
		entries, err := s.entries(at)
		if err != nil {
			return nil, pathError("open", name, err)
		}
		return &folderFile{info: s.info(at, 0), entries: entries}, nil
	}
	o, err := s.blob(at)
	if err != nil {
		return nil, pathError("open", name, err)
	}
	return &blobFile{repo: s.repo, what: s.what, path: name, object: o, info: s.info(at, o.size)}, nil
}

// ReadDir gives the entries of a folder, sorted by name.
func (s *snapshot) ReadDir(name string) ([]fs.DirEntry, error) {
	at, err := s.lookup("readdir", name)
	if err != nil {
		return nil, err
	}
	if at.mode != modeTree {
		return nil, pathError("readdir", name, notFolder(at))
	}
	entries, err := s.entries(at)
	if err != nil {
		return nil, pathError("readdir", name, err)
	}
	return entries, nil
}

// ReadFile gives the content of a file, checked against its hash. It reads any
// size: look at Stat first.
func (s *snapshot) ReadFile(name string) ([]byte, error) {
	at, err := s.lookup("read", name)
	if err != nil {
		return nil, err
	}
	o, err := s.blob(at)
	if err != nil {
		return nil, pathError("read", name, err)
	}
	data, err := s.repo.content(o, s.what)
	if err != nil {
		return nil, pathError("read", name, err)
	}
	return data, nil
}

// ReadAtMost gives the content of a file of at most some bytes, checked against
// its hash; of a larger one it gives the size alone.
func (s *snapshot) ReadAtMost(name string, most int64) (content []byte, size int64, err error) {
	at, err := s.lookup("open", name)
	if err != nil {
		return nil, 0, err
	}
	if refusal(goMode(at.mode)) == nil {
		if kind, data, ok := s.repo.store.readAtMost(at.hash, most); ok && kind == plumbing.BlobObject {
			return data, int64(len(data)), nil
		}
	}
	o, err := s.blob(at)
	if err != nil {
		return nil, 0, pathError("open", name, err)
	}
	if o.size > most {
		return nil, o.size, nil
	}
	if content, err = s.repo.content(o, s.what); err != nil {
		return nil, 0, pathError("read", name, err)
	}
	return content, o.size, nil
}

// Stat describes a file, folder or link. Links are not followed.
func (s *snapshot) Stat(name string) (fs.FileInfo, error) {
	at, err := s.lookup("stat", name)
	if err != nil {
		return nil, err
	}
	info, err := s.stat(at)
	if err != nil {
		return nil, pathError("stat", name, err)
	}
	return info, nil
}

// Lstat is Stat.
func (s *snapshot) Lstat(name string) (fs.FileInfo, error) { return s.Stat(name) }

func (s *snapshot) stat(at treeEntry) (fs.FileInfo, error) {
	size := int64(0)
	if at.mode == modeFile || at.mode == modeExec || at.mode == modeLink {
		o, err := s.repo.find(at.hash, s.what)
		if err != nil {
			return nil, err
		}
		size = o.size
	}
	return s.info(at, size), nil
}

func (s *snapshot) info(at treeEntry, size int64) *info {
	return &info{name: at.name, mode: goMode(at.mode), size: size, identity: at.hash.String}
}

// blob finds the content of a regular file.
func (s *snapshot) blob(at treeEntry) (*object, error) {
	if err := refusal(goMode(at.mode)); err != nil {
		return nil, err
	}
	o, err := s.repo.find(at.hash, s.what)
	if err == nil && o.kind != plumbing.BlobObject {
		return nil, malformed(fmt.Sprintf("object %s of file %q is a %s", at.hash, at.name, o.kind), nil)
	}
	return o, err
}

func (s *snapshot) entries(at treeEntry) ([]fs.DirEntry, error) {
	entries, err := s.tree(at.hash)
	if err != nil {
		return nil, err
	}
	out := make([]fs.DirEntry, len(entries))
	all := make([]snapshotEntry, len(entries))
	for i, e := range entries {
		all[i] = snapshotEntry{s, e}
		out[i] = &all[i]
	}
	return out, nil
}

// snapshotEntry is one line of a folder.
type snapshotEntry struct {
	snapshot *snapshot
	entry    treeEntry
}

func (e *snapshotEntry) Name() string               { return e.entry.name }
func (e *snapshotEntry) IsDir() bool                { return e.entry.mode == modeTree }
func (e *snapshotEntry) Type() fs.FileMode          { return goMode(e.entry.mode).Type() }
func (e *snapshotEntry) Info() (fs.FileInfo, error) { return e.snapshot.stat(e.entry) }
func (e *snapshotEntry) Identity() string           { return e.entry.hash.String() }
func (e *snapshotEntry) String() string             { return fs.FormatDirEntry(e) }
