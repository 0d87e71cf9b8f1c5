package revision

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"sort"
	"strings"
)

// Working gives the files of a folder as they are on disk: those that
//
//	git ls-files --cached --others --exclude-standard
//
// lists and that exist. So untracked files are in, ignored ones are not, and
// tracked ones are even where a pattern ignores them. A folder without any such
// file does not appear. Another repository inside the working tree appears as
// fs.ModeIrregular, like a submodule.
//
// The list is made once, here; contents are read when asked for. Where
// core.fileMode is off, the x permission is taken from the index. Content filters
// such as autocrlf are not applied, so the Identity of a file that Git would
// convert differs from the committed one.
//
// The folder is written as for Snapshot. The errors are of class ErrBare,
// ErrNoFolder, ErrUnsupported, ErrTooLarge, ErrUnreadable or ErrCorrupt.
func (r *Repo) Working(folder string) (fs.FS, error) {
	if r.at.workTree == "" {
		return nil, &Error{
			Kind: ErrBare, Text: fmt.Sprintf("repository %q is bare and has no working tree", r.at.commonDir),
			Hint: "name a revision instead of \".\"",
		}
	}
	clean, ok := cleanFolder(folder)
	if !ok {
		return nil, noFolder("the working tree", folder, "it must be a path with slashes inside the repository")
	}
	l, err := r.newLister()
	if err != nil {
		return nil, err
	}
	children, err := l.list(clean)
	var stopped *stop
	switch {
	case errors.As(err, &stopped):
		return nil, noFolder("the working tree", folder, stopped.Error())
	case err != nil:
		return nil, err
	case len(children) == 0 && clean != ".":
		return nil, noFolder("the working tree", folder, "no file in it is tracked or could be added")
	}
	return &working{
		dir:  filepath.Join(r.at.workTree, filepath.FromSlash(clean)),
		root: &node{path: ".", mode: modeTree, children: children},
	}, nil
}

// working is the file system of a folder on disk.
type working struct {
	dir  string // absolute path of the folder
	root *node
}

// lookup goes down a path in the list.
func (w *working) lookup(op, name string) (*node, error) {
	if err := checkPath(op, name); err != nil {
		return nil, err
	}
	at := w.root
	if name == "." {
		return at, nil
	}
	for part := range strings.SplitSeq(name, "/") {
		if at.mode != modeTree {
			return nil, pathError(op, name, at.notFolder())
		}
		i := sort.Search(len(at.children), func(i int) bool { return at.children[i].name() >= part })
		if i == len(at.children) || at.children[i].name() != part {
			return nil, pathError(op, name, &stop{part, fs.ErrNotExist})
		}
		at = at.children[i]
	}
	return at, nil
}

// Open opens a file or a folder.
func (w *working) Open(name string) (fs.File, error) {
	at, err := w.lookup("open", name)
	if err != nil {
		return nil, err
	}
	if at.mode == modeTree {
		info, err := w.stat(at)
		if err != nil {
			return nil, err
		}
		return &folderFile{info: info, entries: w.entries(at)}, nil
	}
	return w.open(at)
}

// open opens a regular file. Each folder on the way is looked at again, as a
// link may have taken its place since the list was made.
func (w *working) open(at *node) (*diskFile, error) {
	if err := refusal(at.fileMode()); err != nil {
		return nil, pathError("open", at.path, err)
	}
	root, err := os.OpenRoot(w.dir)
	if err != nil {
		return nil, diskError("open", at, err)
	}
	defer root.Close()
	for i := range len(at.path) {
		if at.path[i] != '/' {
			continue
		}
		info, err := root.Lstat(filepath.FromSlash(at.path[:i]))
		if err != nil {
			return nil, diskError("open", at, err)
		}
		if !info.IsDir() {
			return nil, pathError("open", at.path, &stop{path.Base(at.path[:i]), errIsLink})
		}
	}
	before, err := root.Lstat(filepath.FromSlash(at.path))
	if err != nil {
		return nil, diskError("open", at, err)
	}
	if err := refusal(before.Mode()); err != nil {
		return nil, pathError("open", at.path, err)
	}
	f, err := root.Open(filepath.FromSlash(at.path))
	if err != nil {
		return nil, diskError("open", at, err)
	}
	after, err := f.Stat()
	if err == nil && !os.SameFile(before, after) {
		err = pathError("open", at.path, errors.New("was replaced while it was opened"))
	}
	if err != nil {
		f.Close()
		return nil, err
	}
	return &diskFile{f, w.info(at, after)}, nil
}

// diskError gives the class to what may not be read on disk.
func diskError(op string, at *node, err error) error {
	if !errors.Is(err, fs.ErrPermission) {
		return err
	}
	var inner *fs.PathError
	if errors.As(err, &inner) {
		err = inner.Err // the path is named once
	}
	return pathError(op, at.path, unreadable("cannot be read", err))
}

// diskFile is an open file of the working tree.
type diskFile struct {
	*os.File
	info fs.FileInfo
}

func (f *diskFile) Stat() (fs.FileInfo, error) { return f.info, nil }

// ReadDir gives the entries of a folder, sorted by name.
func (w *working) ReadDir(name string) ([]fs.DirEntry, error) {
	at, err := w.lookup("readdir", name)
	if err != nil {
		return nil, err
	}
	if at.mode != modeTree {
		return nil, pathError("readdir", name, at.notFolder())
	}
	return w.entries(at), nil
}

// ReadFile gives the content of a file. It reads any size: look at Stat first.
func (w *working) ReadFile(name string) ([]byte, error) {
	at, err := w.lookup("read", name)
	if err != nil {
		return nil, err
	}
	f, err := w.open(at)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	// Some bytes more than the size, so that one Read sees the end.
	data := make([]byte, 0, min(f.info.Size(), 1<<20)+512)
	for {
		n, err := f.Read(data[len(data):cap(data)])
		data = data[:len(data)+n]
		if err == io.EOF {
			return data, nil
		}
		if err != nil {
			return nil, err
		}
		if len(data) == cap(data) {
			data = append(data, 0)[:len(data)]
		}
	}
}

// Stat describes a file, folder or link as it is now. Links are not followed.
func (w *working) Stat(name string) (fs.FileInfo, error) {
	at, err := w.lookup("stat", name)
	if err != nil {
		return nil, err
	}
	return w.stat(at)
}

// Lstat is Stat.
func (w *working) Lstat(name string) (fs.FileInfo, error) { return w.Stat(name) }

func (w *working) stat(at *node) (fs.FileInfo, error) {
	now, err := os.Lstat(w.at(at))
	if err != nil {
		return nil, diskError("stat", at, err)
	}
	return w.info(at, now), nil
}

func (w *working) at(n *node) string { return filepath.Join(w.dir, filepath.FromSlash(n.path)) }

func (w *working) info(at *node, now fs.FileInfo) *info {
	i := &info{name: at.name(), mode: at.fileMode(), modified: now.ModTime()}
	i.identity = func() string { return w.identity(at) }
	if !i.IsDir() {
		i.size = now.Size()
	}
	return i
}

func (w *working) entries(at *node) []fs.DirEntry {
	out := make([]fs.DirEntry, len(at.children))
	for i, c := range at.children {
		out[i] = &workingEntry{w, c}
	}
	return out
}

// workingEntry is one line of a folder.
type workingEntry struct {
	working *working
	node    *node
}

func (e *workingEntry) Name() string               { return e.node.name() }
func (e *workingEntry) IsDir() bool                { return e.node.mode == modeTree }
func (e *workingEntry) Type() fs.FileMode          { return e.node.fileMode().Type() }
func (e *workingEntry) Info() (fs.FileInfo, error) { return e.working.stat(e.node) }
func (e *workingEntry) Identity() string           { return e.working.identity(e.node) }
func (e *workingEntry) String() string             { return fs.FormatDirEntry(e) }
