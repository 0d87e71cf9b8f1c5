package network

import (
	"bytes"
	"slices"
	"strings"
	"testing"

	"speedtrail/history/revision"
	"speedtrail/schema"
)

// The data set has the size that was asked for, is free of faults at each
// revision, and the revisions differ where they should.
func TestRepository(t *testing.T) {
	s := Size{Routes: 12, Rows: 20, AxleLoad: 4, Temp: 2, Trains: 30}
	repo, err := revision.Open(Repository(t, s))
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	load := func(base, target string) (b, d *schema.Dataset) {
		t.Helper()
		c, err := repo.Resolve(base)
		if err != nil {
			t.Fatal(err)
		}
		from, err := repo.Snapshot(c.Hash, ".")
		if err != nil {
			t.Fatal(err)
		}
		if c, err = repo.Resolve(target); err != nil {
			t.Fatal(err)
		}
		to, err := repo.Snapshot(c.Hash, ".")
		if err != nil {
			t.Fatal(err)
		}
		if b, d, err = schema.LoadPair(t.Context(), from, to); err != nil {
			t.Fatal(err)
		}
		return b, d
	}
	for _, c := range []struct {
		target            string
		differ            int
		leastRow, mostRow int
	}{{Five, 5, 3, 5}, {All, 12, 1, 2}} {
		t.Run(c.target, func(t *testing.T) {
			b, d := load(Base, c.target)
			if len(d.Routes) != c.differ || len(d.Unread) != s.Routes-c.differ || len(d.Trains) != s.Trains {
				t.Fatalf("%d routes differ, %d do not, %d trains", len(d.Routes), len(d.Unread), len(d.Trains))
			}
			for i, r := range d.Routes {
				old := b.Routes[i]
				if len(r.Speed) != s.Rows || len(r.AxleLoad) != s.AxleLoad || len(r.Temporary) != s.Temp {
					t.Errorf("route %s has %d, %d and %d rows", r.ID, len(r.Speed), len(r.AxleLoad), len(r.Temporary))
				}
				rows := 0
				for k := range r.Speed {
					if r.Speed[k] != old.Speed[k] {
						rows++
					}
				}
				for k := range r.AxleLoad {
					if r.AxleLoad[k] != old.AxleLoad[k] {
						rows++
					}
				}
				if rows < c.leastRow || rows > c.mostRow {
					t.Errorf("route %s: %d rows differ", r.ID, rows)
				}
			}
			for i, x := range d.Trains {
				for _, y := range d.Trains[:i] {
					if x.Length == y.Length {
						t.Errorf("trains %s and %s have one length", x.ID, y.ID)
					}
				}
			}
		})
	}
}

// Delays, categories, cant deficiency and directions of travel all occur.
func TestMixture(t *testing.T) {
	var stream bytes.Buffer
	history(&stream, Size{Routes: 3, Rows: 60, AxleLoad: 15, Temp: 3, Trains: 1})
	for _, want := range []string{",nominal,", ",reverse,", ",no\n", "TSR-3,", "C4,D4,E4"} {
		if !strings.Contains(stream.String(), want) {
			t.Errorf("%q does not occur", want)
		}
	}
	r := newRoute(Full, 1)
	if len(r.plain) == 0 || len(r.graded) == 0 || !slices.ContainsFunc(r.speed, func(row []string) bool { return row[freightG] != "" }) {
		t.Errorf("%d plain rows, %d by cant deficiency", len(r.plain), len(r.graded))
	}
}

// The same size gives the same bytes, and a route does not depend on how many
// there are.
func TestSameBytes(t *testing.T) {
	var one, two bytes.Buffer
	s := Size{Routes: 4, Rows: 10, AxleLoad: 2, Temp: 1, Trains: 7}
	history(&one, s)
	history(&two, s)
	if !bytes.Equal(one.Bytes(), two.Bytes()) {
		t.Error("two runs differ")
	}
	a := newRoute(s, 2).files()
	s.Routes = 1000
	if b := newRoute(s, 2).files(); !slices.Equal(a, b) {
		t.Error("the route differs in a larger network")
	}
}
