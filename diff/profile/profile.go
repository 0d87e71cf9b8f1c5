package profile

import (
	"encoding/binary"
	"sort"
	"strconv"

	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// TrainRow stands, in a list of governing rows, for the maximum speed of the
// train itself.
const TrainRow int32 = -1

// Governing lists the rows that give the speed v anywhere on from <= s < to to
// a train of the given length, train length delay included, in the order of the
// track; TrainRow last. Every row that attains the speed is listed. Give it the
// selection and the stretch of a compiled profile.
func (c *Compiler) Governing(sel Selection, length unit.Distance, maximum unit.Speed, from, to unit.Distance, v unit.Speed) []int32 {
	return c.AppendGoverning(nil, sel, length, maximum, from, to, v)
}

// AppendGoverning appends the rows of Governing to a list.
func (c *Compiler) AppendGoverning(rows []int32, sel Selection, length unit.Distance, maximum unit.Speed, from, to unit.Distance, v unit.Speed) []int32 {
	before, after := c.shifts(length)
	// Rows that end before the stretch, whatever the delay, come first.
	first := sort.Search(len(c.latest), func(i int) bool { return c.latest[i]+after > from })
	for i := first; i < len(c.rows); i++ {
		r := &c.rows[i]
		if r.start-before >= to {
			break
		}
		if sel[i] != v {
			continue
		}
		start, end := r.start, r.end
		if r.delay {
			start, end = start-before, end+after
		}
		if start < to && end > from {
			rows = append(rows, int32(i))
		}
	}
	if maximum == v {
		rows = append(rows, TrainRow)
	}
	return rows
}

// AppendRowKey appends to key what tells one row of a route from another, in any
// compiler of the route.
func (c *Compiler) AppendRowKey(key []byte, row int32) []byte {
	if row == TrainRow {
		return append(key, byte(TrainSpeed))
	}
	return binary.AppendUvarint(append(key, byte(c.rows[row].layer)), uint64(c.rows[row].row))
}

// Source describes a governing row for a train.
func (c *Compiler) Source(row int32, t schema.Train) Source {
	if row == TrainRow {
		return Source{t.MaxPos, TrainSpeed, "train", t.Max}
	}
	r := &c.rows[row]
	s := Source{Pos: r.pos, Layer: r.layer}
	switch r.layer {
	case StaticSpeed:
		speed := &c.route.Speed[r.row]
		s.Kind, s.Value = staticKind(speed, ClassOf(t)), StaticSpeedOf(speed, ClassOf(t))
	case AxleLoad:
		s.Kind, s.Value = "axle load "+t.AxleLoad.String(), c.route.AxleLoad[r.row].Limit[t.AxleLoad]
	case Temporary:
		temporary := &c.route.Temporary[r.row]
		s.Kind, s.Value = "temporary "+temporary.ID, temporary.Speed
	}
	return s
}

// Governed is a piece of a profile with the rows behind it.
type Governed struct {
	step.Piece
	Sources []Source
}

// Profile gives the effective profile of a reference train with the sources of
// each piece.
func (c *Compiler) Profile(t schema.Train) []Governed {
	sel := c.Select(ClassOf(t))
	f := c.Sweep(sel, t.Length, t.Max)
	pieces := make([]Governed, len(f))
	for i, p := range f {
		pieces[i].Piece = p
		for _, row := range c.Governing(sel, t.Length, t.Max, p.From, p.To, p.Speed) {
			pieces[i].Sources = append(pieces[i].Sources, c.Source(row, t))
		}
	}
	return pieces
}

// AppendSourceKey appends to key what tells one source of this compiler from
// another in text: equal keys have equal Sources.
func (c *Compiler) AppendSourceKey(key []byte, row int32, t schema.Train) []byte {
	s := c.Source(row, t)
	key = append(key, s.Pos.File...)
	key = strconv.AppendInt(append(key, ':'), int64(s.Pos.Line), 10)
	key = append(append(key, ' '), s.Kind...)
	return strconv.AppendInt(append(key, ' '), int64(s.Value), 10)
}

// Bound is a row as it binds a class of trains.
type Bound struct {
	Start, End unit.Distance // running distance, without train length delay
	Delay      bool
	Speed      unit.Speed
}

// Bounds lists the rows that bind a selection, in the order of the track.
func (c *Compiler) Bounds(sel Selection) []Bound {
	list := make([]Bound, 0, len(c.rows))
	for i, r := range c.rows {
		if sel[i] != 0 {
			list = append(list, Bound{r.start, r.end, r.delay, sel[i]})
		}
	}
	return list
}
