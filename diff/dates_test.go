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
// up to more.
func TestDatedPointByPoint(t *testing.T) {
	track, err := chainage.NewTrack(0, 10, nil)
	if err != nil {
		t.Fatal(err)
	}
	rapid.Check(t, func(t *rapid.T) {
		trains := []Train{{Train: schema.Train{Length: 2}}, {Train: schema.Train{Length: 5}}}
		r := &Route{
			Base:   &schema.Route{Directions: codes.Both, Track: track, Temporary: drawTerms(t, "base")},
			Target: &schema.Route{Directions: codes.Both, Track: track, Temporary: drawTerms(t, "target")},
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
			list := r.datedAnywhere(d, align.Tracks(track, track).Common, trains)
			for place := range unit.Distance(10) {
				var faster, slower bool
				for _, length := range []unit.Distance{0, 2, 5} {
					before, after := at(r.Base, d, place, length, -1), at(r.Target, d, place, length, -1)
					for month := range 6 {
						was, is := at(r.Base, d, place, length, month), at(r.Target, d, place, length, month)
						faster = faster || is > was && (after <= before || is > after)
						slower = slower || is < was && after >= before
					}
				}
				i := slices.IndexFunc(list, func(x Dated) bool { return x.From <= place && place < x.To })
				if got := i >= 0; got != (faster || slower) {
					t.Fatalf("%s at %d: named %v, faster %v, slower %v: %+v", d, place, got, faster, slower, list)
				}
				if i >= 0 && (list[i].Faster != faster || list[i].Slower != slower || list[i].Row == nil || !list[i].Row.Directions.Has(d)) {
					t.Fatalf("%s at %d: %+v, want faster %v, slower %v", d, place, list[i], faster, slower)
				}
			}
			for i := 1; i < len(list); i++ {
				if list[i].From < list[i-1].To {
					t.Fatalf("%+v overlap", list)
				}
			}
			// What is left out goes with a row that is named, and does what it does.
			said := r.dated(d, align.Tracks(track, track).Common, trains)
			for _, x := range list {
				if !slices.Contains(said, x) && (!x.behind || !slices.ContainsFunc(said, func(y Dated) bool {
					return y.Row == x.Row && (y.Faster || !x.Faster) && (y.Slower || !x.Slower)
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
