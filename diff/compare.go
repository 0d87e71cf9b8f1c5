package diff

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"sync"
	"sync/atomic"

	"speedtrail/schema"
	"speedtrail/schema/parallel"
	"speedtrail/schema/source"
)

// Options of a comparison. The zero Options are those of a plain one.
type Options struct {
	// Requests names the change requests in play; none: those that were added or
	// altered. NoRequests leaves the reconciliation out.
	Requests   []string
	NoRequests bool
	// Unread gives a route of the target that LoadPair left unread, with its
	// track, or nil where there is none of that id. It is asked for routes that
	// a request in play declares.
	Unread func(id string) (*schema.Route, error)
	// Rolling: running times begin and end at the speed of the profile.
	Rolling bool
	// NoFleet and NoFigures leave out what they name, to measure its cost.
	NoFleet, NoFigures bool
	// limit stands in for MaxChanges in tests.
	limit int64
	// Progress, if given, is called after each route; calls do not overlap.
	Progress func(done, total int)
}

// An UnknownRequestError names a request that the target does not have.
type UnknownRequestError struct {
	ID    string
	Known []string // the ids that there are
}

// Error names the request.
func (e *UnknownRequestError) Error() string {
	return "the target has no change request " + source.Quote(e.ID)
}

// MaxChanges bounds the changes of speed of a comparison, over all routes and
// trains, with and without temporary restrictions: tables of the largest size
// and a thousand trains would take more memory than a machine has. A network of 500
// routes of 60 rows and 100 trains gives six million, and run-out beside them, when
// every row is altered for every train in both directions.
const MaxChanges = 10_000_000

// ErrTooMany is the error of a comparison with more than MaxChanges changes.
var ErrTooMany = errors.New("too many changes of speed")

// Compare works out what differs between two revisions of a data set. Routes
// that were left unread on both sides, because their files are the same, are
// counted only. The error is an *UnknownRequestError, a *source.Faults for
// requests that name what does not exist, ErrTooMany, or that of the context.
func Compare(ctx context.Context, base, target *schema.Dataset, o Options) (*Account, error) {
	a := &Account{
		Trains: pairTrains(base.Trains, target.Trains),
		Routes: pairRoutes(base.Routes, target.Routes),
		Equal:  len(target.Unread),
	}
	if !o.NoRequests {
		requests, err := requestsInPlay(base, target, o.Requests)
		if err != nil {
			return nil, err
		}
		a.Requests = requests
	}
	a.Frame = pairFiles(a.Routes, base.Files, target.Files)
	for i := range a.Frame {
		a.Frame[i].account(nil, nil)
	}
	explainFrame(a.Frame)
	if err := a.compareRoutes(ctx, &o); err != nil {
		return nil, err
	}
	if err := a.reconcile(&o); err != nil {
		return nil, err
	}
	a.describeStretches()
	return a, ctx.Err()
}

// compareRoutes compares the routes, one a processor at a time.
func (a *Account) compareRoutes(ctx context.Context, o *Options) error {
	var lock sync.Mutex
	done := 0
	limit := int64(MaxChanges)
	if o.limit > 0 {
		limit = o.limit
	}
	var changes atomic.Int64
	return parallel.Try(ctx, len(a.Routes), func(ctx context.Context, i int) error {
		if err := compareRoute(ctx, &a.Routes[i], a.Trains, o, func(more int) error {
			if changes.Add(int64(more)) > limit {
				return fmt.Errorf("%w: there are more than %d", ErrTooMany, limit)
			}
			return nil
		}); err != nil {
			return err
		}
		if o.Progress != nil {
			lock.Lock()
			defer lock.Unlock()
			done++
			o.Progress(done, len(a.Routes))
		}
		return nil
	})
}

// pairTrains joins the trains of both revisions: the target's definition, and
// for a train that only the base has, the base's.
func pairTrains(base, target []schema.Train) []Train {
	before := make(map[string]schema.Train, len(base))
	for _, t := range base {
		before[t.ID] = t
	}
	var trains []Train
	for _, t := range target {
		joined := Train{Train: t, Fate: Added}
		if old, ok := before[t.ID]; ok {
			joined.Fate = Kept
			if !old.Same(t) {
				joined.Fate, joined.Before = Altered, old
			}
			delete(before, t.ID)
		}
		trains = append(trains, joined)
	}
	for _, t := range base {
		if _, left := before[t.ID]; left {
			trains = append(trains, Train{Train: t, Fate: Removed})
		}
	}
	slices.SortFunc(trains, func(a, b Train) int { return strings.Compare(a.ID, b.ID) })
	return trains
}

// pairRoutes matches routes by id.
func pairRoutes(base, target []*schema.Route) []Route {
	byID := make(map[string]*Route)
	var routes []*Route
	get := func(id string) *Route {
		r := byID[id]
		if r == nil {
			r = &Route{ID: id}
			byID[id] = r
			routes = append(routes, r)
		}
		return r
	}
	for _, r := range base {
		get(r.ID).Base = r
	}
	for _, r := range target {
		get(r.ID).Target = r
	}
	slices.SortFunc(routes, func(a, b *Route) int { return cmp.Compare(a.ID, b.ID) })
	list := make([]Route, len(routes))
	for i, r := range routes {
		list[i] = *r
	}
	return list
}
