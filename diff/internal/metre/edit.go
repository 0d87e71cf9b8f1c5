package metre

import (
	"slices"

	"speedtrail/schema"
	"speedtrail/schema/codes"
)

// Edited draws a later state of a sketch: some edits, or none. Positions stay
// where the posts say, whatever becomes of the track.
func (s *Sketch) Edited(d Dice) *Sketch {
	t := *s
	t.segments = slices.Clone(s.segments)
	t.elements = slices.Clone(s.elements)
	t.spans = slices.Clone(s.spans)
	for i := range t.paint {
		t.paint[i] = slices.Clone(s.paint[i])
	}
	edits := [...]func(Dice){
		t.alterElement, t.moveBoundary, t.split, t.flipDelay, t.alterSpan, t.addSpan, t.dropSpan, t.moveEnd, t.addJump, t.dropJump, t.moveJump, t.alterDirections, t.level,
	}
	for range d(0, 4) {
		edits[d(0, len(edits)-1)](d)
	}
	return &t
}

// run picks one of the runs of a direction.
func (s *Sketch) run(d Dice, direction codes.Direction) run {
	list := runs(s.paint[direction])
	return list[d(0, len(list)-1)]
}

func (s *Sketch) alterElement(d Dice) {
	e := &s.elements[s.run(d, codes.Direction(d(0, 1))).element]
	switch c := d(0, codes.Categories-1); d(0, 3) {
	case 0:
		e.Basic = d.speed()
	case 1:
		e.Cant[d(0, codes.CantDeficiencies-1)] = d.speed()
	case 2:
		e.Other[c], e.Replaces[c] = d.speed(), d.oneIn(2)
	case 3:
		e.Replaces[c] = e.Other[c] != 0 && !e.Replaces[c]
	}
}

// moveBoundary lets a run grow over its neighbours, in one direction or both.
func (s *Sketch) moveBoundary(d Dice) {
	r, by := s.run(d, codes.Nominal), d(-4, 4)
	from, to := min(r.from, max(0, r.from+by)), max(r.to, min(len(s.paint[0]), r.to+by))
	s.brush(codes.Nominal, from, to, r.element)
	if d.oneIn(2) {
		s.brush(codes.Reverse, from, to, r.element)
	}
}

// split makes two rows of one, which say the same.
func (s *Sketch) split(d Dice) {
	for _, direction := range codes.AllDirections {
		r := s.run(d, direction)
		s.elements = append(s.elements, s.elements[r.element])
		s.brush(direction, d(r.from, r.to), r.to, len(s.elements)-1)
	}
}

func (s *Sketch) flipDelay(d Dice) {
	if n := len(s.spans); n > 0 && d.oneIn(3) {
		p := &s.spans[d(0, n-1)]
		p.delay = !p.delay
		return
	}
	e := &s.elements[s.run(d, codes.Direction(d(0, 1))).element]
	e.Delay = !e.Delay
}

func (s *Sketch) alterSpan(d Dice) {
	if n := len(s.spans); n > 0 {
		i := d(0, n-1)
		id := s.spans[i].id
		s.spans[i] = d.span(s)
		if s.spans[i].speed != 0 && id != "" {
			s.spans[i].id = id
		}
	}
}

// level gives every row the same speed and delay, so that changes run on far,
// over joints and breaks.
func (s *Sketch) level(d Dice) {
	v, delay := d.speed(), d.oneIn(3)
	for i := range s.elements {
		s.elements[i] = schema.SpeedRow{Basic: v}
	}
	s.delayAll(delay)
}

func (s *Sketch) delayAll(delay bool) {
	for i := range s.elements {
		s.elements[i].Delay = delay
	}
	for i := range s.spans {
		s.spans[i].delay = delay
	}
}

func (s *Sketch) addSpan(d Dice) { s.spans = append(s.spans, d.span(s)) }

func (s *Sketch) dropSpan(d Dice) {
	if n := len(s.spans); n > 0 {
		i := d(0, n-1)
		s.spans = slices.Delete(s.spans, i, i+1)
	}
}

func (s *Sketch) alterDirections(d Dice) { s.directions = directionSets[d(0, 2)] }

func (s *Sketch) moveEnd(d Dice) {
	by := d(-6, 6)
	s.relay(func(list []segment) []segment {
		if by%2 == 0 {
			list[len(list)-1].length += by
			return list
		}
		list[0].from += by
		list[0].length -= by
		return list
	})
}

// addJump makes a joint inside a segment: posts are missing or repeated after
// it, or the later posts read otherwise from there on.
func (s *Sketch) addJump(d Dice) {
	i := d(0, len(s.segments)-1)
	old := s.segments[i]
	at, by, shift := d(1, max(1, old.length-1)), d(1, 8)*(1-2*d(0, 1)), d.oneIn(3)
	s.relay(func(list []segment) []segment {
		rest := segment{old.from + at + by, old.length - at - by}
		if shift {
			rest.length = old.length - at
		}
		list[i].length = at
		return slices.Insert(list, i+1, rest)
	})
}

// dropJump takes a joint away: the posts run on from the first segment.
func (s *Sketch) dropJump(d Dice) {
	if len(s.segments) == 1 {
		return
	}
	i := d(1, len(s.segments)-1)
	whole := d.oneIn(2)
	s.relay(func(list []segment) []segment {
		if !whole { // up to where the second segment ended
			list[i-1].length = list[i].from + list[i].length - list[i-1].from
		}
		return slices.Delete(list, i, i+1)
	})
}

func (s *Sketch) moveJump(d Dice) {
	if len(s.segments) == 1 {
		return
	}
	i, by := d(1, len(s.segments)-1), d(-4, 4)
	s.relay(func(list []segment) []segment {
		if by%2 == 0 {
			list[i-1].length += by
		} else {
			list[i].from, list[i].length = list[i].from+by, list[i].length-by
		}
		return list
	})
}

// relay alters the track, if the alteration is possible, and carries over what
// lies on it: each cell that goes on to exist keeps its paint, and a new one
// gets that of the cell before it.
func (s *Sketch) relay(alter func([]segment) []segment) {
	segments, cells, paint := s.segments, s.cells(), s.paint
	s.segments = alter(slices.Clone(segments))
	if slices.ContainsFunc(s.segments, func(x segment) bool { return x.length <= 0 }) || s.track(1) == nil {
		s.segments = segments
		return
	}
	now := s.cells()
	at := make([]int, len(cells)) // where an old cell went to, or -1
	for i, c := range cells {
		at[i] = slices.Index(now, c)
	}
	for direction := range paint {
		fresh := make([]int, len(now))
		last := paint[direction][0]
		for k, c := range now {
			if i := slices.Index(cells, c); i >= 0 {
				last = paint[direction][i]
			}
			fresh[k] = last
		}
		s.paint[direction] = fresh
	}
	var spans []span
	for _, p := range s.spans {
		from, to := len(now), 0
		for _, k := range at[p.from:p.to] {
			if k >= 0 {
				from, to = min(from, k), max(to, k+1)
			}
		}
		if p.from, p.to = from, to; from < to {
			spans = append(spans, p)
		}
	}
	s.spans = spans
}
