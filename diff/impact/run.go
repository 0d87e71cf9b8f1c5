// Package impact gives the figures that go with a change of speeds: running
// times, approach times at level crossings, cant deficiency on curves.
//
// They are aids for the reader of a change, never limits: the infrastructure
// manager's rules decide. Every figure is held as a whole number (tenths of a
// second, hundredths of a millimetre) that is rounded once, where it is made.
package impact

import (
	"math"
	"slices"

	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// Motion is how a train moves: constant acceleration and braking, in
// thousandths of m/s² (that is mm/s²), both above 0.
type Motion struct {
	Acceleration, Braking int
	// Rolling: the run begins and ends at the speed of the profile, else at
	// rest.
	Rolling bool
}

// Given tells whether the train's data allow a running time.
func (m Motion) Given() bool { return m.Acceleration > 0 && m.Braking > 0 }

// Run is the fastest run along a profile: the train accelerates when its
// profile rises, and brakes to be at the lower speed where its front meets it.
// With constant rates v²/2 is a straight line over distance, so that each piece
// of the profile has a closed form: accelerate, hold, brake.
type Run struct {
	profile step.Func
	motion  Motion
	// edges[i] is the speed in mm/s at the beginning of piece i, and the last
	// one that at the end of the profile.
	edges []float64
	// reached[i] is the time in seconds at the beginning of piece i, and
	// times[i] that over it.
	reached, times []float64
}

// mmps gives a speed in mm/s: 1 km/h = 2500/9 mm/s.
func mmps(v unit.Speed) float64 { return inMMPS[v] }

var inMMPS = func() (table [unit.MaxSpeed + 1]float64) {
	for v := range table {
		table[v] = float64(v) * 2500 / 9
	}
	return table
}()

// Products that are added stand in float64(...): Go then rounds each on its own
// and fuses none, so that every processor computes the same.

// Compute makes r the run along a profile in the order of travel (for the reverse
// direction, Mirror it) and uses its memory again. like, if given, is a run by the
// same motion whose times are taken over for the pieces at the beginning and at the
// end that are run in the same way. r holds on to f.
func (r *Run) Compute(f step.Func, m Motion, like *Run) {
	n := len(f)
	r.profile, r.motion = f, m
	r.edges, r.reached, r.times = again(r.edges, n+1), again(r.reached, n+1), again(r.times, n)
	a, b := float64(m.Acceleration), float64(m.Braking)
	r.edges[0], r.edges[n], r.reached[0] = 0, 0, 0
	if m.Rolling {
		r.edges[0], r.edges[n] = mmps(f[0].Speed), mmps(f[n-1].Speed)
	}
	for i := 1; i < n; i++ {
		r.edges[i] = mmps(min(f[i-1].Speed, f[i].Speed))
	}
	for i, p := range f {
		r.edges[i+1] = lesser(r.edges[i+1], squareAfter(r.edges[i], a, float64(p.To-p.From)))
	}
	for i := n - 1; i >= 0; i-- {
		r.edges[i] = lesser(r.edges[i], squareAfter(r.edges[i+1], b, float64(f[i].To-f[i].From)))
	}
	from, to := r.takeOver(like)
	for i := from; i < to; i++ {
		r.times[i], _ = r.piece(i).time()
	}
	for i, t := range r.times {
		r.reached[i+1] = r.reached[i] + t
	}
}

// takeOver takes times from another run and gives the pieces that are left.
func (r *Run) takeOver(like *Run) (from, to int) {
	to = len(r.profile)
	if like == nil || like.motion != r.motion {
		return from, to
	}
	same := func(i, k int) bool {
		return r.profile[i] == like.profile[k] && r.edges[i] == like.edges[k] && r.edges[i+1] == like.edges[k+1]
	}
	for from < min(to, len(like.profile)) && same(from, from) {
		r.times[from] = like.times[from]
		from++
	}
	for k := len(like.profile); to > from && k > 0 && same(to-1, k-1); k-- {
		to--
		r.times[to] = like.times[k-1]
	}
	return from, to
}

// again gives a list of n numbers in memory that may be used again.
func again(list []float64, n int) []float64 { return slices.Grow(list[:0], n)[:n] }

// after is the speed that a train of speed v reaches with a constant rate over
// a distance.
func after(v, rate, distance float64) float64 { return math.Sqrt(squareAfter(v, rate, distance)) }

func squareAfter(v, rate, distance float64) float64 {
	return float64(v*v) + float64(2*rate*distance)
}

// lesser is min(limit, math.Sqrt(square)), and spares most of the roots: the root
// of a number's rounded square is that number, and roots keep the order. (That
// holds for all but numbers next to nothing, which no speed of a run is.)
func lesser(limit, square float64) float64 {
	if square >= float64(limit*limit) {
		return limit
	}
	return math.Sqrt(square)
}

// phase is the run over one piece: from speed in to speed out, never above top,
// over a length; in mm/s and mm.
type phase struct{ in, out, top, a, b, length float64 }

func (r *Run) piece(i int) phase {
	p := r.profile[i]
	return phase{r.edges[i], r.edges[i+1], mmps(p.Speed), float64(r.motion.Acceleration), float64(r.motion.Braking), float64(p.To - p.From)}
}

// peak is the highest speed in the piece.
func (p phase) peak() float64 {
	square := (float64(2*p.a*p.b*p.length) + float64(p.b*p.in*p.in) + float64(p.a*p.out*p.out)) / (p.a + p.b)
	return lesser(p.top, square)
}

// time gives the time over the piece and the highest speed in it.
func (p phase) time() (seconds, peak float64) {
	peak = max(p.peak(), p.in, p.out)
	up, down := p.distances(peak)
	hold := max(0, p.length-up-down)
	return (peak-p.in)/p.a + (peak-p.out)/p.b + hold/peak, peak
}

// distances gives the lengths on which the train accelerates and brakes.
func (p phase) distances(peak float64) (up, down float64) {
	return (float64(peak*peak) - float64(p.in*p.in)) / (2 * p.a), (float64(peak*peak) - float64(p.out*p.out)) / (2 * p.b)
}

// At gives the time in seconds at which the front reaches a running distance
// of the profile.
func (r *Run) At(s unit.Distance) float64 {
	c := r.profile.CursorAt(s)
	i := c.Index()
	p := r.piece(i)
	_, peak := p.time()
	up, down := p.distances(peak)
	x := min(max(0, float64(s-r.profile[i].From)), p.length)
	t := r.reached[i]
	switch {
	case x <= up:
		return t + (after(p.in, p.a, x)-p.in)/p.a
	case x <= p.length-down:
		return t + (peak-p.in)/p.a + (x-up)/peak
	}
	return r.reached[i+1] - (after(p.out, p.b, p.length-x)-p.out)/p.b
}

// Tenths gives the running time in tenths of a second, correctly rounded.
func (r *Run) Tenths() int64 {
	t := r.reached[len(r.profile)] * 10
	n := math.Floor(t + 0.5)
	// The float's error is far below this; where it could decide the rounding,
	// the same sum is made with more digits.
	const doubt = 1e-4
	if math.Abs(t+0.5-n) > doubt && math.Abs(t+0.5-n-1) > doubt {
		return int64(n)
	}
	return r.exactTenths()
}

// Peak gives the highest speed, in whole km/h rounded down, that the train reaches
// in the piece of the profile at s.
func (r *Run) Peak(s unit.Distance) unit.Speed {
	c := r.profile.CursorAt(s)
	_, peak := r.piece(c.Index()).time()
	// Rounded once: 23 km/h are no whole number of mm/s.
	return unit.Speed((peak + 1e-6) * 9 / 2500)
}

// Needed gives the length that the piece of the profile at s would need for its
// full speed to be reached at all: from the speed with which the train can come
// into it to the one with which it has to leave it. It looks at the whole profile.
func (r *Run) Needed(s unit.Distance) unit.Distance {
	c := r.profile.CursorAt(s)
	p := r.piece(c.Index())
	// A longer piece does not slow the train on the way in for the braking behind
	// it, nor on the way out for want of speed.
	p.in, p.out = r.arriving(c.Index()), r.leaving(c.Index())
	up, down := p.distances(max(p.top, p.in, p.out))
	return unit.Distance(math.Ceil(up + down - 1e-6))
}

// limit is the highest speed at the beginning of piece i, or at the end of the
// profile.
func (r *Run) limit(i int) float64 {
	switch n := len(r.profile); {
	case i > 0 && i < n:
		return mmps(min(r.profile[i-1].Speed, r.profile[i].Speed))
	case !r.motion.Rolling:
		return 0
	case i == 0:
		return mmps(r.profile[0].Speed)
	default:
		return mmps(r.profile[n-1].Speed)
	}
}

// arriving is the speed with which the train can come into piece i, by what lies
// before it.
func (r *Run) arriving(i int) float64 {
	v := r.limit(0)
	for k := range i {
		v = lesser(r.limit(k+1), squareAfter(v, float64(r.motion.Acceleration), float64(r.profile[k].To-r.profile[k].From)))
	}
	return v
}

// leaving is the speed with which the train has to leave piece i, by what lies
// behind it.
func (r *Run) leaving(i int) float64 {
	v := r.limit(len(r.profile))
	for k := len(r.profile) - 1; k > i; k-- {
		v = lesser(r.limit(k), squareAfter(v, float64(r.motion.Braking), float64(r.profile[k].To-r.profile[k].From)))
	}
	return v
}

// Mirror turns a profile round in place, for a run against the running distance.
// The piece that ends at the length of the track then begins at 0.
func Mirror(f step.Func) {
	if len(f) == 0 {
		return
	}
	length := f[len(f)-1].To
	slices.Reverse(f)
	for i, p := range f {
		f[i].From, f[i].To = length-p.To, length-p.From
	}
}
