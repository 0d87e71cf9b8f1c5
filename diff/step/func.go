// Package step holds piecewise constant functions of the running distance: the
// form of every speed profile.
//
// A Func covers a stretch of track without gaps. Each piece includes its
// beginning and excludes its end, in the nominal direction, for both
// directions of travel; the very last point belongs to the last piece.
package step

import (
	"sort"

	"speedtrail/schema/unit"
)

// Piece is a stretch of track on which the speed is constant: From <= s < To.
type Piece struct {
	From, To unit.Distance // running distance
	Speed    unit.Speed    // km/h
}

// Func is a speed along a track.
//
// Law: pieces ascend and touch, none is empty, and neighbours differ in speed.
type Func []Piece

// At gives the speed at running distance s. Beyond the ends it is the speed of
// the first or last piece.
func (f Func) At(s unit.Distance) unit.Speed { return f[f.index(s)].Speed }

// index finds the piece that s belongs to.
func (f Func) index(s unit.Distance) int {
	i := sort.Search(len(f), func(i int) bool { return f[i].To > s })
	return min(i, len(f)-1)
}

// Append adds a piece at the end of f and keeps the law: an empty piece is
// dropped, one with the speed of its neighbour lengthens it. The piece must
// begin where f ends.
func (f Func) Append(p Piece) Func {
	switch n := len(f); {
	case p.From >= p.To:
		return f
	case n > 0 && f[n-1].Speed == p.Speed:
		f[n-1].To = p.To
		return f
	}
	return append(f, p)
}

// AppendPart adds the part of another Func from one place to another at the end
// of f and keeps the law. The part must begin where f ends.
func (f Func) AppendPart(g Func, from, to unit.Distance) Func {
	for cur := g.CursorAt(from); from < to; {
		cur.Advance(from)
		p := cur.Piece()
		p.From, p.To = from, min(to, p.To)
		f = f.Append(p)
		from = p.To
	}
	return f
}

// A Cursor reads a Func from left to right in constant time a step.
type Cursor struct {
	f Func
	i int
}

// CursorAt gives a cursor at running distance s.
func (f Func) CursorAt(s unit.Distance) Cursor { return Cursor{f, f.index(s)} }

// Piece gives the piece under the cursor.
func (c *Cursor) Piece() Piece { return c.f[c.i] }

// Advance moves to the next piece if the present one ends at or before s.
func (c *Cursor) Advance(s unit.Distance) {
	for c.i < len(c.f)-1 && c.f[c.i].To <= s {
		c.i++
	}
}

// Index gives the number of the piece under the cursor.
func (c *Cursor) Index() int { return c.i }
