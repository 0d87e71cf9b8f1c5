// Package profile compiles the effective speed profile of a train on a route:
// the lowest of all restrictions that hold at each point, those with train
// length delay stretched by the length of the train (SUBSET-026 3.11.2.3,
// 3.13.7), as far as it can be stated at a desk: without odometry doubt, modes,
// signalling or the braking distance permitted by national rules.
//
// A Compiler is made once for a route and a direction of travel and serves all
// trains:
//
//	c := profile.New(route, codes.Nominal, profile.All)
//	p := c.Compile(train)
//	p.At(1500 * unit.Metre)                     // the speed 1.5 km along the track
//	c.Profile(train)[0].Sources                 // the rows behind its first piece
package profile

import (
	"strconv"

	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Layer is a kind of restriction. Layers are independent of each other
// (SUBSET-026 3.11.2.3); the order is the one in which sources are listed.
type Layer uint8

// The layers of a profile.
const (
	StaticSpeed Layer = iota // speed.csv, SUBSET-026 3.11.3
	AxleLoad                 // axle-load.csv, 3.11.4
	Temporary                // temporary.csv, 3.11.5
	TrainSpeed               // trains.toml, 3.11.8
)

// restriction is one row of a layer on one direction of travel.
type restriction struct {
	start, end unit.Distance
	delay      bool
	layer      Layer
	row        int // in the table of its layer
	pos        source.Position
}

// Source is a row that governs the speed somewhere, with the kind of
// restriction and the value that it gives to the train.
type Source struct {
	Pos   source.Position
	Layer Layer
	Kind  string // "basic", "cant deficiency 150", "passenger", "axle load D4", "temporary TSR-7", "train"
	Value unit.Speed
}

// String writes "path:line kind value", the form that sources have in results.
func (s Source) String() string {
	return s.Pos.File + ":" + strconv.Itoa(s.Pos.Line) + " " + s.Kind + " " + s.Value.String()
}

// Class is what a route's rows can tell trains apart by, length and maximum
// speed aside.
type Class struct {
	Cant       codes.CantDeficiency
	Categories codes.CategorySet
	AxleLoad   codes.AxleLoad
}

// ClassOf gives the class of a reference train.
func ClassOf(t schema.Train) Class { return Class{t.Cant, t.Categories, t.AxleLoad} }

// StaticSpeedOf selects the speed that an element of the static speed profile
// gives to a class of trains (SUBSET-026 3.11.3.2.3, .5, .6).
func StaticSpeedOf(row *schema.SpeedRow, class Class) unit.Speed {
	cant := cantSpeed(row, class.Cant)
	lowest, replaced := unit.Speed(0), false
	for c := range codes.Category(codes.Categories) {
		v := row.Other[c]
		if v == 0 || !class.Categories.Has(c) {
			continue // 3.11.3.2.5: what the train does not have is ignored
		}
		if lowest == 0 || v < lowest {
			lowest = v
		}
		replaced = replaced || row.Replaces[c]
	}
	if lowest == 0 || !replaced && cant < lowest {
		return cant
	}
	return lowest
}

// cantSpeed gives the speed for the train's own cant deficiency category, else
// for the highest one below it, else the basic speed (SUBSET-026 3.11.3.2.3).
func cantSpeed(row *schema.SpeedRow, c codes.CantDeficiency) unit.Speed {
	if i := cantColumn(row, c); i >= 0 {
		return row.Cant[i]
	}
	return row.Basic
}

// cantColumn finds the category whose speed a train of category c gets, -1 for
// the basic speed.
func cantColumn(row *schema.SpeedRow, c codes.CantDeficiency) int {
	i := int(c)
	for i >= 0 && row.Cant[i] == 0 {
		i--
	}
	return i
}

// staticKind names the cells of a row that give the selected speed.
func staticKind(row *schema.SpeedRow, class Class) string {
	v, kind := StaticSpeedOf(row, class), ""
	add := func(name string) {
		if kind != "" {
			kind += " and "
		}
		kind += name
	}
	replaced := false
	for c := range codes.Category(codes.Categories) {
		replaced = replaced || class.Categories.Has(c) && row.Other[c] != 0 && row.Replaces[c]
	}
	if !replaced && cantSpeed(row, class.Cant) == v {
		if i := cantColumn(row, class.Cant); i >= 0 {
			add("cant deficiency " + strconv.Itoa(codes.CantDeficiency(i).MM()))
		} else {
			add("basic")
		}
	}
	for c := range codes.Category(codes.Categories) {
		if class.Categories.Has(c) && row.Other[c] == v {
			add(c.String())
		}
	}
	return kind
}
