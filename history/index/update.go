package index

import (
	"context"
	"database/sql"
	"errors"

	"speedtrail/history/trace"
	"speedtrail/schema"
)

// Update adds the commits that can be reached from tip and are not there yet to
// the history of a name. What a cancelled or failed call has added stays.
func (x *Index) Update(ctx context.Context, reader *trace.Reader, name string, tip trace.Hash, progress func(done, total int)) error {
	g, err := x.graph(ctx, name)
	if err != nil {
		return classify(err)
	}
	if _, ok := g.number(tip); ok {
		return nil
	}
	g.byHash()
	walk, err := reader.Commits(ctx, tip, false, func(h trace.Hash) bool { _, ok := g.numbers[h]; return ok })
	if err != nil {
		return err
	}
	b := &builder{x: x, g: g, path: name, ids: map[trace.Key]int64{}}
	defer b.close()
	if err := b.begin(ctx); err != nil {
		return classify(err)
	}
	err = reader.Read(ctx, walk, b, progress, func(batch *trace.Batch) error {
		return classify(x.transaction(ctx, func() error { return b.add(ctx, batch) }))
	})
	return classify(err)
}

// builder adds batches. It is the trace.Prior of its reading.
type builder struct {
	x          *Index
	g          *graph
	path       string
	ids        map[trace.Key]int64 // of versions
	empty      bool                // no version was there at the beginning
	find       *sql.Stmt
	statements []*sql.Stmt
	addVersion *sql.Stmt
	addChange  *sql.Stmt
	ctx        context.Context
}

func (b *builder) begin(ctx context.Context) error {
	b.ctx = ctx
	var versions int64
	if err := b.x.conn.QueryRowContext(ctx, "SELECT EXISTS (SELECT 1 FROM version)").Scan(&versions); err != nil {
		return err
	}
	b.empty = versions == 0
	for text, to := range map[string]**sql.Stmt{
		"SELECT id, place, route, fault FROM version WHERE tree = ? AND zone = ?":                                                   &b.find,
		"INSERT INTO version (tree, zone, place, route, fault, data) VALUES (?, ?, ?, ?, ?, ?) ON CONFLICT DO NOTHING RETURNING id": &b.addVersion,
		"INSERT INTO change (folder, route, number, version, place) VALUES (?, ?, ?, ?, ?)":                                         &b.addChange,
	} {
		s, err := b.x.conn.PrepareContext(ctx, text)
		if err != nil {
			return err
		}
		*to = s
		b.statements = append(b.statements, s)
	}
	return nil
}

func (b *builder) close() {
	for _, s := range b.statements {
		s.Close()
	}
}

// Base implements trace.Prior.
func (b *builder) Base(h trace.Hash) (trace.Hash, bool) {
	n, ok := b.g.numbers[h]
	if !ok || b.g.bases[n] < 0 {
		return trace.Hash{}, false
	}
	return b.g.commits[b.g.bases[n]].Hash, true
}

// Version implements trace.Prior.
func (b *builder) Version(key trace.Key) (*trace.Loaded, error) {
	if b.empty {
		return nil, nil // what was added since, the reading itself knows
	}
	v := &trace.Loaded{Key: key}
	var id int64
	err := b.find.QueryRowContext(b.ctx, key.Tree[:], key.Zone).Scan(&id, &v.Folder, &v.ID, &v.Fault)
	if errors.Is(err, sql.ErrNoRows) {
		return nil, nil
	}
	if err != nil {
		return nil, classify(err)
	}
	b.ids[key] = id
	return v, nil
}

// add writes a batch. Of commits and versions that another process has added
// since, it keeps that one's.
func (b *builder) add(ctx context.Context, batch *trace.Batch) error {
	if b.g.folder == 0 {
		if _, err := b.x.conn.ExecContext(ctx, "INSERT INTO folder (path) VALUES (?) ON CONFLICT DO NOTHING", b.path); err != nil {
			return err
		}
		if err := b.x.conn.QueryRowContext(ctx, "SELECT id FROM folder WHERE path = ?", b.path).Scan(&b.g.folder); err != nil {
			return err
		}
	}
	if err := b.x.extend(ctx, b.g); err != nil {
		return err
	}
	for _, v := range batch.Loaded {
		var data []byte
		if v.Route != nil {
			data = encode(v.Route)
		}
		var id int64
		err := b.addVersion.QueryRowContext(ctx, v.Tree[:], v.Zone, v.Folder, v.ID, v.Fault, data).Scan(&id)
		if errors.Is(err, sql.ErrNoRows) {
			var place, route, fault string
			err = b.find.QueryRowContext(ctx, v.Tree[:], v.Zone).Scan(&id, &place, &route, &fault)
		}
		if err != nil {
			return err
		}
		b.ids[v.Key] = id
	}
	first := len(b.g.commits)
	for i := range batch.Deltas {
		d := &batch.Deltas[i]
		if _, ok := b.g.numbers[d.Hash]; ok {
			continue
		}
		if err := b.addDelta(ctx, d); err != nil {
			return err
		}
	}
	return b.addChunks(ctx, first)
}

func (b *builder) addDelta(ctx context.Context, d *trace.Delta) error {
	number := int64(len(b.g.commits))
	c := trace.Commit{Hash: d.Hash, When: d.When, Gap: d.Gap, Cut: d.Cut}
	for _, p := range d.Parents {
		n, ok := b.g.numbers[p]
		if !ok {
			return errDamaged
		}
		c.Parents = append(c.Parents, n)
	}
	if d.Gap != "" {
		if _, err := b.x.conn.ExecContext(ctx, "INSERT INTO gap VALUES (?, ?, ?)", b.g.folder, number, d.Gap); err != nil {
			return err
		}
	}
	for _, change := range d.Changes {
		var version any
		if change.Version != nil {
			id, ok := b.ids[change.Version.Key]
			if !ok {
				return errDamaged
			}
			version = id
		}
		if _, err := b.addChange.ExecContext(ctx, b.g.folder, change.ID, number, version, change.Folder); err != nil {
			return err
		}
	}
	b.g.add(c)
	return nil
}

// addChunks writes the commits from a number on, filling up the last row.
func (b *builder) addChunks(ctx context.Context, first int) error {
	if first == len(b.g.commits) {
		return nil
	}
	last := first
	if first > 0 {
		if err := b.x.conn.QueryRowContext(ctx, "SELECT max(first) FROM chunk WHERE folder = ?", b.g.folder).Scan(&last); err != nil {
			return err
		}
		if first-last >= chunkSize {
			last = first
		}
	}
	for last < len(b.g.commits) {
		end := min(last+chunkSize, len(b.g.commits))
		var data []byte
		previous := int64(0)
		for i := last; i < end; i++ {
			data = appendCommit(data, &b.g.commits[i], int32(i), previous)
			previous = b.g.commits[i].When
		}
		if _, err := b.x.conn.ExecContext(ctx, "INSERT INTO chunk VALUES (?, ?, ?, ?) ON CONFLICT DO UPDATE SET commits = excluded.commits, data = excluded.data",
			b.g.folder, last, end-last, sealed(data)); err != nil {
			return err
		}
		last = end
	}
	return nil
}

// History gives the past of a route up to a commit. It is false where the commit
// is not in the index: Update adds it.
func (x *Index) History(ctx context.Context, name string, tip trace.Hash, route string) (h *trace.History, found bool, err error) {
	g, err := x.graph(ctx, name)
	if err != nil {
		return nil, false, classify(err)
	}
	if _, found = g.number(tip); !found {
		return nil, false, nil
	}
	a := trace.NewAssembly(route, len(g.commits))
	if err := x.gaps(ctx, g); err != nil {
		return nil, false, classify(err)
	}
	rows, err := x.conn.QueryContext(ctx, `SELECT c.number, c.place, v.tree, v.data FROM change c LEFT JOIN version v ON v.id = c.version
		WHERE c.folder = ? AND c.route = ? ORDER BY c.number`, g.folder, route)
	if err != nil {
		return nil, false, classify(err)
	}
	defer rows.Close()
	added := 0
	upTo := func(n int) {
		for ; added < n; added++ {
			a.Add(g.commits[added])
		}
	}
	for rows.Next() {
		var number int
		var place string
		var tree, data sql.RawBytes
		if err := rows.Scan(&number, &place, &tree, &data); err != nil {
			return nil, false, classify(err)
		}
		if number < added-1 || number >= len(g.commits) {
			return nil, false, classify(errDamaged)
		}
		upTo(number + 1)
		if tree == nil {
			a.Gone()
			continue
		}
		a.Has(trace.Hash(tree), place, func() (*schema.Route, error) { return decode(data, place) })
	}
	if err := rows.Err(); err != nil {
		return nil, false, classify(err)
	}
	upTo(len(g.commits))
	h, err = a.History(tip)
	return h, err == nil, classify(err)
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
