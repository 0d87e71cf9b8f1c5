package impact

import (
	"testing"

	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// EN 13803, standard gauge: D_EQ = 11.8 V²/R and I = D_EQ - D. The values are
// recomputed from the formula; 11.8 is 1500 / (9.81 x 3.6²) = 11.798, rounded in
// the standard, and the figure of the German EBO, paragraph 40.
func TestCantDeficiencyEN13803(t *testing.T) {
	for _, test := range []struct {
		v            unit.Speed
		radius, cant int
		want         int64 // hundredths of a millimetre
	}{
		{120, 1000, 100, 69_92},
		{160, 1000, 150, 152_08},
		{100, 500, 150, 86_00},
		{200, 2000, 140, 96_00},
		{140, 700, 160, 170_40},
		{5, 300, 150, -149_02},
	} {
		if got := CantDeficiency(test.v, test.radius, test.cant); got != test.want {
			t.Errorf("V %d R %d D %d: got %d, want %d", test.v, test.radius, test.cant, got, test.want)
		}
	}
}

// The same formula the other way round; the radius of 1000 m with D + I = 303 mm
// allows 160.24 km/h, and 302.08 mm would allow exactly 160, which is why the
// comparison is made in integers.
func TestSpeedForCantDeficiencyEN13803(t *testing.T) {
	for _, test := range []struct {
		radius, cant, limit int
		want                unit.Speed
	}{
		{500, 130, 150, 105},
		{300, 120, 130, 75},
		{700, 160, 150, 135},
		{1000, 153, 150, 160},
		{1000, 152, 150, 155}, // 302 mm: 159.98 km/h
	} {
		if got := SpeedForCantDeficiency(test.radius, test.cant, test.limit); got != test.want {
			t.Errorf("R %d D %d I %d: got %d, want %d", test.radius, test.cant, test.limit, got, test.want)
		}
	}
	// 118 x 160² = 10 x 1180 x (100 + 156): the limit itself is not exceeded.
	if CantDeficiencyAbove(160, 1180, 100, 156) || !CantDeficiencyAbove(160, 1180, 100, 155) {
		t.Error("the limit is not taken exactly")
	}
	// At 40 km/h, R 1000 m: 18.88 mm of 150 are used, 131.12 mm are excess.
	if CantExcessAbove(40, 1000, 150, 132) || !CantExcessAbove(40, 1000, 150, 131) {
		t.Error("the cant excess is not taken exactly")
	}
}

// The highest and the lowest speed may lie anywhere on a stretch; what only touches
// it does not count.
func TestExtremes(t *testing.T) {
	f := profileOf(100, 60, 200, 40, 300, 80)
	for _, test := range []struct {
		from, to        unit.Distance
		highest, lowest unit.Speed
	}{{0, 300, 80, 40}, {0, 100, 60, 60}, {0, 101, 60, 40}, {100, 200, 40, 40}, {150, 250, 80, 40}, {99, 100, 60, 60}, {250, 300, 80, 80}} {
		if highest, lowest := Extremes(f, test.from*unit.Metre, test.to*unit.Metre); highest != test.highest || lowest != test.lowest {
			t.Errorf("%d to %d m: got %d and %d, want %d and %d", test.from, test.to, highest, lowest, test.highest, test.lowest)
		}
	}
}

// Distance = V t / 3.6: 100 km/h x 20 s = 555.56 m, 120 x 27 s = 900 m,
// 140 x 27 s = 1050 m, 160 x 27 s = 1200 m; 140 km/h over 900 m leaves 23.14 s.
func TestApproachTime(t *testing.T) {
	for _, test := range []struct {
		profile []int
		metres  unit.Distance
		want    int64 // tenths of a second
	}{
		{[]int{5000, 120}, 900, 270},
		{[]int{5000, 140}, 1050, 270},
		{[]int{5000, 160}, 1200, 270},
		{[]int{5000, 140}, 900, 231},
		{[]int{5000, 100}, 556, 200},
		{[]int{5000, 100}, 555, 199},
		// 300 m at 60 (18 s) and 600 m at 120 (18 s).
		{[]int{300, 60, 5000, 120}, 900, 360},
	} {
		f := profileOf(test.profile...)
		if got := ApproachTenths(f, 0, test.metres*unit.Metre); got != test.want {
			t.Errorf("%v over %d m: got %d, want %d tenths", test.profile, test.metres, got, test.want)
		}
	}
}

func TestApproach(t *testing.T) {
	at := func(start, end unit.Distance) *schema.PlaceRow {
		p := &schema.PlaceRow{Kind: schema.Crossing, StrikeIn: 900}
		p.Start, p.End, p.Directions = start, end, codes.Both
		return p
	}
	if from, to, ok := Approach(at(1000, 1010), codes.Nominal, 5000); from != 100 || to != 1000 || !ok {
		t.Error(from, to, ok)
	}
	if from, to, ok := Approach(at(1000, 1010), codes.Reverse, 5000); from != 1010 || to != 1910 || !ok {
		t.Error(from, to, ok)
	}
	if _, _, ok := Approach(at(800, 810), codes.Nominal, 5000); ok {
		t.Error("an approach that begins before the route was computed")
	}
	if from, to, ok := Approach(at(900, 910), codes.Nominal, 5000); from != 0 || to != 900 || !ok {
		t.Error("an approach that begins with the route:", from, to, ok)
	}
	if _, _, ok := Approach(at(4200, 4210), codes.Reverse, 5000); ok {
		t.Error("an approach that begins beyond the route was computed")
	}
	if from, to, ok := Approach(at(4090, 4100), codes.Reverse, 5000); from != 4100 || to != 5000 || !ok {
		t.Error("an approach that begins with the end of the route:", from, to, ok)
	}
	without := at(1000, 1010)
	without.StrikeIn = 0
	if _, _, ok := Approach(without, codes.Nominal, 5000); ok {
		t.Error("a crossing without strike-in has no approach time")
	}
	station := at(1000, 1000)
	station.Kind = schema.Station
	if _, _, ok := Approach(station, codes.Nominal, 5000); ok {
		t.Error("a station has no approach time")
	}
}
