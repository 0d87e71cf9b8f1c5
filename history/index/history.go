package index

import (
	"context"
	"database/sql"

	"speedtrail/history/trace"
	"speedtrail/schema"
)

// History gives the past of a route up to a commit. It is false where the commit
// is not in the index: Update adds it.
func (x *Index) History(ctx context.Context, name string, tip trace.Hash, route string) (h *trace.History, found bool, err error) {
	// All as of one instant: another process may be adding to the index.
	err = x.transaction(ctx, "BEGIN", func() error {
		h, found, err = x.history(ctx, name, tip, route)
		return err
	})
	return h, found, classify(err)
}

func (x *Index) history(ctx context.Context, name string, tip trace.Hash, route string) (h *trace.History, found bool, err error) {
	g, err := x.graph(ctx, name)
	if err != nil {
		return nil, false, err
	}
	if _, found = g.number(tip); !found {
		return nil, false, nil
	}
	if err := x.gaps(ctx, g); err != nil {
		return nil, false, err
	}
	list, err := x.changes(ctx, g, route)
	if err != nil {
		return nil, false, err
	}
	x.graphs = nil // its commits are the caller's now
	a := trace.NewAssembly(route, g.commits, g.bases)
	u := &unpacker{ctx: ctx, x: x, rows: make(map[int64]row, len(list)), whole: make(map[int64][]byte, len(list))}
	for _, c := range list {
		u.rows[c.version.id] = c.version
	}
	added := 0
	upTo := func(n int) {
		for ; added < n; added++ {
			a.Next()
		}
	}
	for _, c := range list {
		if c.number < added-1 || c.number >= len(g.commits) {
			return nil, false, errDamaged
		}
		upTo(c.number + 1)
		if c.version.id == 0 {
			a.Gone()
			continue
		}
		a.Has(c.tree, c.place, func() (*schema.Route, error) {
			data, err := u.unpack(c.version)
			if err != nil {
				return nil, err
			}
			return decode(data, c.place)
		})
	}
	upTo(len(g.commits))
	h, err = a.History(tip)
	return h, err == nil, err
}

// changed is a commit that has a route otherwise than its base.
type changed struct {
	number  int
	place   string
	tree    trace.Hash
	version row // without an id where the commit does not have the route
}

// changes lists the commits that have a route otherwise than their bases.
func (x *Index) changes(ctx context.Context, g *graph, route string) ([]changed, error) {
	rows, err := x.conn.QueryContext(ctx, `SELECT c.number, c.place, v.tree, coalesce(c.version, 0), v.base, v.data FROM change c LEFT JOIN version v ON v.id = c.version
		WHERE c.folder = ? AND c.route = ? ORDER BY c.number`, g.folder, route)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var list []changed
	for rows.Next() {
		var c changed
		var tree sql.RawBytes
		if err := rows.Scan(&c.number, &c.place, &tree, &c.version.id, &c.version.base, &c.version.data); err != nil {
			return nil, err
		}
		if copy(c.tree[:], tree) != len(c.tree) && c.version.id != 0 {
			return nil, errDamaged // the version is not there
		}
		list = append(list, c)
	}
	return list, rows.Err()
}

// gaps fills in why commits do not load.
func (x *Index) gaps(ctx context.Context, g *graph) error {
	rows, err := x.conn.QueryContext(ctx, "SELECT number, fault FROM gap WHERE folder = ?", g.folder)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() {
		var number int
		var fault string
		if err := rows.Scan(&number, &fault); err != nil {
			return err
		}
		if number < 0 || number >= len(g.commits) {
			return errDamaged
		}
		g.commits[number].Gap = fault
	}
	return rows.Err()
}
