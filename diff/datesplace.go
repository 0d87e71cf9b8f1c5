package diff

import (
	"cmp"
	"iter"
	"math"
	"math/bits"
	"slices"
	"time"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// saying is what a restriction says where it holds: two that say the same are alike.
type saying struct {
	speed      unit.Speed
	delay      bool
	begin, end int // from which instant on it is in force, and up to which one, by their order
	id         int // the same for those that say the same
}

// sayings gives what the rows of two sides say, how many different things, and the
// instants that they name, in order.
func sayings(base, target []schema.TemporaryRow) (says [2][]saying, n int, times []time.Time) {
	sides := [2][]schema.TemporaryRow{base, target}
	for _, rows := range sides {
		for i := range rows {
			times = append(times, rows[i].Valid.From, rows[i].Valid.Until)
		}
	}
	slices.SortFunc(times, time.Time.Compare)
	times = slices.CompactFunc(times, time.Time.Equal)
	ids := map[saying]int{}
	for side, rows := range sides {
		for i := range rows {
			v := rows[i].Valid
			x := saying{speed: rows[i].Speed, delay: rows[i].Delay, end: math.MaxInt}
			// No beginning is the zero time, before all others.
			x.begin, _ = slices.BinarySearchFunc(times, v.From, time.Time.Compare)
			if !v.Until.IsZero() {
				x.end, _ = slices.BinarySearchFunc(times, v.Until, time.Time.Compare)
			}
			id, known := ids[x]
			if !known {
				id = len(ids)
				ids[x] = id
			}
			x.id = id
			says[side] = append(says[side], x)
		}
	}
	return says, len(ids), times
}

// term is a temporary restriction on a part of the target's track.
type term struct {
	from, to unit.Distance
	*schema.TemporaryRow
	saying
	own align.Interval // without the length of a train
}

// termsOn lists the restrictions of a side that hold a train of a length on a cell, in
// the order of where they begin.
func termsOn(r *schema.Route, says []saying, d codes.Direction, length, start unit.Distance, cell align.Cell) []term {
	var list []term
	for i := range r.Temporary {
		row := &r.Temporary[i]
		from, to := row.Start, row.End
		switch {
		case row.Delay && d == codes.Reverse:
			from -= length
		case row.Delay:
			to += length
		}
		there := cell.Target - start // from here to the target's track
		from, to = max(from, start)+there, min(to, start+cell.Length)+there
		if row.Directions.Has(d) && from < to {
			list = append(list, term{from, to, row, says[i], align.Interval{From: row.Start + there, To: row.End + there}})
		}
	}
	slices.SortStableFunc(list, func(a, b term) int { return cmp.Compare(a.from, b.from) })
	return list
}

// differing gives where restrictions begin and end on the part of the track that those
// reach over which only one side has; two neighbours of these places stand for the
// stretch between.
func differing(sides [2][]term) []unit.Distance {
	type placed struct {
		align.Interval
		id int
	}
	var has [2]map[placed]bool
	var reach []align.Interval
	var cuts []unit.Distance
	for side, list := range sides {
		has[side] = map[placed]bool{}
		for _, t := range list {
			has[side][placed{align.Interval{From: t.from, To: t.to}, t.id}] = true
			for _, end := range [...]unit.Distance{t.own.From, t.own.To} {
				if t.from < end && end < t.to {
					cuts = append(cuts, end)
				}
			}
		}
	}
	for side := range sides {
		for x := range has[side] {
			cuts = append(cuts, x.From, x.To)
			if !has[1-side][x] {
				reach = append(reach, x.Interval)
			}
		}
	}
	reach = align.Union(reach)
	slices.Sort(cuts)
	return slices.DeleteFunc(slices.Compact(cuts), func(at unit.Distance) bool { return !align.Touches(reach, at-1, at+1) })
}

// place is where one goes along the track, with the restrictions of both sides there.
// From one place to the next few of them differ.
type place struct {
	here, rest [2][]term
	all        [2]speeds // of those that are here, whatever their dates
	says       [2][]int  // how many here say the same, by its id
	events     []event   // of those that are here, in the order of time
	times      []time.Time
}

// event is that a restriction of a side comes into force or is over.
type event struct {
	at, side int
	speed    unit.Speed
	by       int // 1 or -1
}

func newPlace(sides [2][]term, sayings int, times []time.Time) *place {
	return &place{rest: sides, times: times, says: [2][]int{make([]int, sayings), make([]int, sayings)}}
}

// goTo goes on to a place.
func (p *place) goTo(at unit.Distance) {
	for side := range p.here {
		p.here[side] = slices.DeleteFunc(p.here[side], func(t term) bool {
			if t.to <= at {
				p.add(side, &t, -1)
			}
			return t.to <= at
		})
		for rest := p.rest[side]; len(rest) > 0 && rest[0].from <= at; rest = p.rest[side] {
			if rest[0].to > at {
				p.here[side] = append(p.here[side], rest[0])
				p.add(side, &rest[0], 1)
			}
			p.rest[side] = rest[1:]
		}
	}
}

// add takes in a restriction, or leaves one behind.
func (p *place) add(side int, t *term, by int) {
	p.all[side].add(t.speed, by)
	p.says[side][t.id] += by
	for _, e := range [...]event{{t.begin, side, t.speed, 1}, {t.end, side, t.speed, -1}} {
		i, _ := slices.BinarySearchFunc(p.events, e.at, func(x event, at int) int { return cmp.Compare(x.at, at) })
		if by > 0 {
			p.events = slices.Insert(p.events, i, e)
			continue
		}
		for p.events[i] != e {
			i++ // at one instant they have no order
		}
		p.events = slices.Delete(p.events, i, i+1)
	}
}

// only gives the first restriction of a side that the other one does not have here, nil
// for none.
func (p *place) only(side int) *term {
	for i := range p.here[side] {
		if t := &p.here[side][i]; p.says[1-side][t.id] == 0 {
			return t
		}
	}
	return nil
}

// moment is the time from one instant to the next.
type moment struct {
	was, is unit.Speed // the lowest of the restrictions that are in force on both sides
	until   time.Time  // zero: for ever
}

// overTime gives the moments between the instants of the restrictions that are here.
func (p *place) overTime() iter.Seq[moment] {
	return func(yield func(moment) bool) {
		var now [2]speeds
		for i, e := range p.events {
			if e.at == math.MaxInt {
				return // never over
			}
			now[e.side].add(e.speed, e.by)
			m := moment{was: now[0].lowest(), is: now[1].lowest()}
			if i+1 < len(p.events) {
				switch next := p.events[i+1].at; {
				case next == e.at:
					continue
				case next < math.MaxInt:
					m.until = p.times[next]
				}
			}
			if !yield(m) {
				return
			}
		}
	}
}

// speeds counts restrictions by their speeds.
type speeds struct {
	of    [unit.MaxSpeed/unit.SpeedStep + 1]int
	given [2]uint64 // a bit for each speed that there is
}

func (s *speeds) add(v unit.Speed, by int) {
	i := v / unit.SpeedStep
	s.of[i] += by
	if s.of[i] > 0 {
		s.given[i/64] |= 1 << (i % 64)
	} else {
		s.given[i/64] &^= 1 << (i % 64)
	}
}

// lowest is above every speed where there is none.
func (s *speeds) lowest() unit.Speed {
	for k, word := range s.given {
		if word != 0 {
			return unit.Speed(64*k+bits.TrailingZeros64(word)) * unit.SpeedStep
		}
	}
	return unit.MaxSpeed + unit.SpeedStep
}
