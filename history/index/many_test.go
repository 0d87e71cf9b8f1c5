package index

import (
	"bytes"
	"context"
	"math/rand/v2"
	"path/filepath"
	"slices"
	"testing"

	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// versionsOf gives versions of a route, each with another row than the one before.
func versionsOf(r *schema.Route, n int) []*schema.Route {
	now := *r
	for range 30 {
		now.Speed = append(now.Speed, r.Speed[0]) // long enough for a difference to pay
	}
	list := make([]*schema.Route, n)
	for i := range list {
		next := now
		next.Speed = slices.Clone(now.Speed)
		next.Speed[i%len(next.Speed)].Basic = unit.Speed(5 + 5*(i%100))
		list[i], now = &next, next
	}
	return list
}

// Processes that read the versions of a route from different ones on add them in
// turns: no chain is longer than the limit, and every version comes back.
func TestChainsOfMany(t *testing.T) {
	ctx := context.Background()
	versions := versionsOf(one(t), 5*longestChain)
	for seed := range uint64(6) {
		rnd := rand.New(rand.NewPCG(seed, 3))
		x, err := Open(ctx, filepath.Join(t.TempDir(), "index.db"))
		if err != nil {
			t.Fatal(err)
		}
		defer x.Close()
		// One transaction for all of them: the disk has nothing to do with it.
		if err := x.exec(ctx, "BEGIN IMMEDIATE"); err != nil {
			t.Fatal(err)
		}
		type process struct {
			b *builder
			p packer
			i int
		}
		var working []*process
		for k := range 4 {
			w := &process{b: &builder{x: x, g: &graph{}, path: ".", ids: map[trace.Key]int64{}}, i: k * (longestChain - 3)}
			if err := w.b.begin(ctx); err != nil {
				t.Fatal(err)
			}
			defer w.b.close()
			working = append(working, w)
		}
		for len(working) > 0 {
			k := rnd.IntN(len(working))
			w := working[k]
			var list []*trace.Loaded
			for range min(1+rnd.IntN(9), len(versions)-w.i) {
				v := &trace.Loaded{Key: trace.Key{Tree: trace.Hash{byte(w.i)}}}
				v.Data = w.p.pack(v.Key, "routes/x", versions[w.i])
				list = append(list, v)
				w.i++
			}
			if err := w.b.addVersionsOfMany(ctx, list); err != nil {
				t.Fatal(err)
			}
			if w.i == len(versions) {
				working = slices.Delete(working, k, k+1)
			}
		}
		depths := map[int64]int{}
		for _, r := range rowsOf(t, x) {
			if r.base.Valid {
				depths[r.id] = depths[r.base.Int64] + 1
			}
			if depths[r.id] > longestChain {
				t.Fatalf("version %d lies %d above the one that is kept whole", r.id, depths[r.id])
			}
			u := &unpacker{ctx: ctx, x: x, rows: map[int64]row{}, whole: map[int64][]byte{}}
			got, err := u.unpack(r.row)
			if err != nil || !bytes.Equal(got, encode(versions[r.version])) {
				t.Fatalf("version %d: %x, %v", r.version, got, err)
			}
		}
	}
}

type versionRow struct {
	row
	version int
}

// rowsOf gives all versions of TestChainsOfMany, by their ids.
func rowsOf(t *testing.T, x *Index) (list []versionRow) {
	t.Helper()
	rows, err := x.conn.QueryContext(context.Background(), "SELECT id, base, data, tree FROM version ORDER BY id")
	if err != nil {
		t.Fatal(err)
	}
	defer rows.Close()
	for rows.Next() {
		var r versionRow
		var tree []byte
		if err := rows.Scan(&r.id, &r.base, &r.data, &tree); err != nil {
			t.Fatal(err)
		}
		r.version = int(tree[0])
		list = append(list, r)
	}
	if err := rows.Err(); err != nil {
		t.Fatal(err)
	}
	return list
}
