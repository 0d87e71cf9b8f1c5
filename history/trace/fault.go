package trace

import (
	"context"
	"strings"

	"speedtrail/schema"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// fault gives the first fault of a commit's data set. Where there is a base,
// which is sound, only what differs from it has to be looked at.
func (r *Reader) fault(ctx context.Context, l, base *listing, list []change) (string, error) {
	if l.absent || l.fault != "" {
		return l.fault, nil
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
	if f.fault == "" && base != nil && !base.absent {
		of, err := r.check.frame(ctx, base)
		if err != nil {
			return "", err
		}
		if of.zone == f.zone {
			routes, same, err := r.faultOfChanges(ctx, l, base, f, list)
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
func (r *Reader) faultOfChanges(ctx context.Context, l, base *listing, f *frameInfo, list []change) (fault string, same bool, err error) {
	for _, x := range list {
		if x.old == (Hash{}) || x.now == (Hash{}) {
			return "", false, nil
		}
		now, err := r.check.version(ctx, wantOf(l, f, x.name, x.now))
		if err != nil {
			return "", false, err
		}
		if now.Fault != "" {
			fault = earlier(fault, faultIn(now, x.name))
			continue
		}
		old, err := r.check.version(ctx, wantOf(base, f, x.name, x.old))
		if err != nil {
			return "", false, err
		}
		if old.ID != now.ID {
			return "", false, nil
		}
	}
	return fault, true, nil
}

// faultIn writes a fault of a folder where it stands now.
func faultIn(v *Loaded, name string) string { return "routes/" + name + "/" + v.Fault }

// faultOfAll looks at all folders, and at what concerns them together.
func (r *Reader) faultOfAll(ctx context.Context, l *listing, f *frameInfo) (string, error) {
	routes, err := r.lister.all(l)
	if err != nil {
		return "", err
	}
	fault := ""
	if len(routes) == 0 {
		fault = "routes: no route"
	}
	if f.fault != "" {
		return fault, nil // without a time zone the routes cannot be read
	}
	var wants []want
	for _, e := range routes {
		w := wantOf(l, f, e.name, e.tree)
		if v, err := r.check.known(w.Key); err != nil {
			return "", err
		} else if v == nil {
			wants = append(wants, w)
		}
	}
	if err := r.check.load(ctx, wants); err != nil {
		return "", err
	}
	ids, folded := map[string]string{}, map[string]string{}
	for _, e := range routes {
		if problem := table.TextProblem(e.name); problem != "" {
			fault = earlier(fault, "routes/"+source.Visible(e.name)+": the folder's name is "+problem)
			continue
		}
		v, err := r.check.version(ctx, wantOf(l, f, e.name, e.tree))
		if err != nil {
			return "", err
		}
		if v.Fault != "" {
			fault = earlier(fault, faultIn(v, e.name))
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
	if len(routes) > schema.MaxRoutes {
		fault = earlier(fault, "routes: too many route folders")
	}
	return fault, nil
}
