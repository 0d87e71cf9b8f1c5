package trace

import (
	"bytes"
	"io"
	"io/fs"
	"path"
	"slices"
	"strings"
	"time"
)

// mount is a data set put together from parts of real ones, so that package
// schema reads and checks exactly those parts, under the paths that they have.
type mount struct {
	root, routes, requests []fs.DirEntry
	from                   map[string]fs.FS  // "dataset.toml", "routes/x", "requests/q.toml" -> where it stands
	made                   map[string][]byte // files that stand nowhere
}

func newMount() *mount { return &mount{from: map[string]fs.FS{}, made: map[string][]byte{}} }

// folder adds a route's folder.
func (m *mount) folder(e fs.DirEntry, files fs.FS) {
	m.routes = append(m.routes, e)
	m.from["routes/"+e.Name()] = files
}

// file adds a file of the root.
func (m *mount) file(e fs.DirEntry, files fs.FS) {
	m.root = append(m.root, e)
	m.from[e.Name()] = files
}

// request adds an entry of the folder of change requests.
func (m *mount) request(e fs.DirEntry, files fs.FS) {
	m.requests = append(m.requests, e)
	m.from["requests/"+e.Name()] = files
}

// make adds a file with a content.
func (m *mount) make(name, content string) {
	m.made[name] = []byte(content)
	e := madeEntry{path.Base(name), false, int64(len(content))}
	switch path.Dir(name) {
	case ".":
		m.root = append(m.root, e)
	case "requests":
		m.requests = append(m.requests, e)
	}
}

// plainRoute adds a made route, for readings that are not about routes.
func (m *mount) plainRoute() {
	m.routes = append(m.routes, madeEntry{name: plainFolder, dir: true})
	m.made["routes/"+plainFolder+"/route.toml"] = []byte("id = \"plain\"\nname = \"plain\"\nstart_km = 0\nend_km = 1\n")
	m.made["routes/"+plainFolder+"/speed.csv"] = []byte("from_km,to_km,basic\n0,1,5\n")
}

// plainFrame adds made files beside the routes, with a time zone.
func (m *mount) plainFrame(zone string) {
	text := "format = 1\nname = \"plain\"\n"
	if zone != "" {
		text += "time_zone = \"" + zone + "\"\n"
	}
	m.make("dataset.toml", text)
	m.make("trains.toml", "[[train]]\nid = \"plain\"\nname = \"plain\"\ncant_deficiency_mm = 80\naxle_load = \"A\"\nlength_m = 1\nmax_speed_kmh = 5\n")
}

const plainFolder = "plain"

// ReadDir lists a folder.
func (m *mount) ReadDir(name string) ([]fs.DirEntry, error) {
	var list []fs.DirEntry
	switch name {
	case ".":
		list = slices.Clone(m.root)
		list = append(list, madeEntry{name: "routes", dir: true})
		if len(m.requests) > 0 {
			list = append(list, madeEntry{name: "requests", dir: true})
		}
	case "routes":
		list = slices.Clone(m.routes)
	case "requests":
		if len(m.requests) == 0 {
			return nil, &fs.PathError{Op: "readdir", Path: name, Err: fs.ErrNotExist}
		}
		list = slices.Clone(m.requests)
	case "routes/" + plainFolder:
		if _, real := m.from[name]; !real {
			return []fs.DirEntry{madeEntry{"route.toml", false, 1}, madeEntry{"speed.csv", false, 1}}, nil
		}
		fallthrough
	default:
		files, ok := m.from[part(name)]
		if !ok {
			return nil, &fs.PathError{Op: "readdir", Path: name, Err: fs.ErrNotExist}
		}
		return fs.ReadDir(files, name)
	}
	slices.SortFunc(list, func(a, b fs.DirEntry) int { return strings.Compare(a.Name(), b.Name()) })
	return list, nil
}

// Open opens a file.
func (m *mount) Open(name string) (fs.File, error) {
	if content, ok := m.made[name]; ok {
		return &madeFile{madeEntry{path.Base(name), false, int64(len(content))}, bytes.NewReader(content)}, nil
	}
	files, ok := m.from[part(name)]
	if !ok {
		return nil, &fs.PathError{Op: "open", Path: name, Err: fs.ErrNotExist}
	}
	return files.Open(name)
}

// part gives the part of a mount that a path belongs to: its first element, or
// its first two below routes and requests.
func part(name string) string {
	first, rest, below := strings.Cut(name, "/")
	if !below || first != "routes" && first != "requests" {
		return first
	}
	second, _, _ := strings.Cut(rest, "/")
	return first + "/" + second
}

// madeEntry is an entry that stands nowhere, and its own fs.FileInfo.
type madeEntry struct {
	name string
	dir  bool
	size int64
}

func (e madeEntry) Name() string               { return e.name }
func (e madeEntry) IsDir() bool                { return e.dir }
func (e madeEntry) Info() (fs.FileInfo, error) { return e, nil }
func (e madeEntry) Size() int64                { return e.size }
func (e madeEntry) ModTime() time.Time         { return time.Time{} }
func (e madeEntry) Sys() any                   { return nil }
func (e madeEntry) Type() fs.FileMode          { return e.Mode().Type() }
func (e madeEntry) Mode() fs.FileMode {
	if e.dir {
		return fs.ModeDir | 0o755
	}
	return 0o644
}

type madeFile struct {
	info madeEntry
	io.Reader
}

func (f *madeFile) Stat() (fs.FileInfo, error) { return f.info, nil }
func (f *madeFile) Close() error               { return nil }
