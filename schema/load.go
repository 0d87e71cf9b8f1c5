package schema

import (
	"context"
	"errors"
	"io/fs"
	"maps"
	"slices"
	"strings"

	"speedtrail/schema/parallel"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// Bounds of a data set.
const (
	MaxRoutes   = 20_000
	MaxRequests = 10_000
	MaxTrains   = 1_000
	MaxJumps    = 1_000
)

// The files of a data set.
const (
	datasetFile  = "dataset.toml"
	trainsFile   = "trains.toml"
	acceptedFile = "accepted.toml"
	signoffFile  = "signoff.toml"
	signersFile  = "allowed_signers"
	routesDir    = "routes"
	requestsDir  = "requests"
	routeFile    = "route.toml"
)

var routeFiles = [...]string{routeFile, "speed.csv", "axle-load.csv", "temporary.csv", "curves.csv", "gradients.csv", "places.csv"}

// Identified is what a directory entry can offer beside fs.DirEntry: equal
// identities that are not empty mean equal content.
type Identified interface{ Identity() string }

// PairError is what is wrong with either side of LoadPair.
type PairError struct{ Base, Target error }

// Error gives both sides' errors.
func (e *PairError) Error() string {
	switch {
	case e.Base == nil:
		return "target: " + e.Target.Error()
	case e.Target == nil:
		return "base: " + e.Base.Error()
	}
	return "base: " + e.Base.Error() + "\ntarget: " + e.Target.Error()
}

// Unwrap gives the errors of both sides.
func (e *PairError) Unwrap() []error {
	var list []error
	for _, err := range []error{e.Base, e.Target} {
		if err != nil {
			list = append(list, err)
		}
	}
	return list
}

// Load reads and checks the data set in fsys. Where the data is faulty, the
// error is a *source.Faults with every fault; else it is an error of fsys or of
// the context.
func Load(ctx context.Context, fsys fs.FS) (*Dataset, error) {
	l := &loading{fsys: fsys}
	if err := l.list(); err != nil {
		return nil, err
	}
	if err := l.read(ctx, l.folders); err != nil {
		return nil, err
	}
	return l.finish()
}

// LoadPair reads two revisions of one data set. It leaves out, on both sides,
// the folders of routes that hold the same files on both: they are listed in
// Dataset.Unread. The error is a *PairError.
func LoadPair(ctx context.Context, base, target fs.FS) (b, t *Dataset, err error) {
	sides := [2]*loading{{fsys: base}, {fsys: target}}
	errs := [2]error{sides[0].list(), sides[1].list()}
	if errs[0] == nil && errs[1] == nil {
		readDiffering(ctx, sides, &errs)
	}
	var data [2]*Dataset
	for i, l := range sides {
		if errs[i] == nil {
			data[i], errs[i] = l.finish()
		}
	}
	if err := ctx.Err(); err != nil {
		return nil, nil, err
	}
	if errs[0] != nil || errs[1] != nil {
		return nil, nil, &PairError{errs[0], errs[1]}
	}
	return data[0], data[1], nil
}

// readDiffering reads the folders that differ. Where that brings a route id to
// one side that the other side's differing folders do not have, the ids of the
// equal folders are looked at, too: it must not be one of theirs.
func readDiffering(ctx context.Context, sides [2]*loading, errs *[2]error) {
	inBase, same := map[Folder]bool{}, map[Folder]bool{}
	for _, f := range sides[0].folders {
		inBase[f] = f.Identity != ""
	}
	for _, f := range sides[1].folders {
		same[f] = inBase[f]
	}
	for i, l := range sides {
		var read []Folder
		for _, f := range l.folders {
			if same[f] {
				l.data.Unread = append(l.data.Unread, f)
			} else {
				read = append(read, f)
			}
		}
		errs[i] = l.read(ctx, read)
	}
	var ids [2]map[string]bool
	for i, l := range sides {
		ids[i] = map[string]bool{}
		for _, r := range l.data.Routes {
			ids[i][r.ID] = true
		}
	}
	if maps.Equal(ids[0], ids[1]) {
		return
	}
	for i, l := range sides {
		if errs[i] == nil {
			errs[i] = l.readUnreadIDs(ctx)
		}
	}
}

// UnreadRoute gives a route whose folder was left unread, with what its
// route.toml says and without its tables.
func UnreadRoute(fsys fs.FS, f Folder) (*Route, error) {
	r := reader{fsys: fsys}
	route := r.routeTOML(f.Path)
	if r.err != nil {
		return nil, r.err
	}
	if route == nil {
		return nil, r.faults.Err()
	}
	return route, nil
}

// loading is one data set while it is read.
type loading struct {
	fsys    fs.FS
	folders []Folder
	refused map[string]bool // files and folders that are not what they have to be
	faults  source.Collector
	data    Dataset
	ids     map[*Route]source.Position // where the ids of routes are written
	unread  map[string]string          // id -> folder, of unread routes, where they were looked at
}

// list finds the route folders.
func (l *loading) list() error {
	l.refused = map[string]bool{}
	root, err := fs.ReadDir(l.fsys, ".")
	if err != nil {
		return err
	}
	for _, e := range root {
		dir := e.Name() == routesDir || e.Name() == requestsDir
		file := slices.Contains([]string{datasetFile, trainsFile, acceptedFile, signoffFile, signersFile}, e.Name())
		if (dir || file) && !checkType(&l.faults, e, e.Name(), dir) {
			l.refused[e.Name()] = true
		}
		if !dir && !file {
			mistyped(&l.faults, e.Name(), e.Name(), namesBeside(e.IsDir()))
		}
	}
	if i := slices.IndexFunc(root, func(e fs.DirEntry) bool { return e.Name() == routesDir && e.IsDir() }); i < 0 {
		return nil
	}
	entries, err := fs.ReadDir(l.fsys, routesDir)
	if err != nil {
		return err
	}
	folded := map[string]string{}
	for _, e := range entries {
		p := routesDir + "/" + e.Name()
		if !e.IsDir() {
			if checkType(&l.faults, e, p, false) && isData(e.Name()) {
				l.faults.Add(source.Position{File: p}, "a table or TOML file directly in routes/, each route has a folder of its own there")
			}
			continue
		}
		if problem := table.TextProblem(e.Name()); problem != "" {
			l.faults.Add(source.Position{File: p}, "the folder's name is %s", problem)
			continue
		}
		fold := strings.ToLower(e.Name())
		if other, ok := folded[fold]; ok {
			l.faults.Add(source.Position{File: p}, "the folder's name differs from %s in letter case only, which some file systems cannot hold", source.Quote(other))
		}
		folded[fold] = e.Name()
		l.folders = append(l.folders, Folder{Path: p, Identity: identityOf(e)})
	}
	if len(l.folders) > MaxRoutes {
		l.faults.Add(source.Position{File: routesDir}, "%d route folders, at most %d are allowed", len(l.folders), MaxRoutes)
		l.folders = l.folders[:MaxRoutes]
	}
	return nil
}

// read reads the frame of the data set and the given route folders, as many at
// a time as there are processors.
func (l *loading) read(ctx context.Context, folders []Folder) error {
	frame := &reader{fsys: l.fsys, refused: l.refused}
	frame.frame(&l.data)
	if len(l.folders) == 0 && frame.err == nil {
		frame.faults.Add(source.Position{File: routesDir}, "no route: a data set has at least one folder in routes/, with a route.toml")
	}
	readers := make([]reader, len(folders))
	routes := make([]*Route, len(folders))
	err := parallel.Try(ctx, len(folders), func(_ context.Context, i int) error {
		readers[i].fsys, readers[i].zone = l.fsys, l.data.TimeZone
		routes[i] = readers[i].route(folders[i].Path)
		return readers[i].err
	})
	if err := errors.Join(frame.err, err); err != nil {
		return err
	}
	l.take(frame)
	for i := range readers {
		l.take(&readers[i])
	}
	l.ids = map[*Route]source.Position{}
	for i, r := range routes {
		if r != nil {
			l.data.Routes, l.ids[r] = append(l.data.Routes, r), readers[i].id
		}
	}
	return nil
}

func (l *loading) take(r *reader) {
	l.faults.Merge(&r.faults)
	l.data.Files = append(l.data.Files, r.files...)
}

// readUnreadIDs looks at the ids of the unread routes.
func (l *loading) readUnreadIDs(ctx context.Context) error {
	l.unread = map[string]string{}
	for _, f := range l.data.Unread {
		if err := ctx.Err(); err != nil {
			return err
		}
		r, err := UnreadRoute(l.fsys, f)
		if err != nil {
			return err
		}
		l.unread[r.ID] = f.Path
	}
	return nil
}

// finish checks what concerns the data set as a whole and sorts it.
func (l *loading) finish() (*Dataset, error) {
	d := &l.data
	slices.SortStableFunc(d.Routes, func(a, b *Route) int { return strings.Compare(a.ID, b.ID) })
	for i, r := range d.Routes {
		if folder, ok := l.unread[r.ID]; ok {
			l.faults.Add(l.ids[r], "route id %s is that of %s, too; ids are unique", source.Quote(r.ID), folder)
		}
		if i > 0 && d.Routes[i-1].ID == r.ID {
			l.faults.Add(l.ids[r], "route id %s is that of %s, too; ids are unique", source.Quote(r.ID), d.Routes[i-1].Folder)
		}
	}
	if err := l.faults.Err(); err != nil {
		return nil, err
	}
	slices.SortFunc(d.Files, func(a, b File) int { return strings.Compare(a.Path, b.Path) })
	slices.SortFunc(d.Unread, func(a, b Folder) int { return strings.Compare(a.Path, b.Path) })
	return d, nil
}
