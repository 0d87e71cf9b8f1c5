package trace

import (
	"errors"
	"io/fs"
	"slices"
	"strings"

	"speedtrail/history/revision"
	"speedtrail/schema"
)

// frameFiles are the files beside the routes and requests.
var frameFiles = []string{"dataset.toml", "trains.toml", "accepted.toml", "signoff.toml", "allowed_signers"}

// listing is what a commit holds of a data set, by name and identity.
type listing struct {
	files fs.FS
	// absent: there is nothing of a data set, or not even its folder.
	absent bool
	root   []fs.DirEntry // of frameFiles, and what stands in place of the folders
	routes []entry       // the folders in routes/, in byte order
	strays []fs.DirEntry // what else stands in routes/
	// frame is the same for equal frames: everything but routes and requests.
	frame    string
	requests string // identity of the folder, empty for none
}

// entry is a folder of a route.
type entry struct {
	fs.DirEntry
	name, identity string
}

// list reads what a commit holds.
func list(repo *revision.Repo, commit Hash, folder string) (*listing, error) {
	l := &listing{}
	var err error
	if l.files, err = repo.Snapshot(commit.String(), folder); errors.Is(err, revision.ErrNoFolder) {
		l.absent = true
		return l, nil
	} else if err != nil {
		return nil, err
	}
	root, err := fs.ReadDir(l.files, ".")
	if err != nil {
		return nil, err
	}
	l.absent = true
	var frame strings.Builder
	note := func(e fs.DirEntry, name string, identity string) {
		frame.WriteString(name + "\x00" + e.Type().String() + identity + "\n")
	}
	for _, e := range root {
		name := e.Name()
		switch {
		case name == "routes" && e.IsDir():
			l.absent = false
			if err := l.listRoutes(func(e fs.DirEntry, name string) { note(e, name, "") }); err != nil {
				return nil, err
			}
		case name == "requests" && e.IsDir():
			l.requests = identityOf(e)
		case name == "routes" || name == "requests" || slices.Contains(frameFiles, name):
			l.absent = l.absent && name != "dataset.toml" && name != "trains.toml"
			l.root = append(l.root, e)
			note(e, name, identityOf(e))
		}
	}
	l.frame = frame.String()
	return l, nil
}

func (l *listing) listRoutes(note func(fs.DirEntry, string)) error {
	entries, err := fs.ReadDir(l.files, "routes")
	if err != nil {
		return err
	}
	l.routes = make([]entry, 0, len(entries))
	for _, e := range entries {
		if !e.IsDir() {
			l.strays = append(l.strays, e)
			note(e, "routes/"+e.Name())
			continue
		}
		l.routes = append(l.routes, entry{e, e.Name(), identityOf(e)})
	}
	return nil
}

func identityOf(e fs.DirEntry) string {
	if i, ok := e.(schema.Identified); ok {
		return i.Identity()
	}
	return ""
}

// change is a folder that differs between two listings.
type change struct{ old, now *entry } // nil where it is not there

// changes lists the folders that differ.
func changes(old, now []entry) []change {
	var list []change
	i, k := 0, 0
	for i < len(old) || k < len(now) {
		switch {
		case k == len(now) || i < len(old) && old[i].name < now[k].name:
			list = append(list, change{&old[i], nil})
			i++
		case i == len(old) || now[k].name < old[i].name:
			list = append(list, change{nil, &now[k]})
			k++
		default:
			if old[i].identity != now[k].identity {
				list = append(list, change{&old[i], &now[k]})
			}
			i++
			k++
		}
	}
	return list
}
