package schema

import (
	"io/fs"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"testing/fstest"

	"golang.org/x/tools/txtar"
)

// faultsFile is the last file of a faulty archive: the errors that are
// expected, one a line.
const faultsFile = "faults"

// directives are the lines of an archive's comment that mean something to the
// tests (testdata/README.md explains them).
type directives struct {
	escapes bool                   // \xNN stands for a byte
	types   map[string]fs.FileMode // what a path is instead of a file
}

func readDirectives(comment string) directives {
	d := directives{types: map[string]fs.FileMode{}}
	for line := range strings.Lines(comment) {
		name, value, _ := strings.Cut(strings.TrimSpace(line), ": ")
		switch name {
		case "escapes":
			d.escapes = true
		case "symlink":
			d.types[value] = fs.ModeSymlink | 0o777
		case "submodule":
			d.types[value] = fs.ModeIrregular
		case "device":
			d.types[value] = fs.ModeDevice
		}
	}
	return d
}

var escape = regexp.MustCompile(`\\x[0-9a-f]{2}`)

func unescape(s string) string {
	return escape.ReplaceAllStringFunc(s, func(e string) string {
		n, err := strconv.ParseUint(e[2:], 16, 8)
		if err != nil {
			panic(err)
		}
		return string([]byte{byte(n)})
	})
}

// files gives the data set of an archive.
func files(a *txtar.Archive) fstest.MapFS {
	d := readDirectives(string(a.Comment))
	m := fstest.MapFS{}
	for _, f := range a.Files {
		if f.Name == faultsFile {
			continue
		}
		name, data := f.Name, string(f.Data)
		if d.escapes {
			name, data = unescape(name), unescape(data)
		}
		m[name] = &fstest.MapFile{Data: []byte(data), Mode: 0o644}
	}
	for name, mode := range d.types {
		target := ""
		if mode&fs.ModeSymlink != 0 {
			target = "elsewhere"
		}
		m[name] = &fstest.MapFile{Data: []byte(target), Mode: mode}
	}
	return m
}

// clone copies a file system, so that a test can alter its files.
func clone(m fstest.MapFS) fstest.MapFS {
	c := fstest.MapFS{}
	for name, f := range m {
		g := *f
		c[name] = &g
	}
	return c
}

// with gives a copy in which one file has another content; an empty content
// removes it.
func with(m fstest.MapFS, name, content string) fstest.MapFS {
	c := clone(m)
	if delete(c, name); content != "" {
		c[name] = &fstest.MapFile{Data: []byte(content), Mode: 0o644}
	}
	return c
}

// small is the smallest data set, which tests alter.
func small() fstest.MapFS {
	m := fstest.MapFS{}
	for name, content := range map[string]string{
		"dataset.toml":         "format = 1\nname = \"Small\"\n",
		"trains.toml":          "[[train]]\nid = \"T1\"\nname = \"One\"\ncant_deficiency_mm = 150\naxle_load = \"C2\"\nlength_m = 200\nmax_speed_kmh = 160\n",
		"routes/r1/route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 10\n",
		"routes/r1/speed.csv":  "from_km,to_km,basic\n0,10,100\n",
	} {
		m[name] = &fstest.MapFile{Data: []byte(content), Mode: 0o644}
	}
	return m
}

func load(t testing.TB, fsys fs.FS) *Dataset {
	t.Helper()
	d, err := Load(t.Context(), fsys)
	if err != nil {
		t.Fatal(err)
	}
	return d
}
