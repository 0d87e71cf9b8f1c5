package delta_test

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

func profile(pieces ...step.Piece) step.Func { return pieces }

// By hand: 100 m at 90, then 100, against 150 m at 90, then 110. A train of no length
// sees the change from 120 m on.
func TestBetween(t *testing.T) {
	const m = unit.Metre
	before := profile(step.Piece{From: 0, To: 100 * m, Speed: 90}, step.Piece{From: 100 * m, To: 300 * m, Speed: 100})
	after := profile(step.Piece{From: 0, To: 150 * m, Speed: 90}, step.Piece{From: 150 * m, To: 300 * m, Speed: 110})
	found := delta.Between(before, after, []align.Cell{{Length: 300 * m}})
	want := []delta.Delta{
		{Base: 100 * m, Target: 100 * m, Length: 50 * m, Before: 100, After: 90},
		{Base: 150 * m, Target: 150 * m, Length: 150 * m, Before: 100, After: 110},
	}
	if !slices.Equal(found, want) {
		t.Fatalf("got %v, want %v", found, want)
	}
	short := profile(step.Piece{From: 0, To: 120 * m, Speed: 90}, step.Piece{From: 120 * m, To: 300 * m, Speed: 110})
	found = delta.MarkRunOut(found, profile(step.Piece{From: 0, To: 300 * m, Speed: 90}), short)
	want = []delta.Delta{
		{Base: 100 * m, Target: 100 * m, Length: 20 * m, Before: 100, After: 90, RunOut: true},
		{Base: 120 * m, Target: 120 * m, Length: 30 * m, Before: 100, After: 90},
		{Base: 150 * m, Target: 150 * m, Length: 150 * m, Before: 100, After: 110},
	}
	if !slices.Equal(found, want) {
		t.Fatalf("got %v, want %v", found, want)
	}
}

const length = 40

func draw(t *rapid.T) step.Func {
	var f step.Func
	for at := unit.Distance(0); at < length; {
		p := step.Piece{From: at, To: min(length, at+1+unit.Distance(rapid.IntRange(0, 12).Draw(t, "length"))), Speed: unit.Speed(5 * rapid.IntRange(1, 3).Draw(t, "speed"))}
		f, at = f.Append(p), p.To
	}
	return f
}

// drawCells draws what two tracks of a length have in common: no cell goes on where
// the one before it ends.
func drawCells(t *rapid.T) []align.Cell {
	number := func(most int) unit.Distance { return unit.Distance(rapid.IntRange(0, most).Draw(t, "at")) }
	var cells []align.Cell
	for base, target := number(3), number(3); ; {
		c := align.Cell{Base: base, Target: target, Length: 1 + number(12)}
		if base+c.Length > length || target+c.Length > length {
			return cells
		}
		cells = append(cells, c)
		gap := number(3)
		base, target = base+c.Length+gap, target+c.Length+number(3)
		if gap == 0 {
			target++
		}
	}
}

// Point by point: what is found is where the speeds differ, each stretch with the
// speeds of both sides and as long as they last, and run-out where a train of no
// length would see none.
func TestPointByPoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		before, after, shortBefore, shortAfter := draw(t), draw(t), draw(t), draw(t)
		cells := drawCells(t)
		found := delta.Between(before, after, cells)
		marked := delta.MarkRunOut(found, shortBefore, shortAfter)
		for _, list := range [][]delta.Delta{found, marked} {
			for i, d := range list {
				if d.Length <= 0 || d.Before == d.After {
					t.Fatalf("%+v", d)
				}
				if i == 0 {
					continue
				}
				last := list[i-1]
				if d.Target < last.Target+last.Length {
					t.Fatalf("%+v stands before the end of %+v", d, last)
				}
				if last.Base+last.Length == d.Base && last.Target+last.Length == d.Target && last.Before == d.Before && last.After == d.After && last.RunOut == d.RunOut {
					t.Fatalf("%+v goes on as %+v", last, d)
				}
			}
		}
		for _, c := range cells {
			for s := range c.Length {
				base, target := c.Base+s, c.Target+s
				b, a := before.At(base), after.At(target)
				runOut := shortBefore.At(base) == shortAfter.At(target)
				for i, list := range [][]delta.Delta{found, marked} {
					at := slices.IndexFunc(list, func(d delta.Delta) bool { return d.Target <= target && target < d.Target+d.Length })
					if (at >= 0) != (b != a) {
						t.Fatalf("at %d: %d to %d, found %v", target, b, a, list)
					}
					if at < 0 {
						continue
					}
					d := list[at]
					if d.Before != b || d.After != a || d.Base+target-d.Target != base || d.RunOut != (i == 1 && runOut) {
						t.Fatalf("at %d of the base and %d: %d to %d, run-out %t, found %+v", base, target, b, a, runOut, d)
					}
				}
			}
		}
	})
}
