package schema

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path"
	"strings"
	"time"

	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// reader reads some files of a data set. It stops at the first error of the
// file system and goes on after faults.
type reader struct {
	fsys    fs.FS
	zone    *time.Location  // of bare dates
	refused map[string]bool // files and folders that have a fault already and are not opened
	faults  source.Collector
	files   []File
	id      source.Position            // of the id in the route.toml that was read last
	seen    map[string]source.Position // ids of the table that is being read
	kept    *kept                      // what is known of the version of a route that was read before; nil: nothing is kept
	reuse   bool                       // what is kept may be overwritten
	err     error
}

// Bounded is what a file system can offer beside fs.FS: it reads a whole file
// that has at most some bytes, and only tells the size of a larger one.
type Bounded interface {
	ReadAtMost(name string, most int64) (content []byte, size int64, err error)
}

// file reads a file that may be missing.
func (r *reader) file(name string, most int64) (content []byte, ok bool) {
	if r.err != nil || r.refused[name] {
		return nil, false
	}
	if b, ok := r.fsys.(Bounded); ok {
		content, size, err := b.ReadAtMost(name, most)
		switch {
		case errors.Is(err, fs.ErrNotExist):
			return nil, false
		case err != nil:
			r.err = err
			return nil, false
		case size > most:
			r.faults.Add(source.Position{File: name}, "%d bytes, at most %d are allowed", size, most)
			return nil, false
		}
		r.files = append(r.files, File{Path: name, Content: content})
		return content, true
	}
	f, err := r.fsys.Open(name)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, false
	}
	if err != nil {
		r.err = err
		return nil, false
	}
	defer f.Close()
	info, err := f.Stat()
	if err == nil && info.Size() > most {
		r.faults.Add(source.Position{File: name}, "%d bytes, at most %d are allowed", info.Size(), most)
		return nil, false
	}
	var b bytes.Buffer
	if err == nil {
		b.Grow(int(info.Size()) + bytes.MinRead)
		_, err = b.ReadFrom(io.LimitReader(f, most+1))
	}
	if err != nil {
		r.err = fmt.Errorf("%s: %w", name, err)
		return nil, false
	}
	if int64(b.Len()) > most {
		r.faults.Add(source.Position{File: name}, "more than %d bytes, which is the most that is allowed", most)
		return nil, false
	}
	r.files = append(r.files, File{Path: name, Content: b.Bytes()})
	return b.Bytes(), true
}

// toml reads a TOML file; false where it is missing or faulty in form.
func (r *reader) toml(name string, required bool) (table.Reader, bool) {
	count := r.faults.Count()
	content, ok := r.file(name, table.MaxTOMLSize)
	if !ok {
		if required && r.err == nil && r.faults.Count() == count && !r.refused[name] {
			r.faults.Add(source.Position{File: name}, "the file is missing")
		}
		return table.Reader{}, false
	}
	m := table.ReadTOML(name, content, &r.faults)
	if m == nil {
		return table.Reader{}, false
	}
	return table.Reader{Map: m, Faults: &r.faults}, true
}

// valuePlace gives where the value of a key stands, or the table where the key
// is not there.
func valuePlace(m table.Reader, key string) source.Position {
	if v := m.Get(key); v != nil {
		return v.Pos
	}
	return m.Pos
}

// checkType refuses what is neither a file nor a folder.
func checkType(faults *source.Collector, e fs.DirEntry, p string, dir bool) bool {
	at := source.Position{File: p}
	switch mode := e.Type(); {
	case mode&fs.ModeSymlink != 0:
		faults.Add(at, "is a symbolic link, a data set holds plain files and folders only")
	case mode&fs.ModeIrregular != 0:
		faults.Add(at, "is a submodule or another repository, a data set holds plain files and folders only")
	case e.IsDir() && !dir:
		faults.Add(at, "is a folder, a file is needed")
	case !e.IsDir() && !mode.IsRegular():
		faults.Add(at, "is a special file, a data set holds plain files and folders only")
	case !e.IsDir() && dir:
		faults.Add(at, "is a file, a folder is needed")
	default:
		return true
	}
	return false
}

// isData tells whether a name looks like one of a data set's files.
func isData(name string) bool {
	ending := strings.ToLower(path.Ext(name))
	return ending == ".csv" || ending == ".toml"
}
