package impact

import (
	"flag"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// lengthened gives a profile in which piece i has another length.
func lengthened(f step.Func, i int, length unit.Distance) step.Func {
	var out step.Func
	at := unit.Distance(0)
	for k, p := range f {
		n := p.To - p.From
		if k == i {
			n = length
		}
		out = append(out, step.Piece{From: at, To: at + n, Speed: p.Speed})
		at += n
	}
	return out
}

// short is a piece of a drawn profile that is too short for its speed, with the
// length that it needs, found by recomputing the run with ever so long a piece.
type short struct {
	f      step.Func
	m      Motion
	piece  int
	needed unit.Distance
}

func checkShort(t *testing.T, property func(*rapid.T, short)) {
	t.Helper()
	// The same draws each time, unless the flags of rapid ask for others.
	for name, value := range map[string]string{"rapid.seed": "1", "rapid.checks": "300", "rapid.nofailfile": "true"} {
		f := flag.Lookup(name)
		if old := f.Value.String(); old == f.DefValue {
			if err := f.Value.Set(value); err != nil {
				t.Fatal(err)
			}
			defer f.Value.Set(old)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		f, m := drawProfile(t)
		run := newRun(f, m)
		for i, p := range f {
			if run.piece(i).peak() < mmps(p.Speed)-1e-6 {
				needed := newRun(lengthened(f, i, 1000*unit.Kilometre), m).Needed(p.From)
				property(t, short{f, m, i, needed})
			}
		}
	})
}

// With the needed length, the speed of a piece is just reached: recomputed with
// a piece of that length it is, with one that is shorter by a centimetre it is
// not.
func TestNeededLengthByRecomputing(t *testing.T) {
	checkShort(t, func(t *rapid.T, s short) {
		full := mmps(s.f[s.piece].Speed)
		peak := func(length unit.Distance) float64 {
			return newRun(lengthened(s.f, s.piece, length), s.m).piece(s.piece).peak()
		}
		if got := peak(s.needed); got < full-1e-6 {
			t.Fatalf("%v: %v mm/s of %v with the needed %s m", s, got, full, s.needed.M())
		}
		if got := peak(s.needed - 10); got > full-1e-5 {
			t.Fatalf("%v: %v mm/s of %v a centimetre below the needed %s m", s, got, full, s.needed.M())
		}
	})
}

// The needed length is the one that recomputing gives.
func TestNeededLength(t *testing.T) {
	checkShort(t, func(t *rapid.T, s short) {
		if needed := newRun(s.f, s.m).Needed(s.f[s.piece].From); needed != s.needed {
			t.Fatalf("%v: %s m", s, needed.M())
		}
	})
}

// The same where the speeds at both ends of the piece do not depend on its
// length.
func TestNeededLengthOfFixedEnds(t *testing.T) {
	checked := 0
	checkShort(t, func(t *rapid.T, s short) {
		now, then := newRun(s.f, s.m), newRun(lengthened(s.f, s.piece, s.needed), s.m)
		if now.edges[s.piece] != then.edges[s.piece] || now.edges[s.piece+1] != then.edges[s.piece+1] {
			return
		}
		checked++
		if needed := now.Needed(s.f[s.piece].From); needed != s.needed {
			t.Fatalf("%v: %s m", s, needed.M())
		}
	})
	if !testing.Short() && checked < 10 {
		t.Errorf("only %d pieces", checked)
	}
}

// Braking from a standing start: with 0.5 m/s² 160 km/h need v²/2a = 1975.309 m.
// The first 100 m of a route that goes on at 160 are one piece with what follows;
// before a rise to 200 they are a piece of their own, through which the train
// only accelerates.
func TestNeededLengthOfAStart(t *testing.T) {
	f := profileOf(100, 160, 9000, 200)
	if needed := newRun(f, Motion{Acceleration: 500, Braking: 500}).Needed(0); needed != 1_975_309 {
		t.Errorf("got %s m, want 1975.309 m", needed.M())
	}
}

// A piece between two of the lower speed needs up and down: 60 to 120 km/h with
// 0.5 m/s² 833.333 m each.
func TestNeededLengthBetween(t *testing.T) {
	f := profileOf(2000, 60, 2100, 120, 5000, 60)
	if needed := newRun(f, Motion{Acceleration: 500, Braking: 500}).Needed(2000 * unit.Metre); needed != 1_666_667 {
		t.Errorf("got %s m, want 1666.667 m", needed.M())
	}
}
