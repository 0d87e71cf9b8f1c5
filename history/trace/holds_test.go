package trace_test

import (
	"context"
	"math/rand/v2"
	"testing"

	"speedtrail/history/internal/past"
	"speedtrail/history/trace"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// For random histories, a commit has the speed of a step, and of a piece of a stretch,
// because of it where going back from the one comes to the other.
func TestHoldsAgainstEveryCommit(t *testing.T) {
	held, lost := 0, 0
	for seed := range uint64(8) {
		d := draw(t, seed, 30)
		h, err := trace.NewReader(d.repo, ".").History(context.Background(), d.tip, "R1", trace.Options{})
		if err != nil {
			t.Fatal(err)
		}
		length := h.Newest().Track.Length()
		rnd := rand.New(rand.NewPCG(seed, 10))
		for _, first := range []bool{false, true} {
			view := h.View(codes.Nominal, first)
			order := view.Order()
			for _, train := range d.brute.Data[29].Trains {
				q := past.Case{Route: "R1", Train: train, Direction: codes.Nominal, At: unit.Distance(rnd.Int64N(int64(length))), FirstParent: first}
				trail, pieces := view.Point(train, q.At), view.Stretch(train, 0, length)
				for range 3 {
					commit := order[rnd.IntN(len(order))]
					leads := d.brute.Leads(d.number(t, h, commit), q)
					for i, holds := range view.Holds(trail, commit) {
						want := leads[d.number(t, h, trail.Steps[i].After.Commit)]
						if holds != want {
							t.Fatalf("seed %d, step %d, commit %d: %v, want %v", seed, i, d.number(t, h, commit), holds, want)
						}
						if want {
							held++
						} else {
							lost++
						}
					}
					for _, p := range pieces {
						n := d.number(t, h, commit)
						want := d.brute.Data[n] != nil
						for _, at := range []unit.Distance{p.From, p.To - 1, p.From + (p.To-p.From)/2} {
							q := q
							q.At = at
							want = want && d.brute.Speed(n, q) == p.Speed && d.brute.Leads(n, q)[d.number(t, h, p.Origin)]
						}
						if got := view.HoldsPiece(train, p, commit); got && !want || !got && want && p.To-p.From < 3 {
							t.Fatalf("seed %d, %v, commit %d: %v, want %v", seed, p, n, got, want)
						} else if got {
							held++
						}
					}
				}
			}
		}
	}
	if held < 100 || lost < 100 {
		t.Fatalf("the histories are too tame: %d, %d", held, lost)
	}
}
