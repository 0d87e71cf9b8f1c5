package index

import (
	"bytes"
	"context"
	"database/sql"
	"errors"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"speedtrail/history/trace"
	"speedtrail/schema/unit"
)

// Law: apply(a, difference(a, b)) is b.
func TestDifference(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 9))
	text := func() []byte {
		b := make([]byte, rnd.IntN(12))
		for i := range b {
			b[i] = byte(rnd.IntN(2))
		}
		return sealed(b)
	}
	for range 20_000 {
		a, b := text(), text()
		got, err := apply(a, difference(a, b))
		if err != nil || !bytes.Equal(got, b) {
			t.Fatalf("from %x to %x: %x, %v", a, b, got, err)
		}
		d := difference(a, b)
		if got, err := apply(text(), d); err == nil {
			// Of another base comes nothing that passes for sound, unless it is the same.
			if _, err := opened(got); err == nil && !bytes.Equal(got, b) {
				t.Fatalf("%x passes for %x", got, b)
			}
		}
		d[rnd.IntN(len(d))] ^= 1 << rnd.IntN(8)
		if got, err := apply(a, d); err == nil {
			if _, err := opened(got); err == nil {
				t.Fatalf("a damaged difference passes: %x", got)
			}
		}
	}
}

// Versions come back whole, whichever of a chain is asked for and whatever was
// read before; a chain that leads nowhere is damage.
func TestUnpack(t *testing.T) {
	ctx := context.Background()
	x, err := Open(ctx, filepath.Join(t.TempDir(), "index.db"))
	if err != nil {
		t.Fatal(err)
	}
	defer x.Close()
	r := one(t)
	for range 30 {
		r.Speed = append(r.Speed, r.Speed[0]) // long enough for a difference to pay
	}
	var p packer
	var rows []row
	var want [][]byte
	ids := map[trace.Key]int64{}
	for i := range 3 * longestChain {
		r.Speed[i%len(r.Speed)].Basic = unit.Speed(5 + 5*(i%100))
		key := trace.Key{Tree: trace.Hash{byte(i)}}
		out := p.pack(key, r.Folder, r)
		next := row{id: int64(i + 1), data: out.data}
		if out.base != nil {
			next.base.Int64, next.base.Valid = ids[*out.base], true
		}
		ids[key] = next.id
		rows = append(rows, next)
		want = append(want, encode(r))
		if _, err := x.conn.ExecContext(ctx, "INSERT INTO version VALUES (?, ?, '', '', '', '', ?, ?)", next.id, key.Tree[:], next.base, next.data); err != nil {
			t.Fatal(err)
		}
	}
	whole := 0
	for _, r := range rows {
		if !r.base.Valid {
			whole++
		}
	}
	if whole != 3 {
		t.Errorf("%d of %d versions are kept whole", whole, len(rows))
	}
	rnd := rand.New(rand.NewPCG(2, 9))
	for range 50 {
		u := &unpacker{ctx: ctx, x: x, rows: map[int64]row{}, whole: map[int64][]byte{}}
		for _, i := range rnd.Perm(len(rows))[:1+rnd.IntN(9)] {
			if got, err := u.unpack(rows[i]); err != nil || !bytes.Equal(got, want[i]) {
				t.Fatalf("version %d: %x, %v", i, got, err)
			}
			u.rows[rows[i].id] = rows[i]
		}
	}
	// A version is made of an earlier one.
	u := &unpacker{ctx: ctx, x: x, rows: map[int64]row{8: {id: 8, data: rows[0].data}}, whole: map[int64][]byte{}}
	if got, err := u.unpack(row{id: 9, base: sql.NullInt64{Int64: 8, Valid: true}, data: rows[1].data}); err != nil || !bytes.Equal(got, want[1]) {
		t.Errorf("of an earlier version: %x, %v", got, err)
	}
	for _, id := range []int64{7, 8} {
		u := &unpacker{ctx: ctx, x: x, rows: u.rows, whole: map[int64][]byte{}}
		if got, err := u.unpack(row{id: id, base: sql.NullInt64{Int64: 8, Valid: true}, data: rows[1].data}); !errors.Is(err, errDamaged) {
			t.Errorf("version %d of version 8: %x, %v", id, got, err)
		}
	}
	for _, damage := range []string{"DELETE FROM version WHERE base IS NULL", "UPDATE version SET base = id", "UPDATE version SET base = id + 1"} {
		if _, err := x.conn.ExecContext(ctx, damage); err != nil {
			t.Fatal(err)
		}
		u := &unpacker{ctx: ctx, x: x, rows: map[int64]row{}, whole: map[int64][]byte{}}
		if got, err := u.unpack(rows[len(rows)-1]); err == nil {
			t.Errorf("%s: %x", damage, got)
		}
	}
}
