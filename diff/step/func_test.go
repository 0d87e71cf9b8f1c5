package step

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/schema/unit"
)

func drawFunc(t *rapid.T) Func {
	var f Func
	at := unit.Distance(0)
	for range rapid.IntRange(1, 6).Draw(t, "pieces") {
		to := at + unit.Distance(rapid.IntRange(1, 5).Draw(t, "length"))
		f = f.Append(Piece{at, to, unit.Speed(5 * rapid.IntRange(1, 3).Draw(t, "speed"))})
		at = to
	}
	return f
}

// A Func that is cut anywhere and put together again is the same.
func TestAppendPart(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := drawFunc(t)
		end := f[len(f)-1].To
		cut := unit.Distance(rapid.Int64Range(0, int64(end)).Draw(t, "cut"))
		got := Func(nil).AppendPart(f, 0, cut).AppendPart(f, cut, end)
		if !slices.Equal(got, f) {
			t.Fatalf("cut at %d: %v, want %v", cut, got, f)
		}
	})
}

// A piece has its beginning and not its end, the very last point belongs to the last
// piece, and beyond the ends the outermost pieces go on.
func TestAt(t *testing.T) {
	f := Func{{10, 20, 80}, {20, 30, 100}}
	for s, want := range map[unit.Distance]unit.Speed{9: 80, 10: 80, 19: 80, 20: 100, 29: 100, 30: 100, 31: 100} {
		if got := f.At(s); got != want {
			t.Errorf("at %d: %d, want %d", s, got, want)
		}
	}
}

// The law: no piece is empty, and neighbours differ.
func TestAppend(t *testing.T) {
	for name, c := range map[string]struct {
		add  Piece
		want Func
	}{
		"an empty piece":      {Piece{20, 20, 100}, Func{{10, 20, 80}}},
		"one that turns back": {Piece{20, 19, 80}, Func{{10, 20, 80}}},
		"the same speed":      {Piece{20, 30, 80}, Func{{10, 30, 80}}},
		"another speed":       {Piece{20, 30, 100}, Func{{10, 20, 80}, {20, 30, 100}}},
	} {
		if got := (Func{{10, 20, 80}}).Append(c.add); !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", name, got, c.want)
		}
	}
	if got := Func(nil).Append(Piece{10, 10, 80}); len(got) > 0 {
		t.Errorf("an empty piece begins a function: %v", got)
	}
}

// A cursor at a joint stands on the piece that begins there, and stays on the last one.
func TestCursor(t *testing.T) {
	f := Func{{10, 20, 80}, {20, 30, 100}, {30, 40, 120}}
	cur := f.CursorAt(0)
	for _, c := range []struct {
		to   unit.Distance
		want int
	}{{19, 0}, {20, 1}, {29, 1}, {40, 2}, {50, 2}} {
		if cur.Advance(c.to); cur.Index() != c.want || cur.Piece() != f[c.want] {
			t.Errorf("advanced to %d: piece %d, %v, want %d", c.to, cur.Index(), cur.Piece(), c.want)
		}
		if got := f.CursorAt(c.to).i; got != c.want {
			t.Errorf("begun at %d: piece %d, want %d", c.to, got, c.want)
		}
	}
}
