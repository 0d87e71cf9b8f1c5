package assessment

import (
	"reflect"
	"slices"
	"strconv"

	"speedtrail/diff"
	"speedtrail/diff/impact"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/parallel"
)

// fleets writes the accounts for every train.
func fleets(a *diff.Account) []Fleet {
	perRoute := make([][]Fleet, len(a.Routes))
	parallel.Each(len(perRoute), func(i int) {
		for k := range a.Routes[i].Fleet {
			if f := &a.Routes[i].Fleet[k]; len(f.Changes) > 0 || len(f.Reach) > 0 {
				perRoute[i] = append(perRoute[i], fleetOf(&a.Routes[i], f))
			}
		}
	})
	return append([]Fleet{}, slices.Concat(perRoute...)...)
}

func fleetOf(r *diff.Route, f *diff.Fleet) Fleet {
	doc := Fleet{Route: r.ID, Direction: f.Direction.String(), Permanent: f.Permanent, Shortest: int64(f.Shortest), Longest: int64(f.Longest), Changes: []FleetChange{}, Reach: []Reach{}, LeftOut: []int64{}}
	for _, l := range f.LeftOut.Lengths {
		doc.LeftOut = append(doc.LeftOut, int64(l))
	}
	for _, x := range f.Reach {
		doc.Reach = append(doc.Reach, Reach{From: r.Target.Track.Begins(x.From).String(), To: r.Target.Track.Ends(x.To).String()})
	}
	for _, c := range f.Changes {
		change := FleetChange{
			From: r.Target.Track.Begins(c.Target).String(), To: r.Target.Track.Ends(c.Target + c.Length).String(), Length: int64(c.Length),
			Before: int(c.Before), After: int(c.After), RunOut: c.RunOut, Lengths: []int64{}, Members: []FleetPart{},
		}
		for _, l := range c.Lengths {
			change.Lengths = append(change.Lengths, int64(l))
		}
		for k, p := range c.Products {
			change.Members = append(change.Members, FleetPart{Who: p.String(), Represented: c.Represented[k]})
		}
		doc.Changes = append(doc.Changes, change)
	}
	return doc
}

// figures writes the figures of all routes.
func figures(a *diff.Account) Figures {
	perRoute := make([]Figures, len(a.Routes))
	parallel.Each(len(perRoute), func(i int) { perRoute[i] = figuresOf(a, &a.Routes[i]) })
	out := Figures{Crossings: []CrossingFigure{}, Curves: []CurveFigure{}, Short: []ShortFigure{}}
	runs := 0
	for _, f := range perRoute {
		runs += len(f.Runs)
	}
	out.Runs = make([]RunFigure, 0, runs)
	for _, f := range perRoute {
		out.Crossings = append(out.Crossings, f.Crossings...)
		out.Curves = append(out.Curves, f.Curves...)
		out.Runs = append(out.Runs, f.Runs...)
		out.Short = append(out.Short, f.Short...)
	}
	return out
}

func figuresOf(a *diff.Account, r *diff.Route) (out Figures) {
	out.Runs = make([]RunFigure, 0, len(r.Figures.Runs))
	for _, x := range r.Figures.Runs {
		run := RunFigure{Route: r.ID, Direction: x.Direction.String(), Train: a.Trains[x.Train].ID, Before: x.Before, After: x.After, Parts: []RunPart{}}
		parts := x.Parts
		if len(parts) == 1 {
			parts = nil // the whole route: it says nothing more
		}
		for _, p := range parts {
			run.Parts = append(run.Parts, RunPart{From: r.Target.Track.Begins(p.From).String(), To: r.Target.Track.Ends(p.To).String(), Gain: p.Gain})
		}
		out.Runs = append(out.Runs, run)
	}
	for _, x := range r.Figures.Crossings {
		c := CrossingFigure{
			Route: r.ID, Direction: x.Direction.String(), Name: x.Place.Name, Km: x.Place.From.String(), Permanent: x.Permanent,
			Before: x.Before, After: x.After, StrikeIn: int64(x.Place.StrikeIn), Warning: int64(x.Place.WarningDS),
		}
		if x.Old != nil {
			c.StrikeInBefore, c.WarningBefore = int64(x.Old.StrikeIn), int64(x.Old.WarningDS)
		}
		out.Crossings = append(out.Crossings, c)
	}
	ofRow := map[string][]int{} // indices in out.Curves
	for _, x := range r.Figures.Curves {
		f := curveFigure(a, r, &x)
		// Both directions of travel may say the same.
		k := slices.IndexFunc(ofRow[f.Row], func(i int) bool {
			g := out.Curves[i]
			g.Direction = f.Direction
			return reflect.DeepEqual(f, g)
		})
		if k >= 0 {
			out.Curves[ofRow[f.Row][k]].Direction = codes.Both.String()
			continue
		}
		ofRow[f.Row] = append(ofRow[f.Row], len(out.Curves))
		out.Curves = append(out.Curves, f)
	}
	for _, x := range r.Figures.Short {
		out.Short = append(out.Short, ShortFigure{
			Route: r.ID, Direction: x.Direction.String(), Train: a.Trains[x.Train].ID,
			From: r.Target.Track.Begins(x.From).String(), To: r.Target.Track.Ends(x.To).String(), Length: int64(x.To - x.From),
			Speed: int(x.Speed), Reached: int(x.Reached), Needed: int64(x.Needed),
		})
	}
	return out
}

func curveFigure(a *diff.Account, r *diff.Route, x *diff.Curve) CurveFigure {
	row := x.Row
	f := CurveFigure{
		Route: r.ID, Direction: x.Direction.String(), From: row.From.String(), To: row.To.String(), Row: rowText(&row.Row),
		Radius: row.RadiusM, Cant: row.CantMM, CantBefore: -1, Category: x.Category.MM(), Before: int(x.Before), After: int(x.After),
		Deficiency: impact.CantDeficiency(x.After, row.RadiusM, row.CantMM),
		Over:       impact.CantDeficiencyAbove(x.After, row.RadiusM, row.CantMM, x.Category.MM()),
		Lowest:     int(x.Lowest), Excess: -impact.CantDeficiency(x.Lowest, row.RadiusM, row.CantMM), Slowest: a.Trains[x.Slowest].ID,
		Trains: x.Trains,
	}
	if x.Old != nil {
		f.CantBefore, f.RadiusB = x.Old.CantMM, x.Old.RadiusM
		if x.Before > 0 {
			f.DeficiencyB = impact.CantDeficiency(x.Before, x.Old.RadiusM, x.Old.CantMM)
		}
	}
	return f
}

func rowText(r *schema.Row) string { return r.Pos.File + ":" + strconv.Itoa(r.Pos.Line) }
