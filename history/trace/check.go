package trace

import (
	"context"
	"errors"
	"io/fs"
	"runtime"
	"strings"
	"sync"

	"golang.org/x/sync/errgroup"

	"speedtrail/history/revision"
	"speedtrail/schema"
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
}

// checker reads parts of data sets, each once, and knows whether they are sound.
// A data set loads when each of its parts does, no id stands twice and no bound
// is passed.
type checker struct {
	prior    Prior
	frames   map[string]*frameInfo
	requests map[string]*requestInfo // by name, type and identity
	sets     map[string]string       // folder of requests -> first fault
	mu       sync.Mutex
	versions map[Key]*Loaded
	fresh    []*Loaded // read since they were last taken
}

type frameInfo struct {
	zone  string
	fault string
}

type requestInfo struct{ id, fault string }

func newChecker(prior Prior) *checker {
	return &checker{
		prior: prior, frames: map[string]*frameInfo{}, requests: map[string]*requestInfo{},
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
	case errors.Is(err, revision.ErrNotFile), errors.Is(err, revision.ErrTooLarge):
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
	m := newMount()
	for _, e := range l.root {
		m.file(e, l.files)
	}
	m.plainRoute()
	m.routes = append(m.routes, l.strays...)
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
	entries, err := fs.ReadDir(l.files, "requests")
	if err != nil {
		return "", err
	}
	fault := ""
	seen := make(map[string]bool, len(entries))
	count := 0
	for _, e := range entries {
		q, err := k.request(ctx, l, e)
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
func (k *checker) request(ctx context.Context, l *listing, e fs.DirEntry) (*requestInfo, error) {
	key := e.Name() + "\x00" + e.Type().String() + identityOf(e)
	if q, ok := k.requests[key]; ok {
		return q, nil
	}
	m := newMount()
	m.plainFrame("")
	m.plainRoute()
	m.request(e, l.files)
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
	entry entry
	files fs.FS
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

// groupSize is how many folders are read at once.
const groupSize = 32

// load reads folders, many at a time. Those of one group have different names
// and stand in one made-up data set, which is sound when each of them is; where
// it is not, they are read one by one.
func (k *checker) load(ctx context.Context, wants []want) error {
	type group struct {
		list  []want
		names map[string]bool
	}
	var groups []*group
	asked := map[Key]bool{}
	for _, w := range wants {
		if asked[w.Key] {
			continue
		}
		asked[w.Key] = true
		var g *group
		for i := len(groups) - 1; i >= 0 && g == nil; i-- {
			x := groups[i]
			if len(x.list) < groupSize && x.list[0].Zone == w.Zone && !x.names[strings.ToLower(w.entry.name)] {
				g = x
			}
		}
		if g == nil {
			g = &group{names: map[string]bool{}}
			groups = append(groups, g)
		}
		g.list = append(g.list, w)
		g.names[strings.ToLower(w.entry.name)] = true
	}
	work, ctx := errgroup.WithContext(ctx)
	work.SetLimit(runtime.GOMAXPROCS(0))
	for _, g := range groups {
		work.Go(func() error {
			done, err := k.loadGroup(ctx, g.list)
			if err != nil || done {
				return err
			}
			for i := range g.list {
				if _, err := k.loadGroup(ctx, g.list[i:i+1]); err != nil {
					return err
				}
			}
			return nil
		})
	}
	return work.Wait()
}

// loadGroup reads folders together; false where more than one was asked for and
// something is wrong.
func (k *checker) loadGroup(ctx context.Context, list []want) (bool, error) {
	m := newMount()
	m.plainFrame(list[0].Zone)
	for _, w := range list {
		m.folder(w.entry.DirEntry, w.files)
	}
	data, err := schema.Load(ctx, m)
	fault, err := faultOf(err)
	if err != nil {
		return false, err
	}
	if fault != "" && len(list) > 1 {
		return false, nil
	}
	routes := map[string]*schema.Route{}
	if fault == "" {
		for _, r := range data.Routes {
			routes[r.Folder] = r
		}
	}
	k.mu.Lock()
	defer k.mu.Unlock()
	for _, w := range list {
		folder := "routes/" + w.entry.name
		v := &Loaded{Key: w.Key, Folder: folder, Fault: strings.TrimPrefix(fault, folder+"/")}
		if r := routes[folder]; r != nil {
			v.ID, v.Route = r.ID, r
		}
		k.versions[w.Key] = v
		k.fresh = append(k.fresh, v)
	}
	return true, nil
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
		v.Route = nil
	}
}
