package impact

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// 2 km at 100 km/h from rest to rest with 0.5 m/s²: 771.6 m up and as many down. Up
// to s metres the train takes the root of 2 s / 0.5, at full speed 55.556 s and what
// it holds at 27.778 m/s, and before the end as long as behind the start; after
// 127.556 s it stands.
func TestAtByHand(t *testing.T) {
	half := Motion{Acceleration: 500, Braking: 500}
	for _, test := range []struct {
		metres unit.Distance
		want   float64
	}{
		{0, 0}, {100, 20}, {400, 40}, {1000, 55.556 + 228.395/27.778}, {1600, 127.556 - 40}, {1900, 127.556 - 20}, {2000, 127.556},
	} {
		if got := newRun(profileOf(2000, 100), half).At(test.metres * unit.Metre); math.Abs(got-test.want) > 0.002 {
			t.Errorf("at %d m: %.3f s, want %.3f", test.metres, got, test.want)
		}
	}
	// In a run at speed, of two pieces: 36 s at 100 km/h, less the braking to 60
	// km/h; the middle of the second piece is 30 s behind its beginning.
	half.Rolling = true
	r := newRun(profileOf(1000, 100, 2000, 60), half)
	// Braking takes 22.222 s over 493.827 m: 506.173 m are run at full speed.
	if got, want := r.At(1000*unit.Metre), 506.173/27.778+22.222; math.Abs(got-want) > 0.002 {
		t.Errorf("at the lower speed after %.3f s, want %.3f", got, want)
	}
	if got, want := r.At(1500*unit.Metre)-r.At(1000*unit.Metre), 30.0; math.Abs(got-want) > 1e-6 {
		t.Errorf("half of the second piece takes %.3f s, want %.3f", got, want)
	}
}

// The time at any place against a numerical integration, where the train
// accelerates, holds its speed and brakes.
func TestAtAgainstIntegration(t *testing.T) {
	names := [...]string{"accelerates", "holds", "brakes"}
	var found [len(names)]int
	rapid.Check(t, func(t *rapid.T) {
		f, m := drawProfile(t)
		r := newRun(f, m)
		for range 2 {
			i := rapid.IntRange(0, len(f)-1).Draw(t, "piece")
			p := r.piece(i)
			_, peak := p.time()
			up, down := p.distances(peak)
			limits := [...]float64{0, up, p.length - down, p.length}
			for k, name := range names {
				if limits[k+1]-limits[k] < 1000 {
					continue
				}
				s := f[i].From + unit.Distance(limits[k]+(limits[k+1]-limits[k])*rapid.Float64Range(0.05, 0.95).Draw(t, name))
				want := integrated(f, m, s)
				if got := r.At(s); math.Abs(got-want) > 0.02 {
					t.Fatalf("where it %s, at %s m: %.3f s, integration gives %.3f s for %v %+v", name, s.M(), got, want, f, m)
				}
				found[k]++
			}
		}
	})
	for k, name := range names {
		if !testing.Short() && found[k] < 15 {
			t.Errorf("only %d places where it %s", found[k], name)
		}
	}
}

// A profile turned round begins where it ended, and turned again is as it was.
func TestMirror(t *testing.T) {
	f := profileOf(1000, 100, 3000, 60, 6000, 120)
	got := slices.Clone(f)
	Mirror(got)
	if want := profileOf(3000, 120, 5000, 60, 6000, 100); !slices.Equal(got, want) {
		t.Errorf("got %v, want %v", got, want)
	}
	Mirror(got)
	if !slices.Equal(got, f) {
		t.Errorf("turned twice it is %v", got)
	}
	Mirror(step.Func{})
}

// From rest to rest with 0.5 m/s² the train reaches the root of 500 times the length,
// in mm/s and mm: 23 km/h, which are 6388.889 mm/s, take 81 635.8 mm.
func TestPeakByHand(t *testing.T) {
	half := Motion{Acceleration: 500, Braking: 500}
	for _, test := range []struct {
		length unit.Distance
		limit  unit.Speed
		want   unit.Speed
	}{
		{81_635, 40, 22}, {81_636, 40, 23}, {1_250_000, 90, 90}, {1_249_999, 90, 89}, {1_250_000, 85, 85},
	} {
		f := step.Func{{From: 0, To: test.length, Speed: test.limit}}
		if got := newRun(f, half).Peak(0); got != test.want {
			t.Errorf("%d mm at up to %d km/h: %d km/h reached, want %d", test.length, test.limit, got, test.want)
		}
	}
}
