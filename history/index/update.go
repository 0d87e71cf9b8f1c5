package index

import (
	"context"
	"database/sql"
	"database/sql/driver"
	"errors"
	"sync"
	"time"

	"github.com/mattn/go-sqlite3"

	"speedtrail/history/trace"
)

// Update adds the commits that can be reached from tip and are not there yet to
// the history of a name. What a cancelled or failed call has added stays. Past calls
// it again where another process has emptied the index meanwhile.
func (x *Index) Update(ctx context.Context, reader *trace.Reader, name string, tip trace.Hash, progress func(done, total int)) (err error) {
	var g *graph
	err = x.transaction(ctx, "BEGIN", func() (err error) {
		g, err = x.graph(ctx, name)
		return err
	})
	if err != nil {
		return classify(err)
	}
	if _, ok := g.number(tip); ok {
		return nil
	}
	walk, err := reader.Commits(ctx, tip, false, func(h trace.Hash) bool { _, ok := g.number(h); return ok })
	if err != nil {
		return err
	}
	b := &builder{x: x, g: g, path: name, ids: map[trace.Key]int64{}}
	defer b.close()
	defer func() {
		if err != nil {
			x.graphs = nil // it may hold what was not written
		}
	}()
	if err = b.begin(ctx); err != nil {
		return classify(err)
	}
	var p packer
	reader.Each(func(v *trace.Loaded) { v.Data, v.Route = p.pack(v.Key, v.Folder, v.Route), nil })
	err = reader.Read(ctx, walk, b, progress, func(batch *trace.Batch) error { return classify(b.add(ctx, batch)) })
	return classify(errors.Join(err, b.finish(ctx)))
}

// longest is how long a transaction lasts, and the batch in which that ends: another
// process that adds has to wait for its end.
const longest = time.Second

// builder adds batches. It is the trace.Prior of its reading, which asks while a
// batch is added.
type builder struct {
	x     *Index
	path  string
	empty bool // no version was there at the beginning
	ctx   context.Context

	// asking is held while a version is looked for, and while a transaction begins:
	// SQLite does not wait for the transaction of another process where a question
	// on the same connection is not answered to the end. A connection of its own
	// would have to wait for the transactions of this one.
	asking sync.Mutex

	mu    sync.Mutex // guards what follows
	g     *graph
	ids   map[trace.Key]int64 // of versions
	known int64               // the greatest id that was given; -1: others give ids, too
	open  bool                // a transaction is under way
	begun time.Time           // when it began
	first int                 // how many commits there were when it began

	depths map[int64]int // of versions where others add some, too: how many are below

	find       *sql.Stmt
	baseOf     *sql.Stmt
	addVersion *sql.Stmt
	statements []*sql.Stmt
}

func (b *builder) begin(ctx context.Context) error {
	b.ctx = ctx
	// Versions come in the order of hashes: with the driver's cache of 2 MB, a long
	// history would read and write the same pages again and again.
	// What a statement of many rows would take back if it failed stays in memory,
	// too.
	if err := b.x.exec(ctx, "PRAGMA cache_size = -8192", "PRAGMA temp_store = MEMORY"); err != nil {
		return err
	}
	if err := b.x.conn.QueryRowContext(ctx, greatestVersion).Scan(&b.known); err != nil {
		return err
	}
	b.empty = b.known == 0
	for text, to := range map[string]**sql.Stmt{
		"SELECT id, place, route, fault FROM version WHERE tree = ? AND zone = ?":                                     &b.find,
		"SELECT base FROM version WHERE id = ?":                                                                       &b.baseOf,
		"INSERT INTO version (tree, zone, place, route, fault, base, data) VALUES (?, ?, ?, ?, ?, ?, ?) RETURNING id": &b.addVersion,
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

const greatestVersion = "SELECT coalesce(max(id), 0) FROM version"

func (b *builder) close() {
	for _, s := range b.statements {
		s.Close()
	}
}

// Base implements trace.Prior.
func (b *builder) Base(h trace.Hash) (trace.Hash, bool) {
	b.mu.Lock()
	defer b.mu.Unlock()
	n, ok := b.g.number(h)
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
	b.asking.Lock()
	err := b.find.QueryRowContext(b.ctx, key.Tree[:], key.Zone).Scan(&id, &v.Folder, &v.ID, &v.Fault)
	b.asking.Unlock()
	if errors.Is(err, sql.ErrNoRows) {
		return nil, nil
	}
	if err != nil {
		return nil, classify(err)
	}
	b.mu.Lock()
	b.ids[key] = id
	b.mu.Unlock()
	return v, nil
}

// add adds a batch. Each transaction writes most pages of the index again, as versions
// come in the order of hashes, so that it takes as many batches as it has time for. The first batch of a new index
// is there at once.
func (b *builder) add(ctx context.Context, batch *trace.Batch) error {
	if !b.open {
		if err := b.start(ctx); err != nil {
			return err
		}
	}
	err := b.addBatch(ctx, batch)
	if err != nil {
		b.rollback(ctx)
		return err
	}
	if b.first > 0 && time.Since(b.begun) < longest {
		return nil
	}
	return b.finish(ctx)
}

// start begins a transaction and takes in what another process has added since
// the last one.
func (b *builder) start(ctx context.Context) error {
	b.asking.Lock()
	err := b.x.exec(ctx, "BEGIN IMMEDIATE")
	b.asking.Unlock()
	if err != nil {
		return err
	}
	b.open, b.begun = true, time.Now()
	if err = b.catchUp(ctx); err != nil {
		b.rollback(ctx)
	}
	return err
}

func (b *builder) catchUp(ctx context.Context) error {
	// The commits and ids that are known here would be those of nothing.
	if now, err := b.x.editionNow(ctx); err != nil {
		return err
	} else if now != b.x.edition {
		return errEmptied
	}
	if b.g.folder == 0 {
		if _, err := b.x.conn.ExecContext(ctx, "INSERT INTO folder (path) VALUES (?) ON CONFLICT DO NOTHING", b.path); err != nil {
			return err
		}
		if err := b.x.conn.QueryRowContext(ctx, "SELECT id FROM folder WHERE path = ?", b.path).Scan(&b.g.folder); err != nil {
			return err
		}
	}
	var greatest int64
	if err := b.x.conn.QueryRowContext(ctx, greatestVersion).Scan(&greatest); err != nil {
		return err
	}
	if greatest != b.known {
		b.known = -1
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	err := b.x.extend(ctx, b.g)
	b.first = len(b.g.commits)
	return err
}

// addBatch adds what is not there yet. Of commits and versions that another
// process has added, it keeps that one's.
func (b *builder) addBatch(ctx context.Context, batch *trace.Batch) error {
	var err error
	if b.known >= 0 {
		err = b.addVersions(batch.Loaded)
	} else {
		err = b.addVersionsOfMany(ctx, batch.Loaded)
	}
	if err != nil {
		return err
	}
	return b.addDeltas(ctx, batch.Deltas)
}

// finish ends a transaction that is under way, even where the context has ended:
// what was read stays.
func (b *builder) finish(ctx context.Context) error {
	if !b.open {
		return nil
	}
	ctx = context.WithoutCancel(ctx)
	err := b.addChunks(ctx, b.first)
	if err == nil {
		err = b.x.exec(ctx, "COMMIT")
	}
	if err != nil {
		b.rollback(ctx)
		return err
	}
	b.open = false
	return nil
}

func (b *builder) rollback(ctx context.Context) {
	_, _ = b.x.conn.ExecContext(context.WithoutCancel(ctx), "ROLLBACK")
	b.open = false
}

// addVersions adds versions where nobody else has added any.
func (b *builder) addVersions(list []*trace.Loaded) error {
	return b.x.inserting("version (id, tree, zone, place, route, fault, base, data)", func(rows *inserter) error {
		for _, v := range list {
			base, data, err := b.packed(v)
			if err != nil {
				return err
			}
			b.known++
			if err := rows.add(b.known, v.Tree[:], v.Zone, v.Folder, v.ID, v.Fault, base, data); err != nil {
				return err
			}
			b.setID(v.Key, b.known)
		}
		return nil
	})
}

func (b *builder) setID(key trace.Key, id int64) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.ids[key] = id
}

// packed gives the row of a version; both are nil where it is faulty. Its base
// has been added before it.
func (b *builder) packed(v *trace.Loaded) (base, data driver.Value, err error) {
	p, ok := v.Data.(packed)
	if !ok {
		return nil, nil, nil
	}
	if p.base == nil {
		return nil, p.data, nil
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	id, ok := b.ids[*p.base]
	if !ok {
		return nil, nil, errDamaged
	}
	return id, p.data, nil
}

// addDeltas adds commits and what they change.
func (b *builder) addDeltas(ctx context.Context, list []trace.Delta) error {
	type gap struct {
		number int64
		fault  string
	}
	var gaps []gap
	b.mu.Lock()
	err := b.x.inserting("change (folder, route, number, version, place)", func(rows *inserter) error {
		for i := range list {
			d := &list[i]
			if _, ok := b.g.number(d.Hash); ok {
				continue
			}
			number := int64(len(b.g.commits))
			if d.Gap != "" {
				gaps = append(gaps, gap{number, d.Gap})
			}
			if err := b.addDelta(d, number, rows); err != nil {
				return err
			}
		}
		return nil
	})
	b.mu.Unlock()
	if err != nil {
		return err
	}
	for _, g := range gaps {
		if _, err := b.x.conn.ExecContext(ctx, "INSERT INTO gap VALUES (?, ?, ?)", b.g.folder, g.number, g.fault); err != nil {
			return err
		}
	}
	return nil
}

func (b *builder) addDelta(d *trace.Delta, number int64, rows *inserter) error {
	c := trace.Commit{Hash: d.Hash, When: d.When, Gap: d.Gap, Cut: d.Cut}
	for _, p := range d.Parents {
		n, ok := b.g.number(p)
		if !ok {
			return errDamaged
		}
		c.Parents = append(c.Parents, n)
	}
	for _, change := range d.Changes {
		var version driver.Value
		if change.Version != nil {
			id, ok := b.ids[change.Version.Key]
			if !ok {
				return errDamaged
			}
			version = id
		}
		if err := rows.add(b.g.folder, change.ID, number, version, change.Folder); err != nil {
			return err
		}
	}
	b.g.add(c)
	return nil
}

// inserting runs work with an inserter.
func (x *Index) inserting(into string, work func(*inserter) error) error {
	return x.conn.Raw(func(c any) error {
		rows, err := newInserter(c.(*sqlite3.SQLiteConn), into)
		if err != nil {
			return err
		}
		defer rows.close()
		if err := work(rows); err != nil {
			return err
		}
		return rows.flush()
	})
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
