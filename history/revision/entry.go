package revision

import (
	"io"
	"io/fs"
	"time"
)

// Entry is what every fs.DirEntry and fs.FileInfo of this package's file systems
// also offers.
type Entry interface {
	// Identity is the hash, 40 hexadecimal digits, that Git has for a file or
	// folder, or would have for the one on disk; "" when it is not known. Two
	// entries with the same type and an equal Identity other than "" have equal
	// content. For a link it is that of the path it leads to.
	Identity() string
}

// info is the fs.FileInfo of both file systems.
type info struct {
	name     string
	mode     fs.FileMode
	size     int64
	modified time.Time
	identity func() string
}

func (i *info) Name() string       { return i.name }
func (i *info) Mode() fs.FileMode  { return i.mode }
func (i *info) Size() int64        { return i.size }
func (i *info) ModTime() time.Time { return i.modified } // zero in a commit: Git keeps none
func (i *info) IsDir() bool        { return i.mode.IsDir() }
func (i *info) Sys() any           { return nil }
func (i *info) Identity() string   { return i.identity() }

// folderFile is an open folder.
type folderFile struct {
	info    fs.FileInfo
	entries []fs.DirEntry
	closed  bool
}

func (f *folderFile) Stat() (fs.FileInfo, error) { return f.info, nil }

func (f *folderFile) Read([]byte) (int, error) {
	return 0, &fs.PathError{Op: "read", Path: f.info.Name(), Err: errIsFolder}
}

func (f *folderFile) Close() error {
	if f.closed {
		return fs.ErrClosed
	}
	f.closed = true
	return nil
}

func (f *folderFile) ReadDir(n int) ([]fs.DirEntry, error) {
	if f.closed {
		return nil, fs.ErrClosed
	}
	if n <= 0 || n >= len(f.entries) {
		out := f.entries
		f.entries = nil
		if n > 0 && len(out) == 0 {
			return nil, io.EOF
		}
		return out, nil
	}
	out := f.entries[:n:n]
	f.entries = f.entries[n:]
	return out, nil
}

// pathError wraps an error in the form that fs.FS asks for.
func pathError(op, name string, err error) error {
	return &fs.PathError{Op: op, Path: name, Err: err}
}

// Why something cannot be opened as a file or a folder.
var (
	errIsFile   = &Error{Kind: ErrNotFile, Text: "is a file, not a folder"}
	errIsFolder = &Error{Kind: ErrNotFile, Text: "is a folder"}
	errIsLink   = &Error{Kind: ErrNotFile, Text: "is a symbolic link, which is not followed"}
	errIsModule = &Error{Kind: ErrNotFile, Text: "is a submodule or another repository, which is not read"}
	errSpecial  = &Error{Kind: ErrNotFile, Text: "is neither a file nor a folder"}
)

// refusal is why something of this mode cannot be read as a file; nil for a
// regular file.
func refusal(mode fs.FileMode) error {
	switch {
	case mode.IsRegular():
		return nil
	case mode.IsDir():
		return errIsFolder
	case mode&fs.ModeSymlink != 0:
		return errIsLink
	case mode&fs.ModeIrregular != 0:
		return errIsModule
	}
	return errSpecial
}
