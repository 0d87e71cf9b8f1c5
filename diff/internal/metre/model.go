// Package metre is a slow, independent, metre-by-metre statement of the rules,
// for tests only.
//
// It cuts the track into cells of one small grid step and asks of each cell,
// row by row, whether the row binds a train whose front stands there. It knows
// no intervals that could be shifted, sorted or joined wrongly, and shares no
// code with the packages that it checks. Every position and train length must
// be a multiple of the grid step.
package metre

import (
	"slices"

	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Source is a row that gives a place its speed.
type Source struct {
	Pos   source.Position
	Kind  string
	Value unit.Speed
}

// Place is what holds for a train whose front stands in one cell.
type Place struct {
	Speed   unit.Speed
	Sources []Source // every row that gives the speed, by position
}

// Layers says which kinds of restriction count. A nil Temporary counts all
// temporary restrictions.
type Layers struct {
	Static, AxleLoad, Train bool
	Temporary               func(*schema.TemporaryRow) bool
}

// All counts everything that is written.
var All = Layers{Static: true, AxleLoad: true, Train: true}

// Profile gives the place of each cell, in the nominal order of the cells for
// both directions of travel. Where nothing binds, the speed is 0.
func Profile(route *schema.Route, train schema.Train, direction codes.Direction, layers Layers, grid unit.Distance) []Place {
	places := make([]Place, route.Track.Length()/grid)
	for i := range places {
		var all []Source
		for k := range route.Speed {
			row := &route.Speed[k]
			if layers.Static && binds(&row.Row, i, train.Length, direction, grid) {
				all = append(all, static(row, train))
			}
		}
		for k := range route.AxleLoad {
			row := &route.AxleLoad[k]
			// SUBSET-026 3.11.4.3: no entry for exactly this category, no
			// restriction.
			v := row.Limit[train.AxleLoad]
			if layers.AxleLoad && v != 0 && binds(&row.Row, i, train.Length, direction, grid) {
				all = append(all, Source{row.Pos, "axle load " + axleLoads[train.AxleLoad], v})
			}
		}
		for k := range route.Temporary {
			row := &route.Temporary[k]
			counts := layers.Temporary == nil || layers.Temporary(row)
			if counts && binds(&row.Row, i, train.Length, direction, grid) {
				all = append(all, Source{row.Pos, "temporary " + row.ID, row.Speed})
			}
		}
		if layers.Train {
			all = append(all, Source{train.MaxPos, "train", train.Max})
		}
		// 3.13.7: the lowest of all that hold; every row that attains it counts.
		for _, s := range all {
			if places[i].Speed == 0 || s.Value < places[i].Speed {
				places[i].Speed = s.Value
			}
		}
		for _, s := range all {
			if s.Value == places[i].Speed {
				places[i].Sources = with(places[i].Sources, s)
			}
		}
	}
	return places
}

// binds tells whether a row binds a train whose front stands in a cell. With
// train length delay it does as long as any part of the train is on the row
// (SUBSET-026 3.11.3.1.3, 3.11.4.6, 3.11.5.3), else as long as the front is.
func binds(row *schema.Row, front int, length unit.Distance, direction codes.Direction, grid unit.Distance) bool {
	if !row.Directions.Has(direction) {
		return false
	}
	behind := -1 // the rear of a train in nominal direction has the lower numbers
	if direction == codes.Reverse {
		behind = +1
	}
	// In each cell it is the middle that stands for all of it, so that no end
	// of a row coincides with a place that is looked at.
	cells := 0
	if row.Delay {
		cells = int(length / grid)
	}
	for n := 0; n <= cells; n++ {
		middle := unit.Distance(2*(front+behind*n)+1) * grid // doubled
		if 2*row.Start < middle && middle < 2*row.End {
			return true
		}
	}
	return false
}

// The names of the categories as SUBSET-026 7.5.1 numbers them.
var (
	axleLoads = [...]string{"A", "HS17", "B1", "B2", "C2", "C3", "C4", "D2", "D3", "D4", "D4XL", "E4", "E5"}
	cants     = [...]string{"80", "100", "130", "150", "165", "180", "210", "225", "245", "275", "300"}
	others    = [...]string{"freight_p", "freight_g", "passenger"}
)

// static gives the speed of an element of the static speed profile, by writing
// down every speed that comes into question (SUBSET-026 3.11.3.2.3, .5, .6).
func static(row *schema.SpeedRow, train schema.Train) Source {
	kind, v := "basic", row.Basic
	for c := 0; c <= int(train.Cant); c++ { // the last one given is the highest
		if row.Cant[c] != 0 {
			kind, v = "cant deficiency "+cants[c], row.Cant[c]
		}
	}
	candidates := []Source{{row.Pos, kind, v}}
	for c, given := range row.Other {
		if given != 0 && row.Replaces[c] && train.Categories>>c&1 == 1 {
			candidates = nil
		}
	}
	for c, given := range row.Other {
		if given != 0 && train.Categories>>c&1 == 1 {
			candidates = append(candidates, Source{row.Pos, others[c], given})
		}
	}
	lowest := candidates[0]
	for _, s := range candidates[1:] {
		switch {
		case s.Value < lowest.Value:
			lowest = s
		case s.Value == lowest.Value:
			lowest.Kind += " and " + s.Kind
		}
	}
	return lowest
}

// with adds a source to a list that is in the order of the positions and holds
// each one once.
func with(list []Source, s Source) []Source {
	if slices.Contains(list, s) {
		return list
	}
	list = append(list, s)
	slices.SortFunc(list, func(a, b Source) int { return a.Pos.Compare(b.Pos) })
	return list
}

// Cell names a cell by what the posts read at its beginning and by how many
// cells before it along the track read the same.
type Cell struct {
	Chainage unit.Distance
	Nth      int
}

// Cells lists the cells of a track.
func Cells(track *chainage.Track, grid unit.Distance) []Cell {
	var cells []Cell
	seen := map[unit.Distance]int{}
	for _, s := range track.Segments() {
		for km := s.From; km < s.To; km += grid {
			cells = append(cells, Cell{km, seen[km]})
			seen[km]++
		}
	}
	return cells
}

// Change is a maximal stretch over which the speed before, the speed after and
// RunOut are constant, and before and after differ. From and To are running
// distances on the target's track.
type Change struct {
	Direction                   codes.Direction
	From, To                    unit.Distance
	Before, After               unit.Speed
	RunOut                      bool
	BeforeSources, AfterSources []Source
}

// Changes lists what a train sees in a direction that both routes have.
func Changes(base, target *schema.Route, train schema.Train, direction codes.Direction, grid unit.Distance) []Change {
	return changes(base, target, train, direction, All, grid, func(Change, int, int) bool { return true })
}

// Masked lists what a train would see without temporary restrictions and does
// not see with them: where the speeds with them are equal, move in the other
// sense, or rise less far.
func Masked(base, target *schema.Route, train schema.Train, direction codes.Direction, grid unit.Distance) []Change {
	permanent := All
	permanent.Temporary = func(*schema.TemporaryRow) bool { return false }
	before := Profile(base, train, direction, All, grid)
	after := Profile(target, train, direction, All, grid)
	return changes(base, target, train, direction, permanent, grid, func(c Change, b, t int) bool {
		old, now := before[b].Speed, after[t].Speed
		if c.Before > c.After {
			return now >= old
		}
		return now <= old || now < c.After
	})
}

// changes lists the changes in those cells of the base and the target that are
// wanted.
func changes(base, target *schema.Route, train schema.Train, direction codes.Direction, layers Layers, grid unit.Distance, want func(c Change, b, t int) bool) []Change {
	point := train
	point.Length = 0
	before := Profile(base, train, direction, layers, grid)
	after := Profile(target, train, direction, layers, grid)
	pointBefore := Profile(base, point, direction, layers, grid)
	pointAfter := Profile(target, point, direction, layers, grid)
	baseCells := Cells(base.Track, grid)
	var list []Change
	last := -1 // the base's cell that the last change ends with
	for t, cell := range Cells(target.Track, grid) {
		b := slices.Index(baseCells, cell)
		if b < 0 || before[b].Speed == after[t].Speed {
			continue
		}
		c := Change{
			Direction: direction, From: unit.Distance(t) * grid, To: unit.Distance(t+1) * grid,
			Before: before[b].Speed, After: after[t].Speed,
			RunOut:        pointBefore[b].Speed == pointAfter[t].Speed,
			BeforeSources: before[b].Sources, AfterSources: after[t].Sources,
		}
		if !want(c, b, t) {
			continue
		}
		if n := len(list) - 1; n >= 0 {
			p := &list[n]
			if p.To == c.From && last+1 == b && p.Before == c.Before && p.After == c.After && p.RunOut == c.RunOut {
				c.From = p.From
				c.BeforeSources = union(p.BeforeSources, c.BeforeSources)
				c.AfterSources = union(p.AfterSources, c.AfterSources)
				list = list[:n]
			}
		}
		list, last = append(list, c), b
	}
	return list
}

func union(a, b []Source) []Source {
	all := slices.Clone(a)
	for _, s := range b {
		all = with(all, s)
	}
	return all
}

// Stretch is a maximal stretch of track in running distances.
type Stretch struct{ From, To unit.Distance }

// Only lists the track that a has and b lacks, in running distances of a.
func Only(a, b *chainage.Track, grid unit.Distance) []Stretch {
	have := Cells(b, grid)
	var list []Stretch
	for i, cell := range Cells(a, grid) {
		if slices.Contains(have, cell) {
			continue
		}
		from := unit.Distance(i) * grid
		if n := len(list) - 1; n >= 0 && list[n].To == from {
			list[n].To += grid
		} else {
			list = append(list, Stretch{from, from + grid})
		}
	}
	return list
}
