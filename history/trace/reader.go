package trace

import (
	"context"
	"runtime"
	"strings"

	"golang.org/x/sync/errgroup"

	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// Prior is what is known from earlier readings of the same repository and
// folder.
type Prior interface {
	// Base gives the nearest commit at or before a known one, along first
	// parents, whose data set loads; false where there is none.
	Base(Hash) (base Hash, ok bool)
	// Version gives what came of a route's folder, without its Route; nil where
	// it was not read.
	Version(Key) (*Loaded, error)
}

// Delta is a commit and what its data set has otherwise than that of its base,
// the nearest commit before it along first parents that loads.
type Delta struct {
	Hash    Hash
	Parents []Hash
	When    int64
	Cut     bool
	Gap     string        // the first fault; there are no Changes then
	Changes []RouteChange // in byte order of the ids
}

// RouteChange is a route that a commit has otherwise than its base.
type RouteChange struct {
	ID      string
	Version *Loaded // nil: the commit does not have the route
	Folder  string
}

// Batch is a part of a reading: commits, parents before children, and the
// versions that were read for them.
type Batch struct {
	Deltas []Delta
	Loaded []*Loaded
}

// Reader reads the history of a data set from a repository.
type Reader struct {
	repo     *revision.Repo
	folder   string
	batch    int
	check    *checker
	prior    Prior
	bases    map[Hash]Hash // of commits that were read, where there is one
	read     map[Hash]bool
	listings map[Hash]*listing
}

// NewReader reads the data set in a folder of a repository.
func NewReader(repo *revision.Repo, folder string) *Reader {
	return &Reader{repo: repo, folder: folder, batch: 64}
}

// Walk is a list of commits to be read.
type Walk struct{ list []walked }

// Len is the number of commits.
func (w *Walk) Len() int { return len(w.list) }

// Commits finds the commits that can be reached from tip and are not known.
func (r *Reader) Commits(ctx context.Context, tip Hash, firstParent bool, known Known) (*Walk, error) {
	list, err := walk(ctx, r.repo, tip, firstParent, known)
	return &Walk{list}, err
}

// Read reads commits and hands them over batch by batch. What is handed over
// must not be kept beyond the call of take, the routes in it excepted.
func (r *Reader) Read(ctx context.Context, w *Walk, prior Prior, progress func(done, total int), take func(*Batch) error) error {
	r.prior, r.check = prior, newChecker(prior)
	r.bases, r.read, r.listings = map[Hash]Hash{}, map[Hash]bool{}, map[Hash]*listing{}
	for at := 0; at < len(w.list); at += r.batch {
		part := w.list[at:min(at+r.batch, len(w.list))]
		if err := r.listAll(ctx, part); err != nil {
			return err
		}
		if err := r.loadNew(ctx, part); err != nil {
			return err
		}
		b := &Batch{Deltas: make([]Delta, len(part))}
		for i, c := range part {
			if err := r.delta(ctx, c, &b.Deltas[i]); err != nil {
				return err
			}
		}
		b.Loaded = r.check.take()
		if err := take(b); err != nil {
			return err
		}
		forget(b.Loaded)
		if progress != nil {
			progress(at+len(part), len(w.list))
		}
	}
	return ctx.Err()
}

// baseOf gives the base of a commit: that of its first parent.
func (r *Reader) baseOf(c walked) (Hash, bool) {
	if len(c.parents) == 0 {
		return Hash{}, false
	}
	p := c.parents[0]
	if r.read[p] {
		base, ok := r.bases[p]
		return base, ok
	}
	if r.prior == nil {
		return Hash{}, false
	}
	return r.prior.Base(p)
}

// listAll lists what the commits of a batch and their bases hold, on all
// processors. Listings that nobody asks for again are dropped.
func (r *Reader) listAll(ctx context.Context, part []walked) error {
	needed := map[Hash]bool{}
	for _, c := range part {
		needed[c.Hash] = true
		if len(c.parents) > 0 {
			needed[c.parents[0]] = true
		}
		if base, ok := r.baseOf(c); ok {
			needed[base] = true
		}
	}
	kept := make(map[Hash]*listing, len(needed))
	var missing []Hash
	for h := range needed {
		if l := r.listings[h]; l != nil {
			kept[h] = l
		} else {
			missing = append(missing, h)
		}
	}
	found := make([]*listing, len(missing))
	work, ctx := errgroup.WithContext(ctx)
	work.SetLimit(runtime.GOMAXPROCS(0))
	for i, h := range missing {
		work.Go(func() (err error) {
			if err := ctx.Err(); err != nil {
				return err
			}
			found[i], err = list(r.repo, h, r.folder)
			return err
		})
	}
	if err := work.Wait(); err != nil {
		return err
	}
	for i, h := range missing {
		kept[h] = found[i]
	}
	r.listings = kept
	return nil
}

// listing gives what a commit holds.
func (r *Reader) listing(h Hash) (*listing, error) {
	if l := r.listings[h]; l != nil {
		return l, nil
	}
	l, err := list(r.repo, h, r.folder)
	if err == nil {
		r.listings[h] = l
	}
	return l, err
}

// loadNew reads the folders that the commits of a batch have otherwise than
// their first parents, together.
func (r *Reader) loadNew(ctx context.Context, part []walked) error {
	var wants []want
	for _, c := range part {
		l := r.listings[c.Hash]
		if l.absent {
			continue
		}
		f, err := r.check.frame(ctx, l)
		if err != nil {
			return err
		}
		if f.fault != "" {
			continue
		}
		var before []entry
		if len(c.parents) > 0 {
			before = r.listings[c.parents[0]].routes
		}
		for _, x := range changes(before, l.routes) {
			if x.now == nil {
				continue
			}
			w, err := wantOf(l, f, x.now)
			if err != nil {
				return err
			}
			if v, err := r.check.known(w.Key); err != nil {
				return err
			} else if v == nil {
				wants = append(wants, w)
			}
		}
	}
	return r.check.load(ctx, wants)
}

func wantOf(l *listing, f *frameInfo, e *entry) (want, error) {
	tree, err := ParseHash(e.identity)
	return want{Key{tree, f.zone}, *e, l.files}, err
}

// delta fills in what a commit has otherwise than its base.
func (r *Reader) delta(ctx context.Context, c walked, d *Delta) error {
	*d = Delta{Hash: c.Hash, Parents: c.parents, When: c.when, Cut: c.cut}
	base, hasBase := r.baseOf(c)
	var before *listing
	if hasBase {
		var err error
		if before, err = r.listing(base); err != nil {
			return err
		}
	}
	l, err := r.listing(c.Hash)
	if err != nil {
		return err
	}
	if d.Gap, err = r.fault(ctx, l, before); err != nil {
		return err
	}
	r.read[c.Hash] = true
	if d.Gap != "" {
		if hasBase {
			r.bases[c.Hash] = base
		}
		return nil
	}
	r.bases[c.Hash] = c.Hash
	d.Changes, err = r.routeChanges(ctx, l, before)
	return err
}

// fault gives the first fault of a commit's data set. Where there is a base,
// which is sound, only what differs from it has to be looked at.
func (r *Reader) fault(ctx context.Context, l, base *listing) (string, error) {
	if l.absent {
		return "", nil
	}
	f, err := r.check.frame(ctx, l)
	if err != nil {
		return "", err
	}
	fault := f.fault
	requests, err := r.check.requestSet(ctx, l)
	if err != nil {
		return "", err
	}
	fault = earlier(fault, requests)
	if len(l.routes) == 0 {
		fault = earlier(fault, "routes: no route")
	}
	if f.fault != "" {
		return fault, nil // without a time zone the routes cannot be read
	}
	if base != nil && !base.absent {
		of, err := r.check.frame(ctx, base)
		if err != nil {
			return "", err
		}
		if of.zone == f.zone {
			routes, same, err := r.faultOfChanges(ctx, l, base, f)
			if err != nil || same {
				return earlier(fault, routes), err
			}
		}
	}
	routes, err := r.faultOfAll(ctx, l, f)
	return earlier(fault, routes), err
}

// faultOfChanges looks at the folders that differ from the base's; same is false
// where ids may be others than there, so that all have to be looked at.
func (r *Reader) faultOfChanges(ctx context.Context, l, base *listing, f *frameInfo) (fault string, same bool, err error) {
	for _, x := range changes(base.routes, l.routes) {
		if x.old == nil || x.now == nil {
			return "", false, nil
		}
		now, err := r.versionOf(ctx, l, f, x.now)
		if err != nil {
			return "", false, err
		}
		if now.Fault != "" {
			fault = earlier(fault, faultIn(now, x.now))
			continue
		}
		old, err := r.versionOf(ctx, base, f, x.old)
		if err != nil {
			return "", false, err
		}
		if old.ID != now.ID {
			return "", false, nil
		}
	}
	return fault, true, nil
}

func (r *Reader) versionOf(ctx context.Context, l *listing, f *frameInfo, e *entry) (*Loaded, error) {
	w, err := wantOf(l, f, e)
	if err != nil {
		return nil, err
	}
	return r.check.version(ctx, w)
}

// faultIn writes a fault of a folder where it stands now.
func faultIn(v *Loaded, e *entry) string { return "routes/" + e.name + "/" + v.Fault }

// faultOfAll looks at all folders, and at what concerns them together.
func (r *Reader) faultOfAll(ctx context.Context, l *listing, f *frameInfo) (string, error) {
	var wants []want
	for i := range l.routes {
		w, err := wantOf(l, f, &l.routes[i])
		if err != nil {
			return "", err
		}
		if v, err := r.check.known(w.Key); err != nil {
			return "", err
		} else if v == nil {
			wants = append(wants, w)
		}
	}
	if err := r.check.load(ctx, wants); err != nil {
		return "", err
	}
	fault := ""
	ids, folded := map[string]string{}, map[string]string{}
	for i := range l.routes {
		e := &l.routes[i]
		v, err := r.versionOf(ctx, l, f, e)
		if err != nil {
			return "", err
		}
		if v.Fault != "" {
			fault = earlier(fault, faultIn(v, e))
			continue
		}
		if other, ok := ids[v.ID]; ok {
			fault = earlier(fault, "routes/"+e.name+"/route.toml: route id "+source.Quote(v.ID)+" is that of routes/"+other+", too; ids are unique")
		}
		ids[v.ID] = e.name
		fold := strings.ToLower(e.name)
		if other, ok := folded[fold]; ok {
			fault = earlier(fault, "routes/"+e.name+": the folder's name differs from "+source.Quote(other)+" in letter case only, which some file systems cannot hold")
		}
		folded[fold] = e.name
	}
	if len(l.routes) > schema.MaxRoutes {
		fault = earlier(fault, "routes: too many route folders")
	}
	return fault, nil
}

// InBatches sets how many commits are handed over at once, and gives the reader.
func (r *Reader) InBatches(commits int) *Reader {
	r.batch = max(1, commits)
	return r
}
