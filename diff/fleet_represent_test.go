package diff

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"testing"

	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// fleetRow is a row of a made-up route, in metres.
type fleetRow struct {
	from, to   int
	basic      unit.Speed
	cant150    unit.Speed // cant deficiency 150 mm and above
	temporary  bool
	delay      bool
	directions codes.Directions // 0: both
}

// fleetRoute makes a route of 1000 m.
func fleetRoute(t *testing.T, rows ...fleetRow) *schema.Route {
	t.Helper()
	track, err := chainage.NewTrack(0, 1000*unit.Metre, nil)
	if err != nil {
		t.Fatal(err)
	}
	r := &schema.Route{ID: "r", Track: track, Directions: codes.Both}
	for _, x := range rows {
		row := schema.Row{Start: unit.Distance(x.from) * unit.Metre, End: unit.Distance(x.to) * unit.Metre, Delay: x.delay}
		if row.Directions = x.directions; x.directions == 0 {
			row.Directions = codes.Both
		}
		if x.temporary {
			r.Temporary = append(r.Temporary, schema.TemporaryRow{Row: row, ID: "T", Speed: x.basic})
			continue
		}
		s := schema.SpeedRow{Row: row, Basic: x.basic}
		s.Cant[3] = x.cant150
		r.Speed = append(r.Speed, s)
	}
	return r
}

// fleetOf compares two routes for the trains.
func fleetOf(t testingT, base, target *schema.Route, trains ...schema.Train) *Route {
	sides := [2]*schema.Dataset{}
	for i, r := range []*schema.Route{base, target} {
		sides[i] = &schema.Dataset{Routes: []*schema.Route{r}, Trains: trains}
	}
	a, err := Compare(context.Background(), sides[0], sides[1], Options{NoRequests: true, NoFigures: true})
	if err != nil {
		t.Fatalf("%v", err)
	}
	return &a.Routes[0]
}

type testingT interface{ Fatalf(string, ...any) }

// fleetText writes the changes of an account, one a line: direction, place,
// speeds, lengths, and each product with + or - for represented or not.
func fleetText(r *Route) []string {
	var list []string
	for _, f := range r.Fleet {
		for _, c := range f.Changes {
			text := fmt.Sprintf("%s %s-%s m %d>%d", f.Direction, c.Target.M(), (c.Target + c.Length).M(), c.Before, c.After)
			if f.Permanent {
				text = "permanent " + text
			}
			if c.RunOut {
				text += " run-out"
			}
			for _, l := range c.Lengths {
				text += " " + l.M()
			}
			for k, p := range c.Products {
				text += map[bool]string{true: " +", false: " -"}[c.Represented[k]] + p.String()
			}
			list = append(list, text)
		}
	}
	return list
}

func checkFleetText(t *testing.T, base, target []fleetRow, trains []schema.Train, want []string) {
	t.Helper()
	if got := fleetText(fleetOf(t, fleetRoute(t, base...), fleetRoute(t, target...), trains...)); !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

func fleetTrain(id string, length int, top unit.Speed) schema.Train {
	return schema.Train{ID: id, Length: unit.Distance(length) * unit.Metre, Max: top}
}

// tilting gives the train a cant deficiency of 150 mm.
func tilting(t schema.Train) schema.Train { t.Cant = 3; return t }

const (
	fleetAll  = "any cant deficiency, any category, any axle load"
	fleetSlow = "cant deficiency up to 130 mm, any category, any axle load"
	fleetTilt = "cant deficiency 150 mm and above, any category, any axle load"
)

// Whether a reference train stands for a kind of trains that changes.
func TestRepresented(t *testing.T) {
	type rows = []fleetRow
	plain := func(from, to int, v unit.Speed) fleetRow { return fleetRow{from: from, to: to, basic: v} }
	around := func(v unit.Speed) rows { return rows{plain(0, 400, 100), plain(400, 600, v), plain(600, 1000, 100)} }
	only := func(d codes.Directions, v unit.Speed) rows {
		x := plain(400, 600, v)
		x.directions = d
		y := plain(400, 600, 100)
		y.directions = codes.Both &^ d
		return rows{plain(0, 400, 100), x, y, plain(600, 1000, 100)}
	}
	tests := []struct {
		name         string
		base, target rows
		trains       []schema.Train
		want         []string
	}{
		{
			"a train of the kind changes on the same place",
			around(60), around(80), []schema.Train{fleetTrain("a", 100, 160)},
			[]string{"nominal 400-600 m 60>80 100 +" + fleetAll, "reverse 400-600 m 60>80 100 +" + fleetAll},
		},
		{
			"in one direction only",
			only(codes.OnlyReverse, 60), only(codes.OnlyReverse, 80), []schema.Train{fleetTrain("a", 100, 160)},
			[]string{"reverse 400-600 m 60>80 100 +" + fleetAll},
		},
		{
			"a maximum speed below both",
			around(60), around(80), []schema.Train{fleetTrain("a", 100, 60)},
			[]string{"nominal 400-600 m 60>80 100 -" + fleetAll, "reverse 400-600 m 60>80 100 -" + fleetAll},
		},
		{
			"a maximum speed in between still changes",
			around(60), around(80), []schema.Train{fleetTrain("a", 100, 65)},
			[]string{"nominal 400-600 m 60>80 100 +" + fleetAll, "reverse 400-600 m 60>80 100 +" + fleetAll},
		},
		{
			"trains of other categories do not stand for it",
			rows{plain(0, 400, 100), {from: 400, to: 600, basic: 60, cant150: 70}, plain(600, 1000, 100)},
			rows{plain(0, 400, 100), {from: 400, to: 600, basic: 65, cant150: 90}, plain(600, 1000, 100)},
			[]schema.Train{fleetTrain("a", 100, 160)},
			[]string{
				"nominal 400-600 m 60>65 100 +" + fleetSlow, "nominal 400-600 m 70>90 100 -" + fleetTilt,
				"reverse 400-600 m 60>65 100 +" + fleetSlow, "reverse 400-600 m 70>90 100 -" + fleetTilt,
			},
		},
		{
			"the same with a train of each",
			rows{plain(0, 400, 100), {from: 400, to: 600, basic: 60, cant150: 70}, plain(600, 1000, 100)},
			rows{plain(0, 400, 100), {from: 400, to: 600, basic: 65, cant150: 90}, plain(600, 1000, 100)},
			[]schema.Train{fleetTrain("a", 100, 160), tilting(fleetTrain("b", 100, 160))},
			[]string{
				"nominal 400-600 m 60>65 100 +" + fleetSlow, "nominal 400-600 m 70>90 100 +" + fleetTilt,
				"reverse 400-600 m 60>65 100 +" + fleetSlow, "reverse 400-600 m 70>90 100 +" + fleetTilt,
			},
		},
		{
			// The train, at most 50, sees the first stretch of 40 fall to 30
			// and not that the second one rises.
			"a change of the other sense beside it does not stand for it",
			rows{plain(0, 400, 40), plain(400, 1000, 60)}, rows{plain(0, 400, 30), plain(400, 1000, 80)},
			[]schema.Train{fleetTrain("a", 100, 50)},
			[]string{
				"nominal 0-400 m 40>30 100 +" + fleetAll, "nominal 400-1000 m 60>80 100 -" + fleetAll,
				"reverse 0-400 m 40>30 100 +" + fleetAll, "reverse 400-1000 m 60>80 100 -" + fleetAll,
			},
		},
		{
			"a change of the same sense elsewhere does not stand for it",
			rows{plain(0, 200, 40), plain(200, 600, 50), plain(600, 1000, 60)}, rows{plain(0, 200, 50), plain(200, 600, 50), plain(600, 1000, 80)},
			[]schema.Train{fleetTrain("a", 100, 50)},
			[]string{
				"nominal 0-200 m 40>50 100 +" + fleetAll, "nominal 600-1000 m 60>80 100 -" + fleetAll,
				"reverse 0-200 m 40>50 100 +" + fleetAll, "reverse 600-1000 m 60>80 100 -" + fleetAll,
			},
		},
		{
			// The delayed row holds the long train, which alone is tilting, up to
			// 700 m; before that, tilting trains of the short length change.
			"a part of the place suffices",
			rows{{from: 0, to: 400, basic: 60, delay: true, directions: codes.OnlyNominal}, {from: 400, to: 1000, basic: 80, directions: codes.OnlyNominal}, {from: 0, to: 1000, basic: 60, directions: codes.OnlyReverse}},
			rows{{from: 0, to: 400, basic: 60, delay: true, directions: codes.OnlyNominal}, {from: 400, to: 1000, basic: 80, cant150: 100, directions: codes.OnlyNominal}, {from: 0, to: 1000, basic: 60, directions: codes.OnlyReverse}},
			[]schema.Train{fleetTrain("a", 10, 160), tilting(fleetTrain("b", 300, 160))},
			[]string{"nominal 410-1000 m 80>100 10 +" + fleetTilt, "nominal 700-1000 m 80>100 300 +" + fleetTilt},
		},
		{
			// The train of 30 m is too slow. The one of 300 m sees the same speeds
			// change further on, and trains of lengths in between in between.
			"a long train whose length carries the change elsewhere",
			rows{{from: 0, to: 400, basic: 60, delay: true, directions: codes.OnlyNominal}, {from: 400, to: 1000, basic: 80, directions: codes.OnlyNominal}, {from: 0, to: 1000, basic: 60, directions: codes.OnlyReverse}},
			rows{{from: 0, to: 380, basic: 60, delay: true, directions: codes.OnlyNominal}, {from: 380, to: 400, basic: 60, directions: codes.OnlyNominal}, {from: 400, to: 1000, basic: 80, directions: codes.OnlyNominal}, {from: 0, to: 1000, basic: 60, directions: codes.OnlyReverse}},
			[]schema.Train{fleetTrain("a", 30, 50), fleetTrain("b", 300, 160)},
			[]string{
				"nominal 410-430 m 60>80 run-out 30 +" + fleetAll,
				"nominal 680-700 m 60>80 run-out 300 +" + fleetAll,
			},
		},
		{
			"no reference train, no account", around(60), around(80), nil, nil,
		},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			checkFleetText(t, test.base, test.target, test.trains, test.want)
		})
	}
}

// Changes that temporary restrictions hide today are represented if a
// reference train would see them without.
func TestRepresentedPermanently(t *testing.T) {
	type rows = []fleetRow
	nominal := func(v unit.Speed, more ...fleetRow) rows {
		return append(rows{{from: 0, to: 1000, basic: v, directions: codes.OnlyNominal}, {from: 0, to: 1000, basic: 50, directions: codes.OnlyReverse}}, more...)
	}
	restriction := func(v unit.Speed) fleetRow {
		return fleetRow{from: 200, to: 300, basic: v, temporary: true, directions: codes.OnlyNominal}
	}
	tests := []struct {
		name         string
		base, target rows
		trains       []schema.Train
		want         []string
	}{
		{
			name: "hidden altogether, seen without", base: nominal(60, fleetRow{from: 0, to: 1000, basic: 40, temporary: true}), target: nominal(80, fleetRow{from: 0, to: 1000, basic: 40, temporary: true}),
			trains: []schema.Train{fleetTrain("a", 10, 160)},
			want:   []string{"permanent nominal 0-1000 m 60>80 10 +" + fleetAll},
		},
		{
			name: "hidden altogether, too fast without", base: nominal(60, fleetRow{from: 0, to: 1000, basic: 40, temporary: true}), target: nominal(80, fleetRow{from: 0, to: 1000, basic: 40, temporary: true}),
			trains: []schema.Train{fleetTrain("a", 10, 60)},
			want:   []string{"permanent nominal 0-1000 m 60>80 10 -" + fleetAll},
		},
		{
			name: "a temporary restriction that stays hides a part", base: nominal(60, restriction(40)), target: nominal(80, restriction(40)),
			trains: []schema.Train{fleetTrain("a", 10, 160)},
			want: []string{
				"nominal 0-200 m 60>80 10 +" + fleetAll, "nominal 300-1000 m 60>80 10 +" + fleetAll,
				"permanent nominal 0-1000 m 60>80 10 +" + fleetAll,
			},
		},
		{
			name: "the same without temporary restrictions is not said twice", base: nominal(60, restriction(100)), target: nominal(80, restriction(90)),
			trains: []schema.Train{fleetTrain("a", 10, 160)},
			want:   []string{"nominal 0-1000 m 60>80 10 +" + fleetAll},
		},
		{
			name: "a new temporary restriction stands for no permanent reduction", base: nominal(100), target: nominal(90, fleetRow{from: 0, to: 1000, basic: 40, temporary: true, directions: codes.OnlyNominal}),
			trains: []schema.Train{fleetTrain("a", 10, 80)},
			want: []string{
				"nominal 0-1000 m 100>40 10 +" + fleetAll,
				"permanent nominal 0-1000 m 100>90 10 -" + fleetAll,
			},
		},
		{
			name: "the end of a temporary restriction stands for no permanent raise", base: nominal(100, fleetRow{from: 0, to: 1000, basic: 40, temporary: true, directions: codes.OnlyNominal}), target: nominal(110),
			trains: []schema.Train{fleetTrain("a", 10, 100)},
			want: []string{
				"nominal 0-1000 m 40>110 10 +" + fleetAll,
				"permanent nominal 0-1000 m 100>110 10 -" + fleetAll,
			},
		},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			checkFleetText(t, test.base, test.target, test.trains, test.want)
		})
	}
}

// A temporary restriction may hide what trains in between the two lengths see:
// then the account without it has no changes of its own, but its own reach.
func TestFleetReachPermanently(t *testing.T) {
	rows := func(delayed int) *schema.Route {
		return fleetRoute(t,
			fleetRow{from: 0, to: delayed, basic: 60, delay: true, directions: codes.OnlyNominal},
			fleetRow{from: delayed, to: 400, basic: 60, directions: codes.OnlyNominal},
			fleetRow{from: 400, to: 1000, basic: 80, directions: codes.OnlyNominal},
			fleetRow{from: 0, to: 1000, basic: 60, directions: codes.OnlyReverse},
			fleetRow{from: 500, to: 600, basic: 40, temporary: true, directions: codes.OnlyNominal})
	}
	got := ""
	for _, f := range fleetOf(t, rows(390), rows(380), fleetTrain("a", 30, 160), fleetTrain("b", 300, 160)).Fleet {
		got += fmt.Sprintf("%s permanent %t: %d changes, reach", f.Direction, f.Permanent, len(f.Changes))
		for _, r := range f.Reach {
			got += " " + r.From.M() + "-" + r.To.M()
		}
		got += "\n"
	}
	want := "nominal permanent false: 2 changes, reach 400-500 600-690\n" +
		"nominal permanent true: 0 changes, reach 400-690\n" +
		"reverse permanent false: 0 changes, reach\n"
	if got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}
