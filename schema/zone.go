package schema

import (
	"archive/zip"
	_ "embed"
	"io"
	"strings"
	"sync"
	"time"
)

// zoneInfo is the IANA time zone database, which is in the public domain, in the form
// that the Go project gives it: lib/time/zoneinfo.zip of a Go distribution.
//
//go:embed zoneinfo.zip
var zoneInfo string

var zoneFiles = sync.OnceValue(func() map[string]*zip.File {
	archive, err := zip.NewReader(strings.NewReader(zoneInfo), int64(len(zoneInfo)))
	if err != nil {
		panic(err) // it was compiled in so
	}
	files := make(map[string]*zip.File, len(archive.File))
	for _, f := range archive.File {
		if !strings.HasSuffix(f.Name, "/") {
			files[f.Name] = f
		}
	}
	return files
})

// Zone gives a time zone by its name in the IANA database, as the program carries it
// along; false where it has no such name. A machine's own database is not asked: the
// same data would say one thing here and another there where the two are of other years,
// "localtime" and "posixrules" are what its owner has chosen, "right/" counts leap seconds, and
// where files have names without letter case, so do zones. An assessment that is recorded
// here would be wrong there.
func Zone(name string) (zone *time.Location, ok bool) {
	if name == "UTC" {
		return time.UTC, true
	}
	f := zoneFiles()[name]
	if f == nil {
		return nil, false
	}
	r, err := f.Open()
	if err != nil {
		return nil, false
	}
	defer r.Close()
	data, err := io.ReadAll(r)
	if err != nil {
		return nil, false
	}
	zone, err = time.LoadLocationFromTZData(name, data)
	return zone, err == nil
}
