package chainage

import (
	"errors"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/schema/unit"
)

func track(t *testing.T, start, end string, jumps ...string) *Track {
	t.Helper()
	tr, err := NewTrack(km(start), km(end), jumpList(jumps))
	if err != nil {
		t.Fatal(err)
	}
	return tr
}

func km(s string) unit.Distance {
	d, err := unit.ParseKM(s)
	if err != nil {
		panic(err)
	}
	return d
}

// jumpList reads jumps written as "arriving leaving".
func jumpList(jumps []string) []Jump {
	var list []Jump
	for _, j := range jumps {
		arriving, leaving, _ := strings.Cut(j, " ")
		list = append(list, Jump{km(arriving), km(leaving)})
	}
	return list
}

type located struct {
	point string
	want  unit.Distance
	err   error
}

func checkLocate(t *testing.T, tr *Track, tests []located) {
	t.Helper()
	for _, c := range tests {
		p, err := ParsePoint(c.point)
		if err != nil {
			t.Fatal(err)
		}
		if got, err := tr.Locate(p); got != c.want || !errors.Is(err, c.err) || (err == nil) != (c.err == nil) {
			t.Errorf("Locate(%s) = %d, %v, want %d, %v", c.point, got, err, c.want, c.err)
		}
	}
}

// Computed by hand: a joint at running distance 1850 m, 2.800 arriving, 2.850
// leaving. 2.820 does not exist, 2.700 to 2.900 is 150 m of track.
func TestShortStretch(t *testing.T) {
	tr := track(t, "0.95", "4", "2.8 2.85")
	checkLocate(t, tr, []located{
		{"0.95", 0, nil},
		{"2.7", 1750 * unit.Metre, nil},
		{"2.8", 1850 * unit.Metre, nil},
		{"2.800001", 0, ErrMissingPosts},
		{"2.82", 0, ErrMissingPosts},
		{"2.82#1", 0, ErrMissingPosts},
		{"2.849999", 0, ErrMissingPosts},
		{"2.85", 1850 * unit.Metre, nil},
		{"2.85#1", 0, ErrNotRepeated},
		{"2.9", 1900 * unit.Metre, nil},
		{"4", 3000 * unit.Metre, nil},
		{"0.949999", 0, ErrOutside},
		{"4.000001", 0, ErrOutside},
		{"-2", 0, ErrOutside},
	})
	if got := tr.Length(); got != 3000*unit.Metre {
		t.Errorf("length %d", got)
	}
	for _, c := range []struct {
		at           unit.Distance
		begins, ends string
	}{
		{0, "0.950", "0.950"},
		{1850*unit.Metre - 1, "2.799999", "2.799999"},
		{1850 * unit.Metre, "2.850", "2.800"}, // one point, two readings
		{1850*unit.Metre + 1, "2.850001", "2.850001"},
		{3000 * unit.Metre, "4.000", "4.000"},
	} {
		if begins, ends := tr.Begins(c.at).String(), tr.Ends(c.at).String(); begins != c.begins || ends != c.ends {
			t.Errorf("%d begins %s and ends %s, want %s and %s", c.at, begins, ends, c.begins, c.ends)
		}
	}
}

// Where the posts go back far, no reading is outside that lies among those of any two
// parts of the track, also where the first or last of these are on one side of it.
func TestMissingPostsAmongParts(t *testing.T) {
	for name, tr := range map[string]*Track{
		"the last part is below":  track(t, "1", "0.9", "2 3", "4 0.5"),
		"the first part is above": track(t, "4.2", "4", "4.5 1", "2 3"),
	} {
		t.Run(name, func(t *testing.T) {
			checkLocate(t, tr, []located{{"2.5", 0, ErrMissingPosts}, {"0.4", 0, ErrOutside}, {"4.6", 0, ErrOutside}})
		})
	}
}

// Computed by hand: start 1.000; 1000 m on, 2.000 arriving and 1.950 leaving;
// 2000 m on, 2.950 arriving and 3.000 leaving; end 3.500 at 2500 m. 1.970 is at
// 970 m or at 1020 m, 2.975 is nowhere, 1.900 to 3.100 is 1200 m of track.
func TestLongAndShortStretch(t *testing.T) {
	tr := track(t, "1", "3.5", "2 1.95", "2.95 3")
	checkLocate(t, tr, []located{
		{"1", 0, nil},
		{"1.9", 900 * unit.Metre, nil},
		{"1.949999", 949_999, nil},
		{"1.95", 0, ErrAmbiguous}, // both ends of a repeated stretch count as repeated
		{"1.95#1", 950 * unit.Metre, nil},
		{"1.95#2", 1000 * unit.Metre, nil},
		{"1.97", 0, ErrAmbiguous},
		{"1.97#1", 970 * unit.Metre, nil},
		{"1.97#2", 1020 * unit.Metre, nil},
		{"1.97#3", 0, ErrNoOccurrence},
		{"1.97#99", 0, ErrNoOccurrence},
		{"2", 0, ErrAmbiguous},
		{"2#1", 1000 * unit.Metre, nil},
		{"2#2", 1050 * unit.Metre, nil},
		{"2.000001", 1_050_001, nil},
		{"2.000001#1", 0, ErrNotRepeated},
		{"2.95", 2000 * unit.Metre, nil},
		{"2.975", 0, ErrMissingPosts},
		{"3", 2000 * unit.Metre, nil},
		{"3.1", 2100 * unit.Metre, nil},
		{"3.5", 2500 * unit.Metre, nil},
		{"0.999999", 0, ErrOutside},
		{"3.500001#2", 0, ErrOutside},
	})
	for _, c := range []struct {
		at           unit.Distance
		begins, ends string
	}{
		{950 * unit.Metre, "1.950#1", "1.950#1"},
		{970 * unit.Metre, "1.970#1", "1.970#1"},
		{1000 * unit.Metre, "1.950#2", "2.000#1"},
		{1050 * unit.Metre, "2.000#2", "2.000#2"},
		{2000 * unit.Metre, "3.000", "2.950"},
	} {
		if begins, ends := tr.Begins(c.at).String(), tr.Ends(c.at).String(); begins != c.begins || ends != c.ends {
			t.Errorf("%d begins %s and ends %s, want %s and %s", c.at, begins, ends, c.begins, c.ends)
		}
	}
}

// Posts that occur three times, negative chainages and a joint whose reading is
// repeated further on.
func TestThreeOccurrences(t *testing.T) {
	tr := track(t, "-2", "9", "3 2.5", "6 2.75", "4 7")
	checkLocate(t, tr, []located{
		{"-2", 0, nil},
		{"0", 2 * unit.Kilometre, nil},
		{"2.75#1", 4_750_000, nil},
		{"2.75#2", 5_250_000, nil},
		{"2.75#3", 8_500_000, nil},
		{"2.75#4", 0, ErrNoOccurrence},
		{"2.6#2", 5_100_000, nil},
		{"2.6#3", 0, ErrNoOccurrence},
		{"3.5#1", 6_000_000, nil},
		{"3.5#2", 9_250_000, nil},
		{"6", 8_500_000, nil},
		{"6.5", 0, ErrMissingPosts},
		{"7", 9_750_000, nil},
	})
	if got, want := tr.Length(), 11_750_000*unit.Millimetre; got != want {
		t.Errorf("length %d, want %d", got, want)
	}
	for point, want := range map[string]int{"-2.1": 0, "-2": 1, "2.5": 2, "2.75": 3, "3": 3, "3.000001": 2, "4": 2, "4.1": 1, "6.5": 0, "9": 1} {
		if got := tr.Occurrences(km(point)); got != want {
			t.Errorf("%s occurs %d times, want %d", point, got, want)
		}
	}
}

func TestNewTrackRefuses(t *testing.T) {
	tests := []struct {
		name, start, end string
		jumps            []string
		index            int
		want             string
	}{
		{"end before start", "5", "4", nil, -1, "end_km 4.000 does not lie after start_km 5.000"},
		{"no length", "5", "5", nil, -1, "end_km 5.000 does not lie after start_km 5.000"},
		{"equal readings", "0", "9", []string{"1 2", "4 4"}, 1, "arriving_km and leaving_km are equal, a jump needs two different readings"},
		{"jump at the start", "0", "9", []string{"0 1"}, 0, "arriving_km 0.000 does not lie after start_km 0.000, jumps stand in the order of the track"},
		{"jump before the start", "0", "9", []string{"-1 1"}, 0, "arriving_km -1.000 does not lie after start_km 0.000, jumps stand in the order of the track"},
		{"jumps out of order", "0", "9", []string{"6 7", "4 5"}, 1, "arriving_km 4.000 does not lie after leaving_km 7.000 of the jump before it, jumps stand in the order of the track"},
		{"jump at a jump", "0", "9", []string{"4 5", "5 6"}, 1, "arriving_km 5.000 does not lie after leaving_km 5.000 of the jump before it, jumps stand in the order of the track"},
		{"jump to the end", "0", "9", []string{"4 9"}, 0, "leaving_km 9.000 does not lie before end_km 9.000"},
		{"jump beyond the end", "0", "9", []string{"2 3", "4 10"}, 1, "leaving_km 10.000 does not lie before end_km 9.000"},
		{"start again", "0", "9", []string{"4 -1"}, -1, "start_km 0.000 occurs more than once on the route, both ends must be unique"},
		{"start again at a joint", "0", "9", []string{"4 0"}, -1, "start_km 0.000 occurs more than once on the route, both ends must be unique"},
		{"end before it", "0", "9", []string{"10 5"}, -1, "end_km 9.000 occurs more than once on the route, both ends must be unique"},
		{"end at a joint", "0", "9", []string{"9 5"}, -1, "end_km 9.000 occurs more than once on the route, both ends must be unique"},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			tr, err := NewTrack(km(c.start), km(c.end), jumpList(c.jumps))
			var jump *JumpError
			if !errors.As(err, &jump) || tr != nil {
				t.Fatalf("%v, %v", tr, err)
			}
			if jump.Index != c.index || jump.Error() != c.want {
				t.Errorf("jump %d: %s\nwant %d: %s", jump.Index, jump, c.index, c.want)
			}
		})
	}
}

// anyTrack draws a track of up to four jumps, in metres so that readings meet
// often.
func anyTrack(t *rapid.T) *Track {
	metre := func(name string, least, most int64) unit.Distance {
		return unit.Distance(rapid.Int64Range(least, most).Draw(t, name)) * unit.Metre
	}
	start := metre("start", -20, 20)
	at := start
	var jumps []Jump
	for range rapid.IntRange(0, 4).Draw(t, "jumps") {
		j := Jump{Arriving: at + metre("length", 1, 30)}
		if j.Leaving = j.Arriving + metre("jump", -25, 25); j.Leaving == j.Arriving {
			j.Leaving++
		}
		jumps, at = append(jumps, j), j.Leaving
	}
	tr, err := NewTrack(start, at+metre("rest", 1, 30), jumps)
	if err != nil {
		var e *JumpError
		if !errors.As(err, &e) || e.Index != -1 {
			t.Fatalf("%v of jumps in order", err)
		}
		t.Skip("the ends are not unique")
	}
	return tr
}

// Law: Locate(Begins(s)) == Locate(Ends(s)) == s for every s from 0 to Length,
// and the two readings differ at joints only.
func TestLocateUndoesBeginsAndEnds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		tr := anyTrack(t)
		joints := map[unit.Distance]bool{}
		for _, s := range tr.Segments()[1:] {
			joints[s.Start] = true
		}
		for s := unit.Distance(0); s <= tr.Length(); s += 500 {
			for name, p := range map[string]Point{"Begins": tr.Begins(s), "Ends": tr.Ends(s)} {
				if got, err := tr.Locate(p); got != s || err != nil {
					t.Fatalf("Locate(%s(%d)) = Locate(%s) = %d, %v", name, s, p, got, err)
				}
			}
			if differ := tr.Begins(s) != tr.Ends(s); differ != joints[s] {
				t.Fatalf("%d begins %s and ends %s, joint %v", s, tr.Begins(s), tr.Ends(s), joints[s])
			}
		}
	})
}

// Every reading of a chainage that occurs n times is located with #1 to #n,
// further and further along the track, and with no other occurrence.
func TestOccurrencesAscend(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		tr := anyTrack(t)
		for at := -150 * unit.Metre; at <= 250*unit.Metre; at += 500 {
			n, last := tr.Occurrences(at), unit.Distance(-1)
			_, err := tr.Locate(Point{Chainage: at})
			switch {
			case n == 0 && !errors.Is(err, ErrOutside) && !errors.Is(err, ErrMissingPosts), n == 1 && err != nil, n > 1 && !errors.Is(err, ErrAmbiguous):
				t.Fatalf("%s occurs %d times: %v", at.KM(), n, err)
			}
			for i := 1; n > 1 && i <= n; i++ {
				s, err := tr.Locate(Point{at, i})
				if err != nil || s <= last || s > tr.Length() {
					t.Fatalf("%s#%d = %d, %v after %d", at.KM(), i, s, err, last)
				}
				last = s
			}
			if _, err := tr.Locate(Point{at, n + 1}); err == nil {
				t.Fatalf("%s#%d is found, it occurs %d times", at.KM(), n+1, n)
			}
		}
	})
}

// The segments join: each begins where the one before it ends, and the ends of
// the route are theirs.
func TestSegmentsJoin(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		tr := anyTrack(t)
		at := unit.Distance(0)
		for i, s := range tr.Segments() {
			if s.Start != at || s.From >= s.To || s.End() != s.Start+s.To-s.From {
				t.Fatalf("segment %d: %+v at %d", i, s, at)
			}
			at = s.End()
		}
		if at != tr.Length() {
			t.Fatalf("length %d, the segments end at %d", tr.Length(), at)
		}
	})
}

// Find takes what was written for another revision of the track: what both mean by
// a first occurrence, and nothing else.
func TestFind(t *testing.T) {
	tr := track(t, "1", "3.5", "2 1.95", "2.95 3")
	for _, c := range []located{
		{"1.5", 500 * unit.Metre, nil},
		{"1.5#1", 500 * unit.Metre, nil},
		{"1.5#2", 0, ErrNotRepeated},
		{"1.97#1", 970 * unit.Metre, nil},
		{"1.97#2", 1020 * unit.Metre, nil},
		{"1.97#3", 0, ErrNoOccurrence},
		{"1.97", 0, ErrAmbiguous},
		{"2.975#1", 0, ErrMissingPosts},
		{"4#1", 0, ErrOutside},
	} {
		p, err := ParsePoint(c.point)
		if err != nil {
			t.Fatal(err)
		}
		if at, err := tr.Find(p); at != c.want || !errors.Is(err, c.err) {
			t.Errorf("%s is at %d, %v; want %d, %v", c.point, at, err, c.want, c.err)
		}
	}
}

func TestPlain(t *testing.T) {
	for text, want := range map[string]string{"1.5": "1.500", "1.5#1": "1.500", "1.5#2": "1.500#2"} {
		p, err := ParsePoint(text)
		if got := p.Plain().String(); err != nil || got != want {
			t.Errorf("%s gives %s, %v; want %s", text, got, err, want)
		}
	}
}
