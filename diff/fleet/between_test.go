package fleet

import (
	"maps"
	"slices"
	"testing"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/schema/unit"
)

// tenths gives a distance from tenths of a metre.
func tenths(n int) unit.Distance { return unit.Distance(n) * unit.Metre / 10 }

// Worked by hand, in tenths of a metre: at 100 m both sides give 100 km/h to a front;
// behind it, trains longer than `above` see 60 km/h on one side, and those longer than
// `upTo` on the other side, too.
func TestLengthsBetween(t *testing.T) {
	const at = 1000
	for name, c := range map[string]struct {
		above, upTo, track int
		lengths            []int
		want               [][2]int // metres
	}{
		"whole metres":                         {40, 100, 10, []int{10, 400}, [][2]int{{5, 10}}},
		"parts of metres":                      {35, 104, 10, []int{10, 400}, [][2]int{{4, 10}}},
		"the shortest that was asked for sees": {35, 100, 10, []int{60, 400}, nil},
		"shorter than all is not asked for":    {35, 100, 10, []int{120, 400}, nil},
		"longer than all is not asked for":     {35, 500, 10, []int{10, 30}, nil},
		"a length that was asked for sees it":  {35, 100, 10, []int{10, 50, 400}, nil},
		"one that sees it further on":          {35, 100, 10, []int{10, 105, 400}, nil},
		"one that does not reach it":           {35, 100, 10, []int{10, 110, 400}, [][2]int{{4, 10}}},
		"one that is just too short":           {35, 100, 10, []int{10, 35, 400}, [][2]int{{4, 10}}},
		"less than a metre, seen further on":   {32, 38, 10, []int{10, 400}, [][2]int{{4, 4}}},
		"less than a metre, seen by nobody":    {32, 38, 2, []int{10, 400}, nil},
		"less than a metre, longer than asked": {32, 38, 10, []int{10, 39}, nil},
	} {
		t.Run(name, func(t *testing.T) {
			p := &pair{}
			for _, l := range c.lengths {
				p.lengths = append(p.lengths, tenths(l))
			}
			one := []profile.Bound{{End: tenths(at - c.above), Speed: 60, Delay: true}}
			other := []profile.Bound{{End: tenths(at - c.upTo), Speed: 60, Delay: true}}
			for _, sides := range [][2][]profile.Bound{{one, other}, {other, one}} {
				var got [][2]int
				for _, s := range p.lengthsBetween(100, 100, sides[0], sides[1], tenths(at), tenths(at+c.track)) {
					got = append(got, [2]int{int(s.least / unit.Metre), int(s.most / unit.Metre)})
				}
				if !slices.Equal(got, c.want) {
					t.Errorf("%v, want %v", got, c.want)
				}
			}
		})
	}
}

// The fewest lengths show all sights; past the limit those stay that show most, and the
// account says what they leave out.
func TestChooseLengths(t *testing.T) {
	at := func(from, to unit.Distance) align.Interval { return align.Interval{From: from, To: to} }
	chosen, out := chooseLengths([]sight{{least: 6, most: 9, at: at(20, 30)}, {least: 3, most: 5, at: at(0, 10)}, {least: 5, most: 8, kind: 1, at: at(5, 15)}, {least: 1, most: 5, at: at(10, 12)}})
	want := map[unit.Distance]map[int][]align.Interval{5: {0: {at(0, 12)}, 1: {at(5, 15)}}, 9: {0: {at(20, 30)}}}
	if !maps.EqualFunc(chosen, want, func(a, b map[int][]align.Interval) bool { return maps.EqualFunc(a, b, slices.Equal) }) || out.Lengths != nil {
		t.Errorf("%v, %+v", chosen, out)
	}

	// Ten lengths of which the third and the seventh show one sight and the others two.
	var sights []sight
	for n := unit.Distance(1); n <= 10; n++ {
		for k := unit.Distance(0); k < 2 && (k == 0 || n != 3 && n != 7); k++ {
			sights = append(sights, sight{least: n, most: n, at: at(100*n+10*k, 100*n+10*k+5)})
		}
	}
	chosen, out = chooseLengths(sights)
	if got := slices.Sorted(maps.Keys(chosen)); !slices.Equal(got, []unit.Distance{1, 2, 4, 5, 6, 8, 9, 10}) {
		t.Errorf("the lengths %v are kept", got)
	}
	if !out.Same(LeftOut{[]unit.Distance{3, 7}, 300, 705}) {
		t.Errorf("%+v is left out", out)
	}
}

func TestSameLeftOut(t *testing.T) {
	all := LeftOut{[]unit.Distance{3, 7}, 300, 705}
	for _, other := range []LeftOut{{[]unit.Distance{3, 7}, 301, 705}, {[]unit.Distance{3, 7}, 300, 704}, {[]unit.Distance{3}, 300, 705}} {
		if all.Same(other) || !all.Same(all) {
			t.Errorf("%+v is %+v", other, all)
		}
	}
}
