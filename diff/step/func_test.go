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
