package impact

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"pgregory.net/rapid"

	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// newRun computes a run in new memory.
func newRun(f step.Func, m Motion) *Run {
	r := &Run{}
	r.Compute(f, m, nil)
	return r
}

func profileOf(pieces ...int) step.Func {
	var f step.Func
	at := unit.Distance(0)
	for i := 0; i < len(pieces); i += 2 {
		to := unit.Distance(pieces[i]) * unit.Metre
		f = f.Append(step.Piece{From: at, To: to, Speed: unit.Speed(pieces[i+1])})
		at = to
	}
	return f
}

// Elementary kinematics, v/a and v²/2a, worked by hand; times in tenths of a
// second.
func TestRunningTimeByHand(t *testing.T) {
	half := Motion{Acceleration: 500, Braking: 500}
	rolling := half
	rolling.Rolling = true
	tests := []struct {
		name    string
		profile step.Func
		motion  Motion
		want    int64
	}{
		// L/V + V/2 (1/a + 1/b) = 72 s + 2 x 27.777.../2 x 2 = 127.56 s
		{"stop to stop, 2 km at 100", profileOf(2000, 100), half, 1276},
		{"rolling, 2 km at 100: L/V", profileOf(2000, 100), rolling, 720},
		// Own profile, worked by hand: 104.222 + 60.000 + 131.667 s.
		{"three steps, no length", profileOf(2000, 100, 3000, 60, 6000, 120), half, 2959},
		// The same with a 200 m train: 104.222 + 72.000 + 125.667 s.
		{"three steps, 200 m held", profileOf(2000, 100, 3200, 60, 6000, 120), half, 3019},
		// No cruise: V = sqrt(2L/(1/a+1/b)) = 22.36 m/s, t = 2V/a = 89.44 s.
		{"too short to reach the speed", profileOf(1000, 160), half, 894},
		// A raise of 100 m in a run at 60: up to sqrt(v² + a L) = 18.105 m/s and
		// down again, 2 x 2.876 s, after and before 1 km at 60.
		{"speed that is out of reach", profileOf(1000, 60, 1100, 200, 2100, 60), rolling, 1258},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := newRun(test.profile, test.motion).Tenths(); got != test.want {
				t.Errorf("got %d tenths, want %d", got, test.want)
			}
		})
	}
}

// A time that is exactly in the middle between two tenths is rounded up, on whichever
// side of it the float lies.
func TestRunningTimeInTheMiddle(t *testing.T) {
	m := Motion{Acceleration: 500, Braking: 500, Rolling: true}
	below := 0
	for v := unit.Speed(5); v <= unit.MaxSpeed; v += 5 {
		for k := int64(0); k < 40; k++ {
			// A length of x mm takes 9 x / 250 v tenths: k and a half for 250 v (2 k + 1) / 18.
			length := int64(v) * 250 * (2*k + 1)
			if length%18 != 0 {
				continue
			}
			r := newRun(step.Func{{From: 0, To: unit.Distance(length / 18), Speed: v}}, m)
			if r.reached[1]*10 < float64(k)+0.5 {
				below++
			}
			if got := r.Tenths(); got != k+1 {
				t.Errorf("%d mm at %d km/h: %d tenths, want %d", length/18, v, got, k+1)
			}
		}
	}
	if below == 0 {
		t.Error("no float lies below the middle")
	}
}

// A published examination figure: 2 km, 60 km/h, 140 s with a = b gives
// 0.8333 m/s² (5/6); taken over from the collection of figures this program was
// designed with, whose source is not named.
func TestRunningTimeExaminationFigure(t *testing.T) {
	if got := newRun(profileOf(2000, 60), Motion{Acceleration: 833, Braking: 834}).Tenths(); got != 1400 {
		t.Errorf("got %d tenths, want 1400", got)
	}
}

// drawProfile draws a profile and a motion.
func drawProfile(t *rapid.T) (step.Func, Motion) {
	var f step.Func
	at := unit.Distance(0)
	for range rapid.IntRange(1, 8).Draw(t, "pieces") {
		to := at + unit.Distance(rapid.IntRange(1, 4_000_000).Draw(t, "length"))
		f = f.Append(step.Piece{From: at, To: to, Speed: unit.Speed(5 * rapid.IntRange(1, 60).Draw(t, "speed"))})
		at = to
	}
	return f, Motion{
		Acceleration: rapid.IntRange(50, 1500).Draw(t, "a"), Braking: rapid.IntRange(50, 1500).Draw(t, "b"),
		Rolling: rapid.Bool().Draw(t, "rolling"),
	}
}

// integrated gives the time to a running distance by a numerical integration of
// dt = ds/v(s) by a general-purpose library (gonum, Gauss-Legendre). v(s) is made
// anew here: at each point the lowest of what every piece, ahead and behind, allows.
func integrated(f step.Func, m Motion, until unit.Distance) (seconds float64) {
	length := float64(f[len(f)-1].To)
	v := func(s float64) float64 {
		square := math.Inf(1)
		for _, p := range f {
			top := mmps(p.Speed) * mmps(p.Speed)
			ahead := max(0, float64(p.From)-s) // braking towards the piece
			behind := max(0, s-float64(p.To))  // accelerating since it
			square = min(square, top+2*float64(m.Braking)*ahead+2*float64(m.Acceleration)*behind)
		}
		if !m.Rolling {
			square = min(square, 2*float64(m.Acceleration)*s, 2*float64(m.Braking)*(length-s))
		}
		return math.Sqrt(square)
	}
	// With s = x² in the first half and length - s = x² in the second, the
	// integrand stays finite where the train is at rest. The many parts keep
	// the harm of its kinks small.
	integrate := func(from, to float64, f func(x float64) float64) (sum float64) {
		const parts = 400
		from, to = math.Sqrt(from), math.Sqrt(to)
		for i := range parts {
			a, b := from+(to-from)*float64(i)/parts, from+(to-from)*float64(i+1)/parts
			sum += quad.Fixed(f, a, b, 8, quad.Legendre{}, 0)
		}
		return sum
	}
	for _, p := range f {
		from, to := float64(p.From), float64(min(p.To, until))
		if from >= to {
			break
		}
		if from < length/2 {
			seconds += integrate(from, min(to, length/2), func(x float64) float64 { return 2 * x / v(x*x) })
		}
		if to > length/2 {
			seconds += integrate(length-to, length-max(from, length/2), func(x float64) float64 { return 2 * x / v(length-x*x) })
		}
	}
	return seconds
}

// The closed form against a numerical integration.
func TestRunningTimeAgainstIntegration(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, m := drawProfile(t)
		seconds := integrated(f, m, f[len(f)-1].To)
		r := newRun(f, m)
		if got := float64(r.Tenths()) / 10; math.Abs(got-seconds) > 0.1 {
			t.Fatalf("got %.1f s, integration gives %.3f s for %v %+v", got, seconds, f, m)
		}
	})
}

// The long computation and the quick one agree, and At runs from 0 to the whole
// time without going back.
func TestRunProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f, m := drawProfile(t)
		r := newRun(f, m)
		if quick, exact := r.Tenths(), r.exactTenths(); quick != exact {
			t.Fatalf("quick %d, exact %d tenths", quick, exact)
		}
		last := 0.0
		end := f[len(f)-1].To
		for i := range unit.Distance(101) {
			at := r.At(end * i / 100)
			if at < last-1e-9 {
				t.Fatalf("time goes back at %d %%: %v after %v", i, at, last)
			}
			last = at
		}
		if total := r.reached[len(f)]; math.Abs(last-total) > 1e-6 {
			t.Fatalf("ends at %v s, not %v s", last, total)
		}
	})
}
