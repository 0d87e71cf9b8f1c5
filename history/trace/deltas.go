package trace

import (
	"context"
	"maps"
	"path"
	"slices"

	"speedtrail/schema"
)

// routeChanges lists the routes that a listing has otherwise than its base's, of
// which the folders that differ are given. Both are sound.
func (r *Reader) routeChanges(ctx context.Context, l, base *listing, list []change) ([]RouteChange, error) {
	if len(list) == 0 {
		return nil, nil
	}
	now := map[string]RouteChange{}
	var f *frameInfo
	var err error
	if !l.absent {
		if f, err = r.check.frame(ctx, l); err != nil {
			return nil, err
		}
	}
	for _, x := range list {
		if x.now == (Hash{}) {
			continue
		}
		v, err := r.check.version(ctx, wantOf(l, f, x.name, x.now))
		if err != nil {
			return nil, err
		}
		now[v.ID] = RouteChange{v.ID, v, "routes/" + x.name}
	}
	for _, x := range list {
		if x.old == (Hash{}) {
			continue
		}
		of, err := r.check.frame(ctx, base)
		if err != nil {
			return nil, err
		}
		v, err := r.check.version(ctx, wantOf(base, of, x.name, x.old))
		if err != nil {
			return nil, err
		}
		if _, ok := now[v.ID]; !ok {
			now[v.ID] = RouteChange{ID: v.ID}
		}
	}
	out := make([]RouteChange, 0, len(now))
	for _, id := range slices.Sorted(maps.Keys(now)) {
		out = append(out, now[id])
	}
	return out, nil
}

// Options of a reading.
type Options struct {
	// FirstParent leaves out what does not stand on the line of first parents.
	FirstParent bool
	// Progress, if given, is called after each batch of commits.
	Progress func(done, total int)
}

// History reads the past of a route up to a commit, without an index.
func (r *Reader) History(ctx context.Context, tip Hash, route string, o Options) (*History, error) {
	w, err := r.Commits(ctx, tip, o.FirstParent, nil)
	if err != nil {
		return nil, err
	}
	a := newAssembly(route)
	routes := map[Key]*schema.Route{}
	r.Each(func(v *Loaded) {
		if v.ID == route {
			v.Route = v.Route.Clone()
		} else {
			v.Route = nil
		}
	})
	err = r.Read(ctx, w, nil, o.Progress, func(b *Batch) error {
		for _, v := range b.Loaded {
			if v.ID == route {
				routes[v.Key] = v.Route
			}
		}
		for i := range b.Deltas {
			d := &b.Deltas[i]
			c := Commit{Hash: d.Hash, When: d.When, Gap: d.Gap, Cut: d.Cut}
			for _, p := range d.Parents {
				c.Parents = append(c.Parents, a.index[p])
			}
			a.Add(c)
			for _, x := range d.Changes {
				if x.ID != route {
					continue
				}
				if x.Version == nil {
					a.Gone()
					continue
				}
				a.Has(x.Version.Key.Tree, x.Folder, func() (*schema.Route, error) { return routes[x.Version.Key], nil })
			}
		}
		return a.err
	})
	if err != nil {
		return nil, err
	}
	return a.History(tip)
}

// inFolder gives a copy of a route as it stands in another folder.
func inFolder(r *schema.Route, folder string) *schema.Route {
	if r.Folder == folder {
		return r
	}
	out := r.Clone()
	out.Folder = folder
	move := func(file *string) { *file = folder + "/" + path.Base(*file) }
	move(&out.Pos.File)
	for i := range out.Speed {
		move(&out.Speed[i].Pos.File)
	}
	for i := range out.AxleLoad {
		move(&out.AxleLoad[i].Pos.File)
	}
	for i := range out.Temporary {
		move(&out.Temporary[i].Pos.File)
	}
	return out
}
