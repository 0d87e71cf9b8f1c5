package trace

import (
	"context"
	"errors"
	"fmt"
	"hash/fnv"
	"io/fs"
	"slices"
	"strings"

	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/parallel"
	"speedtrail/schema/source"
)

// Key tells one reading of a route's folder from another: bare dates are read in
// the data set's time zone.
type Key struct {
	Tree Hash
	Zone string
}

// Loaded is what came of reading a route's folder. Its Route is kept only while
// the batch it came with is handed over.
type Loaded struct {
	Key
	Folder string // where it was first met
	ID     string // of the route; empty where there is a fault
	Fault  string // the first fault, its path from the route's folder
	Route  *schema.Route
	// Data is the route as the caller keeps it, where Each has set it.
	Data any
}

// checker reads parts of data sets, each once, and knows whether they are sound.
// A data set loads when each of its parts does, no id stands twice and no bound
// is passed.
type checker struct {
	prior    Prior
	repo     *revision.Repo
	each     func(*Loaded)
	readers  []map[string]*schema.Versions // of each share of the folders, by time zone
	frames   map[string]*frameInfo
	requests map[string]*requestInfo // by name, type and identity
	sets     map[string]string       // folder of requests -> first fault
	versions map[Key]*Loaded
	fresh    []*Loaded // read since they were last taken
}

type frameInfo struct {
	zone  string
	fault string
}

type requestInfo struct{ id, fault string }

// Folders are divided into shares, of which each is read by one processor at a
// time, which knows what it read last. There are more of them than processors, so
// that all have something to do until the last one is done.
const (
	shares   = 64
	keptRows = 4_000 // of each share
)

func newChecker(repo *revision.Repo, prior Prior, each func(*Loaded)) *checker {
	return &checker{
		prior: prior, repo: repo, each: each, readers: make([]map[string]*schema.Versions, shares), frames: map[string]*frameInfo{}, requests: map[string]*requestInfo{},
		sets: map[string]string{}, versions: map[Key]*Loaded{},
	}
}

// faultOf gives the first fault of a data set that was read; an error that is
// not about the data comes back as it is.
func faultOf(err error) (string, error) {
	var faults *source.Faults
	switch {
	case err == nil:
		return "", nil
	case errors.As(err, &faults):
		return faults.List[0].Error(), nil
	case errors.Is(err, revision.ErrNotFile), errors.Is(err, revision.ErrTooLarge), errors.Is(err, revision.ErrMalformed):
		return firstLine(err.Error()), nil
	}
	return "", err
}

func firstLine(s string) string {
	line, _, _ := strings.Cut(s, "\n")
	return line
}

// earlier gives the fault that stands first; an empty text is none.
func earlier(a, b string) string {
	if a == "" || b != "" && b < a {
		return b
	}
	return a
}

// frame reads everything beside the routes and requests.
func (k *checker) frame(ctx context.Context, l *listing) (*frameInfo, error) {
	if f, ok := k.frames[l.frame]; ok {
		return f, nil
	}
	files, err := k.repo.Folder(l.tree, what(l.commit))
	if err != nil {
		return nil, err
	}
	root, err := fs.ReadDir(files, ".")
	if err != nil {
		return nil, err
	}
	m := newMount()
	var strays []fs.DirEntry
	for _, e := range root {
		folder := e.IsDir() && (e.Name() == "routes" || e.Name() == "requests")
		if !folder && (e.Name() == "routes" || e.Name() == "requests" || slices.Contains(frameFiles, e.Name()) || schema.NearlyNamed(e.Name(), e.IsDir())) {
			m.file(e, files)
		}
		if folder && e.Name() == "routes" && l.strays != "" {
			if strays, err = fs.ReadDir(files, "routes"); err != nil {
				return nil, err
			}
			strays = slices.DeleteFunc(strays, fs.DirEntry.IsDir)
		}
	}
	m.plainRoute()
	m.routes = append(m.routes, strays...)
	data, err := schema.Load(ctx, m)
	f := &frameInfo{}
	if f.fault, err = faultOf(err); err != nil {
		return nil, err
	}
	if f.fault == "" {
		f.zone = data.TimeZone.String()
	}
	k.frames[l.frame] = f
	return f, nil
}

// requestSet gives the first fault of a commit's change requests.
func (k *checker) requestSet(ctx context.Context, l *listing) (string, error) {
	if l.requests == "" {
		return "", nil
	}
	if fault, ok := k.sets[l.requests]; ok {
		return fault, nil
	}
	files, err := k.repo.Folder(l.tree, what(l.commit))
	if err != nil {
		return "", err
	}
	entries, err := fs.ReadDir(files, "requests")
	fault, err := faultOf(err)
	if err != nil {
		return "", err
	}
	seen := make(map[string]bool, len(entries))
	count := 0
	for _, e := range entries {
		q, err := k.request(ctx, files, e)
		if err != nil {
			return "", err
		}
		fault = earlier(fault, q.fault)
		if q.id == "" {
			continue
		}
		if seen[q.id] {
			fault = earlier(fault, "requests/"+e.Name()+": request id "+source.Quote(q.id)+" stands twice; ids are unique")
		}
		seen[q.id] = true
		if count++; count > schema.MaxRequests {
			fault = earlier(fault, "requests: too many requests")
		}
	}
	k.sets[l.requests] = fault
	return fault, nil
}

// request reads one entry of the folder of requests.
func (k *checker) request(ctx context.Context, files fs.FS, e fs.DirEntry) (*requestInfo, error) {
	key := e.Name() + "\x00" + e.Type().String() + identityOf(e)
	if q, ok := k.requests[key]; ok {
		return q, nil
	}
	m := newMount()
	m.plainFrame("")
	m.plainRoute()
	m.request(e, files)
	data, err := schema.Load(ctx, m)
	q := &requestInfo{}
	if q.fault, err = faultOf(err); err != nil {
		return nil, err
	}
	if q.fault == "" && len(data.Requests) > 0 {
		q.id = data.Requests[0].ID
	}
	k.requests[key] = q
	return q, nil
}

// want is a folder that is to be read.
type want struct {
	Key
	name   string
	commit Hash // that has it
}

// version gives what came of a folder, reading it if need be.
func (k *checker) version(ctx context.Context, w want) (*Loaded, error) {
	if v, err := k.known(w.Key); v != nil || err != nil {
		return v, err
	}
	if err := k.load(ctx, []want{w}); err != nil {
		return nil, err
	}
	return k.versions[w.Key], nil
}

// known gives what came of a folder that was read before, or nil.
func (k *checker) known(key Key) (*Loaded, error) {
	if v, ok := k.versions[key]; ok {
		return v, nil
	}
	if k.prior == nil {
		return nil, nil
	}
	v, err := k.prior.Version(key)
	if err == nil && v != nil {
		k.versions[key] = v
	}
	return v, err
}

// load reads folders, on all processors.
func (k *checker) load(ctx context.Context, wants []want) error {
	var parts [shares][]*Loaded
	var fresh []*Loaded
	of := map[Key]Hash{}
	for _, w := range wants {
		if _, ok := of[w.Key]; ok {
			continue
		}
		of[w.Key] = w.commit
		v := &Loaded{Key: w.Key, Folder: "routes/" + w.name}
		h := fnv.New32a()
		h.Write([]byte(w.name))
		n := h.Sum32() % shares
		parts[n] = append(parts[n], v)
		fresh = append(fresh, v)
	}
	err := parallel.Try(ctx, len(parts), func(ctx context.Context, n int) error {
		// The versions of a folder one after the other: each is stored as a
		// difference to the next, and mostly has the rows of the one before.
		slices.SortStableFunc(parts[n], func(a, b *Loaded) int { return strings.Compare(a.Folder, b.Folder) })
		for _, v := range parts[n] {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := k.loadOne(n, v, of[v.Key]); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return err
	}
	for _, v := range fresh {
		k.versions[v.Key] = v
	}
	k.fresh = append(k.fresh, fresh...)
	return nil
}

// loadOne reads a folder with the reader of its share.
func (k *checker) loadOne(n int, v *Loaded, commit Hash) error {
	if k.readers[n] == nil {
		k.readers[n] = map[string]*schema.Versions{}
	}
	versions := k.readers[n][v.Zone]
	if versions == nil {
		zone, ok := schema.Zone(v.Zone)
		if !ok {
			return fmt.Errorf("time zone %s, which the data set was read in, is not known", source.Quote(v.Zone))
		}
		versions = schema.NewVersions(zone, keptRows)
		if k.each != nil {
			versions.Reusing()
		}
		k.readers[n][v.Zone] = versions
	}
	var route *schema.Route
	files, err := k.repo.Folder(v.Tree, what(commit))
	if err == nil {
		route, err = versions.Read(&under{v.Folder, files}, v.Folder)
	}
	fault, err := faultOf(err)
	if err != nil {
		return err
	}
	v.Fault = strings.TrimPrefix(fault, v.Folder+"/")
	if fault == "" {
		v.ID, v.Route = route.ID, route
		if k.each != nil {
			k.each(v)
		}
	}
	return nil
}

// take gives what was read since the last call.
func (k *checker) take() []*Loaded {
	list := k.fresh
	k.fresh = nil
	return list
}

// forget lets go of routes that were handed over.
func forget(list []*Loaded) {
	for _, v := range list {
		v.Route, v.Data = nil, nil
	}
}
