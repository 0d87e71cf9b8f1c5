package trace

import (
	"io/fs"
	"slices"
	"strings"

	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// frameFiles are the files beside the routes and requests.
var frameFiles = []string{"dataset.toml", "trains.toml", "accepted.toml", "signoff.toml", "allowed_signers"}

// listing is what a commit holds of a data set, by name and hash.
type listing struct {
	commit Hash
	tree   Hash // of the data set's folder; zero: there is none
	// absent: there is nothing of a data set, or not even its folder.
	absent bool
	routes Hash // of the folder routes/; zero: there is none
	// strays names what else stands in routes/.
	strays string
	// fault is what makes the folder itself none that is read.
	fault string
	// frame is the same for equal frames: everything but routes and requests.
	frame    string
	requests string // identity of the folder, empty for none
}

// entry is a folder of a route.
type entry struct {
	name string
	tree Hash
}

// change is a folder that differs between two listings: a zero hash stands for
// one that is not there.
type change struct {
	name     string
	old, now Hash
}

// lister lists what commits hold, mostly one after the other. It is not safe for
// concurrent use.
type lister struct {
	repo   *revision.Repo
	folder []string // the names on the way to the data set's folder
	recent [8]recentTree
	next   int
	near   map[nearName]bool // what schema.NearlyNamed has said
}

type nearName struct {
	name   string
	folder bool
}

// recentTree is a folder routes/ that was read lately.
type recentTree struct {
	hash Hash
	tree revision.Tree
}

func newLister(repo *revision.Repo, folder string) *lister {
	l := &lister{repo: repo}
	if folder != "" && folder != "." {
		l.folder = strings.Split(folder, "/")
	}
	return l
}

func what(commit Hash) string { return "commit " + commit.String() }

// list lists what a commit holds, and the folders that it has otherwise than the
// one before it; nil: there is none. A commit with a tree that is none is one that does
// not load: it stays in the history for ever, and may not stop the reading of all.
func (l *lister) list(commit, root Hash, before *listing) (*listing, []change, error) {
	if before == nil {
		before = &listing{absent: true}
	}
	out, list, err := l.sound(commit, root, before)
	if fault, failed := faultOf(err); fault != "" && failed == nil {
		out = &listing{commit: commit, fault: fault}
		list, err = l.changes(before, out)
	}
	return out, list, err
}

// sound lists a commit whose trees can be read.
func (l *lister) sound(commit, root Hash, before *listing) (*listing, []change, error) {
	out := &listing{commit: commit, tree: root}
	for _, name := range l.folder {
		at, _, err := l.repo.Tree(out.tree, revision.Tree{}, what(commit))
		if err != nil {
			return nil, nil, err
		}
		e, ok := at.Find(name)
		if !ok || !e.Mode.IsDir() {
			out.tree, out.absent = Hash{}, !ok
			if ok {
				out.fault = source.Quote(name) + " is a file or a link, and not a folder with a data set"
			}
			list, err := l.changes(before, out)
			return out, list, err
		}
		out.tree = e.Hash
	}
	if out.tree == before.tree {
		again := *before
		again.commit = commit
		return &again, nil, nil
	}
	files, _, err := l.repo.Tree(out.tree, revision.Tree{}, what(commit))
	if err != nil {
		return nil, nil, err
	}
	out.absent = true
	var frame strings.Builder
	for e := range files.All() {
		name := e.Name
		switch {
		case name == "routes" && e.Mode.IsDir():
			out.absent, out.routes = false, e.Hash
		case name == "requests" && e.Mode.IsDir():
			out.requests = Hash(e.Hash).String()
		case name == "routes" || name == "requests" || slices.Contains(frameFiles, name):
			out.absent = out.absent && name != "dataset.toml" && name != "trains.toml"
			frame.WriteString(name + "\x00" + e.Mode.Type().String() + string(e.Hash[:]) + "\n")
		case l.nearlyNamed(name, e.Mode.IsDir()):
			// It is refused, whatever it holds.
			out.absent = false
			frame.WriteString(name + "\x00" + e.Mode.Type().String() + "\n")
		}
	}
	list, err := l.changes(before, out)
	frame.WriteString(out.strays)
	out.frame = frame.String()
	return out, list, err
}

// nearlyNamed is schema.NearlyNamed, which is asked about each name once.
func (l *lister) nearlyNamed(name string, folder bool) bool {
	key := nearName{name, folder}
	near, known := l.near[key]
	if !known {
		if l.near == nil || len(l.near) >= 10_000 {
			l.near = map[nearName]bool{}
		}
		near = schema.NearlyNamed(name, folder)
		l.near[key] = near
	}
	return near
}

// changes lists the folders that differ between two listings, in byte order, and
// fills in what else stands in routes/.
func (l *lister) changes(before, now *listing) ([]change, error) {
	now.strays = before.strays
	if before.routes == now.routes {
		return nil, nil
	}
	list, err := l.difference(before, now)
	if err != nil {
		return nil, err
	}
	var out []change
	strays := false
	for _, x := range list {
		c := change{name: x.Old.Name + x.Now.Name}
		if x.Old.Name != "" && x.Now.Name != "" {
			c.name = x.Now.Name
		}
		if x.Old.Name != "" && x.Old.Mode.IsDir() {
			c.old = x.Old.Hash
		} else if x.Old.Name != "" {
			strays = true
		}
		if x.Now.Name != "" && x.Now.Mode.IsDir() {
			c.now = x.Now.Hash
		} else if x.Now.Name != "" {
			strays = true
		}
		if c.old != c.now {
			out = append(out, c)
		}
	}
	slices.SortFunc(out, func(a, b change) int { return strings.Compare(a.name, b.name) })
	if !strays {
		return out, nil
	}
	t, err := l.routes(now)
	if err != nil {
		return nil, err
	}
	now.strays = ""
	for e := range t.All() {
		if !e.Mode.IsDir() {
			now.strays += "routes/" + e.Name + "\x00" + e.Mode.Type().String() + "\n"
		}
	}
	return out, nil
}

// difference compares the folders routes/ of two listings.
func (l *lister) difference(before, now *listing) ([]revision.TreeChange, error) {
	old, err := l.routes(before)
	if err != nil {
		return nil, err
	}
	t, list, err := l.repo.Tree(now.routes, old, what(now.commit))
	if err == nil {
		l.remember(now.routes, t)
	}
	return list, err
}

// routes reads the folder routes/ of a listing.
func (l *lister) routes(x *listing) (revision.Tree, error) {
	for _, r := range l.recent {
		if r.hash == x.routes {
			return r.tree, nil // the zero hash is the zero tree
		}
	}
	t, _, err := l.repo.Tree(x.routes, revision.Tree{}, what(x.commit))
	if err == nil {
		l.remember(x.routes, t)
	}
	return t, err
}

func (l *lister) remember(h Hash, t revision.Tree) {
	if h != (Hash{}) {
		l.recent[l.next] = recentTree{h, t}
		l.next = (l.next + 1) % len(l.recent)
	}
}

// all lists the folders of routes, in byte order.
func (l *lister) all(x *listing) ([]entry, error) {
	t, err := l.routes(x)
	if err != nil {
		return nil, err
	}
	var list []entry
	for e := range t.All() {
		if e.Mode.IsDir() {
			list = append(list, entry{e.Name, e.Hash})
		}
	}
	slices.SortFunc(list, func(a, b entry) int { return strings.Compare(a.name, b.name) })
	return list, nil
}

func identityOf(e fs.DirEntry) string {
	if i, ok := e.(schema.Identified); ok {
		return i.Identity()
	}
	return ""
}
