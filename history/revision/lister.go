package revision

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"strings"

	"github.com/go-git/go-git/v5/plumbing/filemode"
)

const (
	maxListedFiles = 1_000_000 // in one data set folder on disk
	maxFolderDepth = 128       // folders in one another
)

// lister finds which files of the working tree count.
type lister struct {
	root     string            // of the working tree
	tracked  map[string]uint32 // mode in the index by path from the root
	folders  map[string]bool   // those with tracked files in them
	ignores  ignores
	fileMode bool // whether the x permission on disk counts
	symlinks bool // whether links on disk are links
	base     string
	count    int
}

func (r *Repo) newLister() (*lister, error) {
	entries, err := r.readIndex()
	if err != nil {
		return nil, err
	}
	l := &lister{
		root:     r.at.workTree,
		tracked:  make(map[string]uint32, len(entries)),
		folders:  map[string]bool{},
		fileMode: r.config.flag("core.filemode", true),
		symlinks: r.config.flag("core.symlinks", true),
	}
	for _, e := range entries {
		mode, ok := canonicalMode(uint32(e.Mode))
		if !ok || e.Mode == filemode.Dir {
			return nil, corrupt(fmt.Sprintf("index entry %q has mode %o", e.Name, uint32(e.Mode)), nil)
		}
		l.tracked[e.Name] = mode
		for dir := path.Dir(e.Name); dir != "." && !l.folders[dir]; dir = path.Dir(dir) {
			l.folders[dir] = true
		}
	}
	if l.ignores, err = r.userIgnores(); err != nil {
		return nil, orUnreadable("ignore rules cannot be read", err)
	}
	return l, nil
}

// list gives what counts in a folder, whose path is from the root. Its error is
// a *stop where the path leads to no folder.
func (l *lister) list(folder string) ([]*node, error) {
	l.base = folder
	g, err := l.ignores.with(l.root, ".")
	if err != nil {
		return nil, err
	}
	if folder == "." {
		return l.walk(".", false, g, 0)
	}
	ignored, at := false, ""
	for part := range strings.SplitSeq(folder, "/") {
		at = path.Join(at, part)
		info, err := os.Lstat(filepath.Join(l.root, filepath.FromSlash(at)))
		switch {
		case errors.Is(err, fs.ErrNotExist) || strings.EqualFold(part, ".git"):
			return nil, &stop{part, fs.ErrNotExist}
		case err != nil:
			return nil, orUnreadable(fmt.Sprintf("folder %q cannot be seen", at), err)
		case l.tracked[at] == modeGitlink || info.IsDir() && !l.folders[at] && l.otherRepository(at):
			return nil, &stop{part, errIsModule}
		case info.Mode().IsRegular():
			return nil, &stop{part, errIsFile}
		case !info.IsDir():
			return nil, &stop{part, refusal(info.Mode())}
		}
		ignored = ignored || g.excluded(at, true)
		if !ignored {
			if g, err = g.with(l.root, at); err != nil {
				return nil, err
			}
		}
	}
	return l.walk(folder, ignored, g, 0)
}

// walk gives what counts in one folder. ignored says that the folder is ignored:
// then only tracked files in it count. The rules g include those of the folder's
// own file.
func (l *lister) walk(dir string, ignored bool, g ignores, depth int) ([]*node, error) {
	if depth > maxFolderDepth {
		return nil, &Error{Kind: ErrTooLarge, Text: fmt.Sprintf("folder %q lies more than %d folders deep", dir, maxFolderDepth)}
	}
	files, err := os.ReadDir(filepath.Join(l.root, filepath.FromSlash(dir)))
	if err != nil {
		return nil, orUnreadable(fmt.Sprintf("folder %q cannot be listed", dir), err)
	}
	var out []*node
	for _, f := range files { // sorted by name
		if strings.EqualFold(f.Name(), ".git") {
			continue
		}
		name := path.Join(dir, f.Name())
		n, err := l.node(name, f, ignored, g, depth)
		if err != nil {
			return nil, err
		}
		if n == nil {
			continue
		}
		if l.count++; l.count > maxListedFiles {
			return nil, &Error{Kind: ErrTooLarge, Text: fmt.Sprintf("folder %q has more than %d files", l.base, maxListedFiles)}
		}
		n.path = name
		if l.base != "." {
			n.path = strings.TrimPrefix(name, l.base+"/")
		}
		out = append(out, n)
	}
	return out, nil
}

// node judges one name in a folder; nil where it does not count.
func (l *lister) node(name string, f fs.DirEntry, ignored bool, g ignores, depth int) (*node, error) {
	tracked, isTracked := l.tracked[name]
	if f.IsDir() {
		if tracked == modeGitlink {
			return &node{mode: modeGitlink}, nil
		}
		return l.folder(name, ignored || g.excluded(name, true), g, depth)
	}
	if !isTracked && (ignored || g.excluded(name, false)) {
		return nil, nil
	}
	switch {
	case f.Type()&fs.ModeSymlink != 0:
		return &node{mode: modeLink}, nil
	case f.Type().IsRegular():
		return l.file(f, tracked)
	case isTracked:
		return &node{special: f.Type()}, nil
	}
	return nil, nil // a pipe or a device: Git passes over it
}

func (l *lister) folder(name string, ignored bool, g ignores, depth int) (*node, error) {
	if !l.folders[name] {
		if ignored {
			return nil, nil
		}
		if l.otherRepository(name) {
			return &node{mode: modeGitlink}, nil
		}
	}
	if !ignored {
		var err error
		if g, err = g.with(l.root, name); err != nil {
			return nil, err
		}
	}
	children, err := l.walk(name, ignored, g, depth+1)
	if err != nil || len(children) == 0 {
		return nil, err
	}
	return &node{mode: modeTree, children: children}, nil
}

// file gives a regular file the mode that Git would record.
func (l *lister) file(f fs.DirEntry, tracked uint32) (*node, error) {
	if tracked == modeLink && !l.symlinks {
		return &node{mode: modeLink}, nil
	}
	if !l.fileMode {
		if tracked == modeExec {
			return &node{mode: modeExec}, nil
		}
		return &node{mode: modeFile}, nil
	}
	info, err := f.Info()
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, orUnreadable("a file cannot be seen", err)
	}
	if info.Mode()&0o100 != 0 {
		return &node{mode: modeExec}, nil
	}
	return &node{mode: modeFile}, nil
}

// otherRepository says whether a folder is the root of a working tree of its
// own.
func (l *lister) otherRepository(name string) bool {
	dotGit := filepath.Join(l.root, filepath.FromSlash(name), ".git")
	info, err := os.Stat(dotGit)
	if err != nil {
		return false
	}
	if info.IsDir() {
		ok, _ := isGitDir(dotGit)
		return ok
	}
	target, err := readGitFile(dotGit)
	if err != nil {
		return false
	}
	ok, _ := isGitDir(target)
	return ok
}
