package diff

import (
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

const year = 2026

func monthOf(m int) time.Time {
	if m == 0 {
		return time.Time{}
	}
	return time.Date(year, time.Month(m), 1, 0, 0, 0, 0, time.UTC)
}

// drawTerms draws restrictions on a track of ten metres, by months.
func drawTerms(t *rapid.T, name string) []schema.TemporaryRow {
	return rapid.SliceOfN(rapid.Custom(func(t *rapid.T) schema.TemporaryRow {
		from := rapid.IntRange(0, 8).Draw(t, "from")
		x := schema.TemporaryRow{Speed: unit.Speed(5 * rapid.IntRange(1, 3).Draw(t, "speed"))}
		x.Start, x.End = unit.Distance(from), unit.Distance(rapid.IntRange(from+1, 10).Draw(t, "to"))
		x.Directions = codes.Directions(rapid.IntRange(1, 3).Draw(t, "directions"))
		x.Delay = rapid.Bool().Draw(t, "delay")
		begin := rapid.IntRange(0, 3).Draw(t, "begin")
		x.Valid.From = monthOf(begin)
		if end := rapid.IntRange(begin, 4).Draw(t, "end"); end > begin {
			x.Valid.Until = monthOf(end)
		}
		return x
	}), 0, 4).Draw(t, name)
}

// Metre by metre and month by month: a stretch is named where, and only where, at some
// time speeds move in another sense than the comparison of all restrictions says, or
// up to more. The target's track begins some metres before or behind the base's.
func TestDatedPointByPoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		shift := unit.Distance(rapid.IntRange(-3, 3).Draw(t, "shift")) // of running distance, base to target
		tracks := [2]*chainage.Track{}
		for i, from := range []unit.Distance{0, -shift} {
			var err error
			if tracks[i], err = chainage.NewTrack(from, from+10, nil); err != nil {
				t.Fatal(err)
			}
		}
		trains := []Train{{Train: schema.Train{Length: 2}}, {Train: schema.Train{Length: 5}}}
		r := &Route{
			Base:   &schema.Route{Directions: codes.Both, Track: tracks[0], Temporary: drawTerms(t, "base")},
			Target: &schema.Route{Directions: codes.Both, Track: tracks[1], Temporary: drawTerms(t, "target")},
		}
		at := func(route *schema.Route, d codes.Direction, place, length unit.Distance, month int) unit.Speed {
			v := unit.Speed(1000)
			for _, x := range route.Temporary {
				holds := month < 0 || x.Valid.From.IsZero() || int(x.Valid.From.Month()) <= month
				holds = holds && (month < 0 || x.Valid.Until.IsZero() || month < int(x.Valid.Until.Month()))
				from, to := x.Start, x.End
				switch {
				case !x.Delay:
				case d == codes.Nominal:
					to += length
				default:
					from -= length
				}
				if holds && x.Directions.Has(d) && from <= place && place < to {
					v = min(v, x.Speed)
				}
			}
			return v
		}
		for _, d := range codes.AllDirections {
			list := r.datedAnywhere(d, align.Tracks(tracks[0], tracks[1]).Common, trains)
			ends := map[int]time.Time{} // by the index of a stretch: when the last of it is over
			for place := max(0, shift); place < min(10, 10+shift); place++ {
				var faster, slower bool
				last := -1
				for _, length := range []unit.Distance{0, 2, 5} {
					before, after := at(r.Base, d, place-shift, length, -1), at(r.Target, d, place, length, -1)
					for month := range 6 {
						was, is := at(r.Base, d, place-shift, length, month), at(r.Target, d, place, length, month)
						up, down := is > was && (after <= before || is > after), is < was && after >= before
						faster, slower = faster || up, slower || down
						if up || down {
							last = max(last, month)
						}
					}
				}
				i := slices.IndexFunc(list, func(x Dated) bool { return x.From <= place && place < x.To })
				if got := i >= 0; got != (faster || slower) {
					t.Fatalf("%s at %d: named %v, faster %v, slower %v: %+v", d, place, got, faster, slower, list)
				}
				if i < 0 {
					continue
				}
				over := time.Time{} // after the last of the months all is as it will be
				if last < 5 {
					over = monthOf(last + 1)
				}
				if end, known := ends[i]; known {
					over = later(over, end)
				}
				ends[i] = over
				x, from, reach := list[i], place, unit.Distance(0)
				if x.OfBase {
					from -= shift
				}
				if x.behind {
					reach = 5 // the longest train
				}
				if x.Faster != faster || x.Slower != slower || x.Row == nil || !x.Row.Directions.Has(d) || from < x.Row.Start-reach || x.Row.End+reach <= from {
					t.Fatalf("%s at %d: %+v, want faster %v, slower %v", d, place, x, faster, slower)
				}
			}
			for i, over := range ends {
				// Where trains of several lengths see parts of each other's stretches, it can be
				// that of a neighbouring part: never an earlier one.
				if !later(list[i].Until, over).Equal(list[i].Until) {
					t.Fatalf("%+v, want an end of %v", list[i], over)
				}
			}
			for i := 1; i < len(list); i++ {
				one, next := list[i-1], list[i]
				one.Until, next.Until = time.Time{}, time.Time{}
				if next.From < one.To {
					t.Fatalf("%+v overlap", list)
				}
				touch := one.To == next.From
				if one.From, one.To = next.From, next.To; touch && one == next {
					t.Fatalf("%+v: two are one", list)
				}
			}
			// What is left out goes with a row that is named, and does what it does.
			said := r.dated(d, align.Tracks(tracks[0], tracks[1]).Common, trains)
			for _, x := range list {
				if !slices.ContainsFunc(said, func(y Dated) bool {
					over := y.Until
					y.Until = x.Until
					return y == x && later(over, x.Until).Equal(over)
				}) && (!x.behind || !slices.ContainsFunc(said, func(y Dated) bool {
					return y.Row == x.Row && (y.Faster || !x.Faster) && (y.Slower || !x.Slower) && later(y.Until, x.Until).Equal(y.Until)
				})) {
					t.Fatalf("%+v is missing in %+v", x, said)
				}
			}
		}
	})
}

// A restriction that is raised a little and ends the next day lets trains go at line
// speed from then on: the change of its speed does not say so.
func TestDatedBesideAChangeOfSpeed(t *testing.T) {
	until := func(month int, v unit.Speed) []schema.TemporaryRow {
		row := schema.TemporaryRow{Speed: v, Valid: schema.Validity{From: monthOf(1), Until: monthOf(month)}}
		row.End, row.Directions = 10, codes.Both
		return []schema.TemporaryRow{row}
	}
	track, err := chainage.NewTrack(0, 10, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		base, target []schema.TemporaryRow
		faster       bool
	}{
		{until(6, 40), until(2, 45), true},
		{until(6, 40), until(6, 45), false},
		{until(6, 40), until(7, 45), false},
		{until(6, 45), until(2, 40), true},
		{until(6, 40), nil, false},
		{append(until(2, 40), until(6, 80)...), until(6, 80), false},
		{append(until(6, 40), until(2, 80)...), until(2, 80), true},
	} {
		r := &Route{
			Base:   &schema.Route{Directions: codes.Both, Track: track, Temporary: c.base},
			Target: &schema.Route{Directions: codes.Both, Track: track, Temporary: c.target},
		}
		faster := slices.ContainsFunc(r.dated(codes.Nominal, align.Tracks(track, track).Common, nil), func(x Dated) bool { return x.Faster })
		if faster != c.faster {
			t.Errorf("%+v to %+v: faster %v", c.base, c.target, faster)
		}
	}
}

// Where a restriction no longer waits for the rear of a train, another one can hold
// what lies behind it, and end earlier: of all restrictions together no speed rises.
func TestDatedBehindTheEnd(t *testing.T) {
	track, err := chainage.NewTrack(0, 10, nil)
	if err != nil {
		t.Fatal(err)
	}
	row := func(from, to unit.Distance, delay bool, until int) (r schema.TemporaryRow) {
		r.Start, r.End, r.Directions, r.Delay, r.Speed = from, to, codes.OnlyNominal, delay, 40
		r.Valid.Until = monthOf(until)
		return r
	}
	r := &Route{
		Base:   &schema.Route{Directions: codes.Both, Track: track, Temporary: []schema.TemporaryRow{row(2, 4, true, 12)}},
		Target: &schema.Route{Directions: codes.Both, Track: track, Temporary: []schema.TemporaryRow{row(2, 4, false, 12), row(4, 8, false, 2)}},
	}
	list := r.dated(codes.Nominal, align.Tracks(track, track).Common, []Train{{Train: schema.Train{Length: 3}}})
	if len(list) != 1 || list[0].From != 4 || list[0].To != 7 || !list[0].Faster || list[0].Slower {
		t.Fatalf("%+v", list)
	}
}

// A row has a part in a stretch of other dates where it holds there in that direction,
// and one of the base where the stretch comes of it.
func TestDatedBy(t *testing.T) {
	row := func(line int, d codes.Directions, from, to unit.Distance) schema.TemporaryRow {
		var x schema.TemporaryRow
		x.Directions, x.Pos.Line, x.Start, x.End = d, line, from, to
		return x
	}
	r := &Route{
		Base: &schema.Route{Temporary: []schema.TemporaryRow{row(2, codes.Both, 0, 100), row(3, codes.Both, 10, 20)}},
		Target: &schema.Route{Temporary: []schema.TemporaryRow{
			row(2, codes.OnlyNominal, 10, 20), row(3, codes.Both, 0, 10), row(4, codes.Both, 20, 30), row(5, codes.OnlyReverse, 10, 20), row(6, codes.Both, 19, 30),
		}},
	}
	of := func(side *schema.Route, i int, ofBase bool) []Dated {
		return []Dated{{Direction: codes.Nominal, From: 10, To: 20, Row: &side.Temporary[i], OfBase: ofBase}}
	}
	for name, c := range map[string]struct {
		dated    []Dated
		old, now []int
		want     bool
	}{
		"nothing":                              {nil, []int{3}, []int{2}, false},
		"the row of the base":                  {of(r.Base, 1, true), []int{3}, nil, true},
		"another row of the base":              {of(r.Base, 1, true), []int{2}, nil, false},
		"a row of the base, by the target's":   {of(r.Target, 0, false), []int{2}, nil, false},
		"the row of the target":                {of(r.Target, 0, false), nil, []int{2}, true},
		"one that overlaps":                    {of(r.Target, 0, false), nil, []int{6}, true},
		"one before it":                        {of(r.Target, 0, false), nil, []int{3}, false},
		"one behind it":                        {of(r.Target, 0, false), nil, []int{4}, false},
		"one of the other direction":           {of(r.Target, 0, false), nil, []int{5}, false},
		"a line that is none":                  {of(r.Target, 0, false), nil, []int{9}, false},
		"the second of several":                {of(r.Target, 0, false), nil, []int{3, 2}, true},
		"beside a row of the base, by its own": {of(r.Base, 1, true), nil, []int{2}, true},
	} {
		r.Dated = c.dated
		if got := r.datedBy(c.old, c.now); got != c.want {
			t.Errorf("%s: %t", name, got)
		}
	}
}

// Two stretches of one row are told apart by what trains do on them; and a restriction
// at the highest speed of all is one.
func TestDatedTellsApart(t *testing.T) {
	track, err := chainage.NewTrack(0, 10, nil)
	if err != nil {
		t.Fatal(err)
	}
	row := func(v unit.Speed, from, to unit.Distance, begin, end int) schema.TemporaryRow {
		x := schema.TemporaryRow{Speed: v}
		x.Directions, x.Start, x.End, x.Valid.From, x.Valid.Until = codes.Both, from, to, monthOf(begin), monthOf(end)
		return x
	}
	for name, c := range map[string]struct {
		base, target []schema.TemporaryRow
		want         []Dated
	}{
		"faster, then slower as well": {
			[]schema.TemporaryRow{row(80, 0, 5, 0, 0), row(80, 5, 10, 2, 0)}, []schema.TemporaryRow{row(80, 0, 10, 1, 2)},
			[]Dated{{From: 0, To: 5, Faster: true}, {From: 5, To: 10, Faster: true, Slower: true}},
		},
		"the highest speed": {
			[]schema.TemporaryRow{row(unit.MaxSpeed, 0, 10, 1, 3)}, []schema.TemporaryRow{row(unit.MaxSpeed, 0, 10, 1, 2)},
			[]Dated{{From: 0, To: 10, Faster: true, Until: monthOf(3)}},
		},
	} {
		r := &Route{Base: &schema.Route{Track: track, Temporary: c.base}, Target: &schema.Route{Track: track, Temporary: c.target}}
		got := r.dated(codes.Nominal, align.Tracks(track, track).Common, nil)
		for i := range got {
			if got[i].Row != &r.Target.Temporary[0] || got[i].OfBase {
				t.Errorf("%s: %+v", name, got[i])
			}
			got[i].Row = nil
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: %+v, want %+v", name, got, c.want)
		}
	}
}

// Restrictions are taken for the same, and not looked at, only where every cell that
// matters to a train is.
func TestSameRestrictions(t *testing.T) {
	row := func(change func(*schema.TemporaryRow)) []schema.TemporaryRow {
		x := schema.TemporaryRow{Speed: 40}
		x.Start, x.End, x.Directions, x.Delay = 2, 6, codes.Both, true
		x.Valid.From, x.Valid.Until = monthOf(1), monthOf(6)
		if change != nil {
			change(&x)
		}
		return []schema.TemporaryRow{x}
	}
	moved := func(by unit.Distance) func(*schema.TemporaryRow) {
		return func(x *schema.TemporaryRow) { x.Start, x.End = x.Start+by, x.End+by }
	}
	for name, c := range map[string]struct {
		target []schema.TemporaryRow
		moved  unit.Distance
		want   bool
	}{
		"the same":                   {row(nil), 0, true},
		"another id and line":        {row(func(x *schema.TemporaryRow) { x.ID, x.Pos.Line = "B", 9 }), 0, true},
		"moved along with the track": {row(moved(3)), 3, true},
		"moved on the track":         {row(moved(3)), 0, false},
		"left where the track moved": {row(nil), 3, false},
		"moved the other way":        {row(moved(-3)), 3, false},
		"another start":              {row(func(x *schema.TemporaryRow) { x.Start++ }), 0, false},
		"another end":                {row(func(x *schema.TemporaryRow) { x.End++ }), 0, false},
		"another direction":          {row(func(x *schema.TemporaryRow) { x.Directions = codes.OnlyNominal }), 0, false},
		"without delay":              {row(func(x *schema.TemporaryRow) { x.Delay = false }), 0, false},
		"another speed":              {row(func(x *schema.TemporaryRow) { x.Speed = 45 }), 0, false},
		"another beginning":          {row(func(x *schema.TemporaryRow) { x.Valid.From = monthOf(2) }), 0, false},
		"another last day":           {row(func(x *schema.TemporaryRow) { x.Valid.Until = monthOf(7) }), 0, false},
		"one more":                   {append(row(nil), row(nil)...), 0, false},
		"none":                       {nil, 0, false},
	} {
		r := &Route{Base: &schema.Route{Temporary: row(nil)}, Target: &schema.Route{Temporary: c.target}}
		if got := r.sameRestrictions(c.moved); got != c.want {
			t.Errorf("%s: %v", name, got)
		}
	}
}

// A thousand restrictions over each other, each to another day: what holds where is not
// looked up anew for every place and day, which took minutes for some hundreds of them.
func TestDatedManyOverEachOther(t *testing.T) {
	const n = 1000
	track, err := chainage.NewTrack(0, 3*n, nil)
	if err != nil {
		t.Fatal(err)
	}
	rows := func(days int) (list []schema.TemporaryRow) {
		for i := range n {
			row := schema.TemporaryRow{Speed: unit.Speed(5 * (1 + i%20))}
			row.Start, row.End, row.Directions = unit.Distance(i), unit.Distance(2*n+i), codes.Both
			row.Valid = schema.Validity{From: monthOf(1).AddDate(0, 0, i), Until: monthOf(1).AddDate(0, 0, i+days)}
			list = append(list, row)
		}
		return list
	}
	r := &Route{
		Base:   &schema.Route{Directions: codes.Both, Track: track, Temporary: rows(2)},
		Target: &schema.Route{Directions: codes.Both, Track: track, Temporary: rows(1)},
	}
	list := r.dated(codes.Nominal, align.Tracks(track, track).Common, nil)
	if len(list) == 0 || list[0].From != 0 || list[len(list)-1].To != 3*n-1 || !list[0].Faster || list[0].Slower {
		t.Fatalf("%d: %+v", len(list), list[:min(1, len(list))])
	}
}
