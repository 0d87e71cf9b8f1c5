package trace

import (
	"io/fs"
	"strings"

	"speedtrail/schema"
)

// under is a folder as it stands at a path, without what stands around it.
type under struct {
	path  string
	files fs.FS
}

// inside gives a path from the folder.
func (u *under) inside(op, name string) (string, error) {
	rest, ok := strings.CutPrefix(name, u.path)
	switch {
	case ok && rest == "":
		return ".", nil
	case ok && rest[0] == '/':
		return rest[1:], nil
	}
	return "", &fs.PathError{Op: op, Path: name, Err: fs.ErrNotExist}
}

// Open opens a file.
func (u *under) Open(name string) (fs.File, error) {
	p, err := u.inside("open", name)
	if err != nil {
		return nil, err
	}
	return u.files.Open(p)
}

// ReadDir lists a folder.
func (u *under) ReadDir(name string) ([]fs.DirEntry, error) {
	p, err := u.inside("readdir", name)
	if err != nil {
		return nil, err
	}
	return fs.ReadDir(u.files, p)
}

// ReadAtMost implements schema.Bounded.
func (u *under) ReadAtMost(name string, most int64) ([]byte, int64, error) {
	p, err := u.inside("open", name)
	if err != nil {
		return nil, 0, err
	}
	return u.files.(schema.Bounded).ReadAtMost(p, most)
}
