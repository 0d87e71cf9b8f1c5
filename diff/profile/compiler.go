package profile

import (
	"cmp"
	"math/bits"
	"slices"

	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Filter tells whether a temporary restriction counts. A nil Filter counts all
// of them, whatever their validity.
type Filter func(*schema.TemporaryRow) bool

// The filters that comparisons use.
var (
	All         Filter
	NoTemporary Filter = func(*schema.TemporaryRow) bool { return false }
)

// Compiler compiles profiles on one route in one direction of travel. It does
// not change after New and is safe for concurrent use.
type Compiler struct {
	route     *schema.Route
	direction codes.Direction
	rows      []restriction   // by where they begin
	latest    []unit.Distance // the greatest end so far, of each row and those before it
	// The ends of the rows in the order in which the sweep meets them. Train
	// length delay moves those of the second list, all by the length of the
	// train, so that each list has one order for all trains and no train needs
	// a sort.
	fixed, moved []rowEnd
}

// rowEnd is a place at which a row begins or ceases to hold.
type rowEnd struct {
	at   unit.Distance // without train length delay
	row  int32
	ends bool
}

// New prepares a route and a direction of travel for compiling.
func New(route *schema.Route, direction codes.Direction, filter Filter) *Compiler {
	c := &Compiler{route: route, direction: direction}
	add := func(layer Layer, i int, row *schema.Row) {
		if row.Directions.Has(direction) {
			c.rows = append(c.rows, restriction{row.Start, row.End, row.Delay, layer, i, row.Pos})
		}
	}
	for i := range route.Speed {
		add(StaticSpeed, i, &route.Speed[i].Row)
	}
	for i := range route.AxleLoad {
		add(AxleLoad, i, &route.AxleLoad[i].Row)
	}
	for i := range route.Temporary {
		if filter == nil || filter(&route.Temporary[i]) {
			add(Temporary, i, &route.Temporary[i].Row)
		}
	}
	// Sources are listed in the order of the track.
	slices.SortStableFunc(c.rows, func(a, b restriction) int {
		return cmp.Or(comparePlace(&a, &b), cmp.Compare(a.pos.Line, b.pos.Line))
	})
	c.prepare()
	return c
}

// prepare fills in what the rows, which are in their order, are found by.
func (c *Compiler) prepare() {
	for i, r := range c.rows {
		start, end := rowEnd{r.start, int32(i), false}, rowEnd{r.end, int32(i), true}
		switch {
		case !r.delay:
			c.fixed = append(c.fixed, start, end)
		case c.direction == codes.Reverse:
			c.fixed, c.moved = append(c.fixed, end), append(c.moved, start)
		default:
			c.fixed, c.moved = append(c.fixed, start), append(c.moved, end)
		}
	}
	for _, list := range [...][]rowEnd{c.fixed, c.moved} {
		slices.SortFunc(list, func(a, b rowEnd) int { return cmp.Compare(a.at, b.at) })
	}
	c.latest = latestOf(c.rows)
}

func latestOf(rows []restriction) []unit.Distance {
	list := make([]unit.Distance, len(rows))
	for i := range rows {
		list[i] = rows[i].end
		if i > 0 {
			list[i] = max(list[i], list[i-1])
		}
	}
	return list
}

// Delayed tells whether the length of a train matters on this route at all.
func (c *Compiler) Delayed() bool { return len(c.moved) > 0 }

// Selection is the speed that each row of the route gives to a class of
// trains; 0 where a row does not bind it. Trains of equal selection, length and
// maximum speed have the same profile.
type Selection []unit.Speed

// Select picks the speeds of a class of trains.
func (c *Compiler) Select(class Class) Selection {
	sel := make(Selection, len(c.rows))
	for i, r := range c.rows {
		switch r.layer {
		case StaticSpeed:
			sel[i] = StaticSpeedOf(&c.route.Speed[r.row], class)
		case AxleLoad:
			// 3.11.4.3: only the entry for exactly the train's category binds.
			sel[i] = c.route.AxleLoad[r.row].Limit[class.AxleLoad]
		case Temporary:
			// 3.11.5: a temporary restriction binds every train.
			sel[i] = c.route.Temporary[r.row].Speed
		}
	}
	return sel
}

// Compile gives the effective profile of a reference train.
func (c *Compiler) Compile(t schema.Train) step.Func {
	return c.Sweep(c.Select(ClassOf(t)), t.Length, t.Max)
}

// NoMaximum is a maximum speed above every restriction: the profile is then
// the one of the track alone.
const NoMaximum = unit.MaxSpeed

// Sweep gives the effective profile for a selection, a train length and a
// maximum speed: at each point the lowest of all that hold there (SUBSET-026
// 3.13.7), the maximum speed everywhere (3.11.8).
func (c *Compiler) Sweep(sel Selection, length unit.Distance, maximum unit.Speed) step.Func {
	return c.AppendSweep(make(step.Func, 0, len(c.rows)/2+1), sel, length, maximum)
}

// AppendSweep appends the profile to f, which must be empty: memory that is
// used again.
func (c *Compiler) AppendSweep(f step.Func, sel Selection, length unit.Distance, maximum unit.Speed) step.Func {
	var w sweep
	before, after := c.shifts(length)
	fixed, moved, shift := c.fixed, c.moved, after-before
	length = c.route.Track.Length()
	for at := unit.Distance(0); at < length; {
		next := length
		for len(fixed) > 0 && fixed[0].at <= at {
			w.count(sel[fixed[0].row], fixed[0].ends)
			fixed = fixed[1:]
		}
		if len(fixed) > 0 {
			next = min(next, fixed[0].at)
		}
		for len(moved) > 0 && moved[0].at+shift <= at {
			w.count(sel[moved[0].row], moved[0].ends)
			moved = moved[1:]
		}
		if len(moved) > 0 {
			next = min(next, moved[0].at+shift)
		}
		f = f.Append(step.Piece{From: at, To: next, Speed: min(maximum, w.lowest())})
		at = next
	}
	return f
}

// shifts gives how far train length delay moves the beginning and the end of a
// row. With it the restriction holds until the rear has left it, one train
// length further in the direction of travel (SUBSET-026 3.11.3.1.3, 3.11.4.6,
// 3.11.5.3).
func (c *Compiler) shifts(length unit.Distance) (before, after unit.Distance) {
	if c.direction == codes.Reverse {
		return length, 0
	}
	return 0, length
}

// sweep counts the restrictions that hold at a point, by speed. Speeds are
// multiples of 5 km/h up to 600, so that a counter each and a bit each suffice.
type sweep struct {
	counts [unit.MaxSpeed/unit.SpeedStep + 1]int32
	held   [2]uint64 // bit i: counts[i] > 0
}

func (w *sweep) count(v unit.Speed, ends bool) {
	if v == 0 {
		return
	}
	i := v / unit.SpeedStep
	if ends {
		w.counts[i]--
		if w.counts[i] == 0 {
			w.held[i/64] &^= 1 << (i % 64)
		}
		return
	}
	w.counts[i]++
	w.held[i/64] |= 1 << (i % 64)
}

// lowest gives the lowest speed that holds. There is always one: the rows of
// the static speed profile cover the route (SUBSET-026 3.11.3.2.2).
func (w *sweep) lowest() unit.Speed {
	for k, word := range w.held {
		if word != 0 {
			return unit.Speed(k*64+bits.TrailingZeros64(word)) * unit.SpeedStep
		}
	}
	return NoMaximum
}
