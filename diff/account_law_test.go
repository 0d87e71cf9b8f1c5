package diff_test

import (
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff"
	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/diff/rows"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// routeTexts writes a route as the files that it could have been read from.
func routeTexts(r *schema.Route) texts {
	segments := r.Track.Segments()
	toml := fmt.Sprintf("id = %q\nname = %q\nstart_km = %s\nend_km = %s\n", r.ID, r.Name, segments[0].From.KM(), segments[len(segments)-1].To.KM())
	if r.Directions != codes.Both {
		toml += fmt.Sprintf("directions = [%q]\n", r.Directions)
	}
	for _, j := range r.Jumps {
		toml += fmt.Sprintf("[[jump]]\narriving_km = %s\nleaving_km = %s\n", j.Arriving.KM(), j.Leaving.KM())
	}
	table := func(name string, n int, row func(i int) (*schema.Row, string)) string {
		text := strings.Join(schema.TableColumns(name), ",") + "\n"
		for i := range n {
			x, middle := row(i)
			delay := map[bool]string{true: "yes", false: "no"}[x.Delay]
			cells := fmt.Sprintf("%s,%s,%s,%s", x.From, x.To, x.Directions, middle)
			if name == "temporary.csv" { // the id stands first
				id, rest, _ := strings.Cut(middle, ",")
				cells = fmt.Sprintf("%s,%s,%s,%s,%s", id, x.From, x.To, x.Directions, rest)
			}
			text += cells + "," + delay + ",\n"
		}
		return text
	}
	given := func(list []unit.Speed) []string {
		cells := make([]string, len(list))
		for i, v := range list {
			if v > 0 {
				cells[i] = v.String()
			}
		}
		return cells
	}
	files := texts{"route.toml": toml}
	files["speed.csv"] = table("speed.csv", len(r.Speed), func(i int) (*schema.Row, string) {
		x := &r.Speed[i]
		cells := append([]string{x.Basic.String()}, given(x.Cant[:])...)
		for k, v := range given(x.Other[:]) {
			rule := ""
			if v != "" && x.Replaces[k] {
				rule = "replaces"
			}
			cells = append(cells, v, rule)
		}
		return &x.Row, strings.Join(cells, ",")
	})
	if len(r.AxleLoad) > 0 {
		files["axle-load.csv"] = table("axle-load.csv", len(r.AxleLoad), func(i int) (*schema.Row, string) {
			return &r.AxleLoad[i].Row, strings.Join(given(r.AxleLoad[i].Limit[:]), ",")
		})
	}
	if len(r.Temporary) > 0 {
		files["temporary.csv"] = table("temporary.csv", len(r.Temporary), func(i int) (*schema.Row, string) {
			return &r.Temporary[i].Row, fmt.Sprintf("%s,%s,,,", r.Temporary[i].ID, r.Temporary[i].Speed)
		})
	}
	return files
}

// drawTexts draws two revisions of a route, on a grid, and writes them.
func drawTexts(t *rapid.T, grid unit.Distance) (base, target texts) {
	d := metre.Dice(func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") })
	sketch := d.Sketch("R1")
	base = routeTexts(sketch.Route(d, grid))
	other := sketch.Edited(d)
	if d(0, 7) == 0 {
		other = d.Sketch("R1")
	}
	target = routeTexts(other.Route(d, grid))
	trains := ""
	for i := range 1 + d(0, 2) {
		x := d.Train(fmt.Sprintf("t%d", i), 1, unit.Metre)
		var categories []string
		for k := range codes.Category(codes.Categories) {
			if x.Categories.Has(k) {
				categories = append(categories, fmt.Sprintf("%q", k))
			}
		}
		trains += trainText(x.ID, x.Cant.MM(), strings.Join(categories, ", "), x.AxleLoad.String(), int(x.Length/unit.Metre), int(x.Max))
		trains += fmt.Sprintf("acceleration_ms2 = 0.%d\nbraking_ms2 = 0.%d\n", d(1, 9), d(1, 9))
	}
	for _, side := range []texts{base, target} {
		side["dataset.toml"], side["trains.toml"] = ground["dataset.toml"], trains
	}
	return base, target
}

// lineOf finds the row of a layer in a line and what it gives a train.
func lineOf(r *schema.Route, layer profile.Layer, line int, class profile.Class) (*schema.Row, unit.Speed) {
	switch layer {
	case profile.StaticSpeed:
		i := slices.IndexFunc(r.Speed, func(x schema.SpeedRow) bool { return x.Pos.Line == line })
		return &r.Speed[i].Row, profile.StaticSpeedOf(&r.Speed[i], class)
	case profile.AxleLoad:
		i := slices.IndexFunc(r.AxleLoad, func(x schema.AxleLoadRow) bool { return x.Pos.Line == line })
		return &r.AxleLoad[i].Row, r.AxleLoad[i].Limit[class.AxleLoad]
	}
	i := slices.IndexFunc(r.Temporary, func(x schema.TemporaryRow) bool { return x.Pos.Line == line })
	return &r.Temporary[i].Row, r.Temporary[i].Speed
}

// restricts writes what the rows of one side of a difference give a train,
// metre by metre of the posts that the other side has, too: the speeds and
// delays that hold there; and the same from end to end.
func restricts(r, other *schema.Route, f *diff.File, table []rows.Row, list []int, d codes.Direction, class profile.Class) (metres, ends string) {
	layer := map[string]profile.Layer{"speed.csv": profile.StaticSpeed, "axle-load.csv": profile.AxleLoad, "temporary.csv": profile.Temporary}[f.Path()[strings.LastIndexByte(f.Path(), '/')+1:]]
	type span struct {
		from, to chainage.Point
		rest     string
	}
	var at []string
	var spans []span
	for _, i := range list {
		row, v := lineOf(r, layer, table[i].Line, class)
		if v == 0 || !row.Directions.Has(d) {
			continue
		}
		spans = append(spans, span{firstOf(row.From), firstOf(row.To), fmt.Sprint(v, row.Delay)})
		for s := row.Start; s < row.End; s += unit.Metre {
			p, q := firstOf(r.Track.Begins(s)), firstOf(r.Track.Ends(s+unit.Metre))
			from, errA := locateFirst(other.Track, p)
			to, errB := locateFirst(other.Track, q)
			if errA == nil && errB == nil && from+unit.Metre == to {
				at = append(at, fmt.Sprint(p, " ", v, " ", row.Delay))
			}
		}
	}
	for i := 0; i < len(spans); i++ { // those that continue each other are one
		k := slices.IndexFunc(spans, func(x span) bool { return x.from == spans[i].to && x.rest == spans[i].rest })
		if k >= 0 && k != i {
			spans[i].to = spans[k].to
			spans = slices.Delete(spans, k, k+1)
			i = -1
		}
	}
	var whole []string
	for _, x := range spans {
		whole = append(whole, fmt.Sprint(x))
	}
	slices.Sort(at)
	slices.Sort(whole)
	return strings.Join(at, ";"), strings.Join(whole, ";")
}

// differs tells whether a difference restricts a train otherwise than before. A
// row between the same posts does not, even where a jump has made it longer: then
// the jump does.
func differs(r *diff.Route, f *diff.File, x *diff.RowDifference, d codes.Direction, class profile.Class) bool {
	table := &f.Tables[x.Table]
	old, oldEnds := restricts(r.Base, r.Target, f, table.Old.Rows, x.Old, d, class)
	now, nowEnds := restricts(r.Target, r.Base, f, table.New.Rows, x.New, d, class)
	return old != now && oldEnds != nowEnds
}

func firstOf(p chainage.Point) chainage.Point {
	if p.Occurrence == 1 {
		p.Occurrence = 0
	}
	return p
}

// locateFirst finds a position whose first occurrence is not marked.
func locateFirst(track *chainage.Track, p chainage.Point) (unit.Distance, error) {
	at, err := track.Locate(p)
	if errors.Is(err, chainage.ErrAmbiguous) {
		return track.Locate(chainage.Point{Chainage: p.Chainage, Occurrence: 1})
	}
	return at, err
}

// Every change has at least one cause. The causes are the differences whose old
// row governs before or whose new row governs after, those aside that give the
// train what they gave it; a jump or an end of the route where there is none.
func TestEveryChangeHasItsCauses(t *testing.T) {
	byRows, byTrack, several := 0, 0, 0
	check(t, 300, func(t *rapid.T) {
		base, target := drawTexts(t, unit.Metre)
		a, err := diff.Compare(t.Context(), readRapid(t, base), readRapid(t, target), diff.Options{NoFleet: true, NoFigures: true})
		if err != nil {
			t.Fatal(err)
		}
		for i := range a.Routes {
			r := &a.Routes[i]
			for _, list := range [][]diff.Change{r.Changes, r.Masked} {
				for n := range list {
					c := &list[n]
					class := profile.ClassOf(a.Trains[c.Train].Train)
					var may, must []diff.Cause
					for k := range r.Files {
						f := &r.Files[k]
						for m := range f.Rows {
							x := &f.Rows[m]
							table := &f.Tables[x.Table]
							governs := func(list []int, table []rows.Row, sources []profile.Source) bool {
								return slices.ContainsFunc(sources, func(s profile.Source) bool {
									return strings.HasSuffix(f.Path(), s.Pos.File) && slices.ContainsFunc(list, func(i int) bool { return table[i].Line == s.Pos.Line })
								})
							}
							if !governs(x.Old, table.Old.Rows, r.Sources[c.BeforeSources]) && !governs(x.New, table.New.Rows, r.Sources[c.AfterSources]) {
								continue
							}
							may = append(may, diff.Cause{File: k, Row: m})
							if differs(r, f, x, c.Direction, class) {
								must = append(must, diff.Cause{File: k, Row: m})
							}
						}
					}
					got := r.Causes[c.Causes]
					track := len(got) > 0 && !slices.ContainsFunc(got, func(x diff.Cause) bool { return !strings.HasSuffix(r.Files[x.File].Path(), "route.toml") })
					if !track {
						// A run-out across a joint that differs comes of that as well.
						got = slices.DeleteFunc(slices.Clone(got), func(x diff.Cause) bool { return strings.HasSuffix(r.Files[x.File].Path(), "route.toml") })
					}
					switch {
					case len(got) == 0 || track && len(must) > 0 || !track && !(subset(must, got) && subset(got, may)):
						t.Fatalf("%s\nmust be %v, may be %v\n%s", changeText(a, r, c), must, may, showTexts(base, target))
					case track:
						byTrack++
					default:
						byRows++
						several += min(1, len(got)-1)
					}
				}
			}
		}
	})
	if !testing.Short() && (byRows < 300 || byTrack < 2 || several < 50) {
		t.Errorf("only %d changes by rows, %d by several, %d by the track", byRows, several, byTrack)
	}
}

// Every difference says what came of it or why nothing did, and what says that
// it concerns no train, or none that the standard can describe, is right.
func TestEveryDifferenceIsExplained(t *testing.T) {
	seen := map[diff.Reason]int{}
	check(t, 300, func(t *rapid.T) {
		base, target := drawTexts(t, unit.Metre)
		a, err := diff.Compare(t.Context(), readRapid(t, base), readRapid(t, target), diff.Options{NoFleet: true, NoFigures: true})
		if err != nil {
			t.Fatal(err)
		}
		for i := range a.Routes {
			r := &a.Routes[i]
			for k := range r.Files {
				f := &r.Files[k]
				for m := range f.Rows {
					x := &f.Rows[m]
					seen[x.Reason]++
					if (x.Reason == diff.NoReason) != (x.Causes || x.Track) {
						t.Fatalf("%s: causes %t, track %t, reason %q\n%s", causeText(r, diff.Cause{File: k, Row: m}), x.Causes, x.Track, x.Reason, showTexts(base, target))
					}
					// Differences beside each other can make up for one another.
					if x.Reason != diff.NoSuchTrain && x.Reason != diff.SameForAll || !alone(f, m) {
						continue
					}
					for _, train := range a.Trains {
						for _, d := range codes.AllDirections {
							if differs(r, f, x, d, profile.ClassOf(train.Train)) {
								t.Fatalf("%s: %s, but not for %s\n%s", causeText(r, diff.Cause{File: k, Row: m}), x.Reason, train.ID, showTexts(base, target))
							}
						}
					}
				}
			}
		}
	})
	for _, reason := range []diff.Reason{diff.NoReason, diff.SameForAll, diff.NoSuchTrain, diff.LowerElsewhere, diff.HiddenToday} {
		if !testing.Short() && seen[reason] < 5 {
			t.Errorf("reason %q was drawn %d times only", reason, seen[reason])
		}
	}
}

// alone tells whether no other difference of a file overlaps or touches one.
func alone(f *diff.File, m int) bool {
	span := func(d *diff.RowDifference) (low, high unit.Distance) {
		low, high = 1<<60, -1<<60
		for _, i := range d.Old {
			row := &f.Tables[d.Table].Old.Rows[i]
			low, high = min(low, row.From.Chainage, row.To.Chainage), max(high, row.From.Chainage, row.To.Chainage)
		}
		for _, i := range d.New {
			row := &f.Tables[d.Table].New.Rows[i]
			low, high = min(low, row.From.Chainage, row.To.Chainage), max(high, row.From.Chainage, row.To.Chainage)
		}
		return low, high
	}
	low, high := span(&f.Rows[m])
	for k := range f.Rows {
		if from, to := span(&f.Rows[k]); k != m && from <= high && low <= to {
			return false
		}
	}
	return true
}

func subset(a, b []diff.Cause) bool {
	return !slices.ContainsFunc(a, func(x diff.Cause) bool { return !slices.Contains(b, x) })
}

func showTexts(sides ...texts) string {
	var b strings.Builder
	for i, side := range sides {
		fmt.Fprintf(&b, "---- %s\n", [...]string{"base", "target"}[i])
		for _, name := range []string{"route.toml", "speed.csv", "axle-load.csv", "temporary.csv", "trains.toml"} {
			fmt.Fprintf(&b, "%s:\n%s", name, side[name])
		}
	}
	return b.String()
}
