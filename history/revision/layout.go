package revision

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// layout is where the parts of a repository are, all paths absolute.
type layout struct {
	gitDir    string // HEAD, index
	commonDir string // objects, refs, config; differs from gitDir in a linked worktree
	workTree  string // "" in a bare repository
	itself    bool   // the folder that was looked at is a git folder itself
}

// maxSmallFile bounds the little text files of a repository (.git, commondir, a
// loose reference), in bytes.
const maxSmallFile = 64 << 10

// discover finds the repository at dir or above it. At each folder it looks at
// .git first and at the folder itself next, so a bare repository that lies
// inside a working tree is opened when its own path is given.
func discover(dir string) (layout, error) {
	abs, err := filepath.Abs(dir)
	if err != nil {
		return layout{}, noRepository(dir, err)
	}
	// Links in the way are resolved once here, so that every path compared later
	// is spelled in one way.
	abs, err = filepath.EvalSymlinks(abs)
	if err != nil {
		return layout{}, noRepository(dir, err)
	}
	info, err := os.Stat(abs)
	if err != nil {
		return layout{}, noRepository(dir, err)
	}
	if !info.IsDir() {
		return layout{}, noRepository(dir, errors.New("not a folder"))
	}
	for at := abs; ; at = filepath.Dir(at) {
		found, l, err := inspect(at)
		if err != nil {
			return layout{}, noRepository(dir, err)
		}
		if found {
			return l, nil
		}
		if at == filepath.Dir(at) {
			return layout{}, noRepository(dir, nil)
		}
	}
}

func noRepository(dir string, err error) *Error {
	if errors.Is(err, fs.ErrPermission) {
		return unreadable(fmt.Sprintf("whether there is a git repository at %q cannot be seen", dir), err)
	}
	return &Error{
		Kind: ErrNoRepository, Text: fmt.Sprintf("no git repository at %q", dir), Err: err,
		Hint: "run inside a repository or name one with --repo",
	}
}

// inspect looks for a repository at exactly this folder.
func inspect(dir string) (bool, layout, error) {
	dotGit := filepath.Join(dir, ".git")
	info, err := os.Stat(dotGit)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if ok, err := isGitDir(dir); !ok {
			return false, layout{}, err
		}
		l, err := atGitDir(dir, filepath.Base(dir) == ".git")
		l.itself = true
		return true, l, err
	case err != nil:
		return false, layout{}, err
	case info.IsDir():
		if ok, err := isGitDir(dotGit); err != nil {
			return false, layout{}, err
		} else if !ok {
			return false, layout{}, fmt.Errorf("%q lacks HEAD, objects or refs", dotGit)
		}
		l, err := atGitDir(dotGit, true)
		return true, l, err
	}
	target, err := readGitFile(dotGit)
	if err != nil {
		return false, layout{}, err
	}
	if ok, err := isGitDir(target); err != nil {
		return false, layout{}, err
	} else if !ok {
		return false, layout{}, fmt.Errorf("%q points to %q, which is no git folder", dotGit, target)
	}
	l, err := atGitDir(target, false)
	l.workTree = dir
	return true, l, err
}

// atGitDir works out the layout around a git folder. beside says that the
// working tree is the folder that holds it, unless the configuration says
// otherwise.
func atGitDir(dir string, beside bool) (layout, error) {
	l := layout{gitDir: dir, commonDir: dir}
	if beside {
		l.workTree = filepath.Dir(dir)
	}
	text, err := readSmall(filepath.Join(dir, "commondir"))
	if errors.Is(err, fs.ErrNotExist) {
		return l, nil
	}
	if err != nil {
		return layout{}, err
	}
	l.commonDir = resolvePath(dir, strings.TrimSpace(text))
	// The git folder of a linked worktree records where the worktree's .git is.
	back, err := readSmall(filepath.Join(dir, "gitdir"))
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return layout{}, err
	}
	if back = strings.TrimSpace(back); back != "" {
		l.workTree = filepath.Dir(resolvePath(dir, back))
	}
	return l, nil
}

// isGitDir applies git's own test: HEAD, and an object and a reference folder
// there or in the common folder. The error says that these may not be looked at.
func isGitDir(dir string) (bool, error) {
	if info, err := os.Lstat(filepath.Join(dir, "HEAD")); err != nil || info.IsDir() {
		return false, refused(err)
	}
	common := dir
	text, err := readSmall(filepath.Join(dir, "commondir"))
	if err == nil {
		common = resolvePath(dir, strings.TrimSpace(text))
	} else if err = refused(err); err != nil {
		return false, err
	}
	for _, name := range []string{"objects", "refs"} {
		info, err := os.Stat(filepath.Join(common, name))
		if err != nil || !info.IsDir() {
			return false, refused(err)
		}
	}
	return true, nil
}

// refused keeps an error that is about rights, and no other.
func refused(err error) error {
	if errors.Is(err, fs.ErrPermission) {
		return err
	}
	return nil
}

// readGitFile gives the folder that a .git file points to.
func readGitFile(name string) (string, error) {
	text, err := readSmall(name)
	if err != nil {
		return "", err
	}
	target, ok := strings.CutPrefix(text, "gitdir: ")
	if !ok {
		return "", fmt.Errorf("%q does not begin with %q", name, "gitdir: ")
	}
	return resolvePath(filepath.Dir(name), strings.TrimRight(target, "\r\n")), nil
}

// resolvePath reads a path that may be relative to a folder, and resolves links
// in it where it can.
func resolvePath(base, path string) string {
	path = filepath.FromSlash(path)
	if !filepath.IsAbs(path) {
		path = filepath.Join(base, path)
	}
	if real, err := filepath.EvalSymlinks(path); err == nil {
		return real
	}
	return filepath.Clean(path)
}

func readSmall(name string) (string, error) {
	data, err := readBounded(name, maxSmallFile)
	return string(data), err
}

// readBounded reads a file of at most limit bytes.
func readBounded(name string, limit int64) ([]byte, error) {
	info, err := os.Stat(name)
	if err != nil {
		return nil, err
	}
	// Opening a pipe would wait for a writer, so the kind is looked at first.
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("%q is not a regular file", name)
	}
	if info.Size() > limit {
		return nil, fmt.Errorf("%q has %d bytes, at most %d are read", name, info.Size(), limit)
	}
	return os.ReadFile(name)
}
