package trace

import (
	"context"

	"golang.org/x/sync/errgroup"

	"speedtrail/history/revision"
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
	repo   *revision.Repo
	folder string
	batch  batches
	each   func(*Loaded)
	check  *checker
	prior  Prior
	bases  map[Hash]Hash // of commits that were read, where there is one
	read   map[Hash]bool
	lister *lister
	listed map[Hash]*listing // of the commits of the last batches and their bases
}

// batches says how many commits are handed over at once: first some, so that there
// is progress to be seen, then more and more. In a large batch the versions of a
// folder, of which each is stored as a difference to the next, are read together.
type batches struct{ first, most int }

// NewReader reads the data set in a folder of a repository.
func NewReader(repo *revision.Repo, folder string) *Reader {
	return &Reader{repo: repo, folder: folder, batch: batches{256, 2048}}
}

// InBatches sets how many commits are handed over at once, and gives the reader.
func (r *Reader) InBatches(commits int) *Reader {
	r.batch = batches{max(1, commits), max(1, commits)}
	return r
}

// Each sets what is done with each sound route as soon as it was read, on several
// processors at once, and gives the reader. The Route is the call's own until it
// returns: it turns it into Data, puts a Clone in its place, or lets go of it.
func (r *Reader) Each(f func(*Loaded)) *Reader {
	r.each = f
	return r
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

// Read reads commits and hands them over batch by batch, while it reads the next
// one: prior is asked in another goroutine than the one that take is called in.
// What is handed over must not be kept beyond the call of take, the routes in it
// excepted.
func (r *Reader) Read(ctx context.Context, w *Walk, prior Prior, progress func(done, total int), take func(*Batch) error) error {
	r.prior, r.check = prior, newChecker(r.repo, prior, r.each)
	r.bases, r.read, r.listed = map[Hash]Hash{}, map[Hash]bool{}, map[Hash]*listing{}
	r.lister = newLister(r.repo, r.folder)
	reading, stop := context.WithCancel(ctx)
	batches := make(chan *Batch)
	var failed error
	go func() {
		defer close(batches)
		failed = r.readBatches(reading, w.list, batches)
	}()
	defer func() {
		stop()
		for range batches {
			// The reading ends before this call does.
		}
	}()
	done := 0
	for b := range batches {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := take(b); err != nil {
			return err
		}
		forget(b.Loaded)
		done += len(b.Deltas)
		if progress != nil {
			progress(done, len(w.list))
		}
	}
	if failed != nil {
		return failed
	}
	return ctx.Err()
}

func (r *Reader) readBatches(ctx context.Context, list []walked, to chan<- *Batch) error {
	work, ctx := errgroup.WithContext(ctx)
	parts := make(chan listed, 2)
	work.Go(func() error {
		defer close(parts)
		return newScout(r.repo, r.folder).run(ctx, list, r.batch, parts)
	})
	work.Go(func() error {
		for p := range parts {
			b, err := r.readBatch(ctx, p.commits, p.found)
			if err != nil {
				return err
			}
			select {
			case to <- b:
			case <-ctx.Done():
				return ctx.Err()
			}
		}
		return nil
	})
	return work.Wait()
}

func (r *Reader) readBatch(ctx context.Context, part []walked, found []found) (*Batch, error) {
	// The commits of a batch are the parents and bases of those of the next; what
	// is asked for later is listed again.
	if len(r.listed) > 2*len(found) {
		clear(r.listed)
	}
	for _, x := range found {
		r.listed[x.listing.commit] = x.listing
	}
	if err := r.loadNew(ctx, found); err != nil {
		return nil, err
	}
	b := &Batch{Deltas: make([]Delta, len(part))}
	for i, c := range part {
		if err := r.delta(ctx, c, found[i], &b.Deltas[i]); err != nil {
			return nil, err
		}
	}
	b.Loaded = r.check.take()
	return b, nil
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

// listing gives what a commit holds.
func (r *Reader) listing(commit Hash) (*listing, error) {
	return listingOf(r.repo, r.lister, r.listed, commit)
}

// loadNew reads the folders that the commits of a batch have otherwise than
// their first parents, together.
func (r *Reader) loadNew(ctx context.Context, batch []found) error {
	var wants []want
	for _, x := range batch {
		l := x.listing
		if l.absent || l.fault != "" || len(x.changes) == 0 {
			continue
		}
		f, err := r.check.frame(ctx, l)
		if err != nil {
			return err
		}
		if f.fault != "" {
			continue
		}
		for _, c := range x.changes {
			if c.now == (Hash{}) {
				continue
			}
			w := wantOf(l, f, c.name, c.now)
			if v, err := r.check.known(w.Key); err != nil {
				return err
			} else if v == nil {
				wants = append(wants, w)
			}
		}
	}
	return r.check.load(ctx, wants)
}

func wantOf(l *listing, f *frameInfo, name string, tree Hash) want {
	return want{Key{tree, f.zone}, name, l.commit}
}

// delta fills in what a commit has otherwise than its base.
func (r *Reader) delta(ctx context.Context, c walked, x found, d *Delta) error {
	*d = Delta{Hash: c.Hash, Parents: c.parents, When: c.when, Cut: c.cut}
	base, hasBase := r.baseOf(c)
	var before *listing
	l, list := x.listing, x.changes
	var err error
	if hasBase {
		if before, err = r.listing(base); err != nil {
			return err
		}
		r.listed[base] = before
	}
	if len(c.parents) > 0 && (!hasBase || base != c.parents[0]) {
		from := before
		if from == nil {
			from = &listing{}
		}
		now := *l // what else stands in routes/ is known
		if list, err = r.lister.changes(from, &now); err != nil {
			return err
		}
	}
	if d.Gap, err = r.fault(ctx, l, before, list); err != nil {
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
	d.Changes, err = r.routeChanges(ctx, l, before, list)
	return err
}
