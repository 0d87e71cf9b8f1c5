package metre

import (
	"fmt"
	"slices"

	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Dice draws a whole number from low to high. It is the only chance in a drawn
// route, so that a failure shrinks and repeats.
type Dice func(low, high int) int

func (d Dice) oneIn(n int) bool { return d(1, n) == n }

// Few speeds make many ties; the ends of the range are among them.
var speeds = [...]unit.Speed{40, 80, 60, 100, 120, 160, 5, 600}

// Most trains are fast enough to see the rows.
var trainSpeeds = [...]unit.Speed{600, 160, 100, 90, 300, 120, 5}

func (d Dice) speed() unit.Speed { return speeds[d(0, len(speeds)-1)] }

// The axle load categories that rows and trains are drawn from.
var loads = [...]codes.AxleLoad{9, 0, 8, 12}

var directionSets = [...]codes.Directions{codes.Both, codes.OnlyNominal, codes.OnlyReverse}

// Grid draws a grid step.
func (d Dice) Grid() unit.Distance {
	return [...]unit.Distance{unit.Metre, 12_500, unit.Millimetre}[d(0, 2)]
}

// Train draws a train; its line in the file of trains tells it from others.
func (d Dice) Train(id string, line int, grid unit.Distance) schema.Train {
	return schema.Train{
		Pos: source.Position{File: "trains.toml", Line: line}, MaxPos: source.Position{File: "trains.toml", Line: line + 1},
		ID: id, Name: id,
		Cant: codes.CantDeficiency(d(0, codes.CantDeficiencies-1)), Categories: codes.CategorySet(d(0, codes.CategorySets-1)),
		AxleLoad: loads[d(0, len(loads)-1)], Length: unit.Distance(d(1, 25)) * grid, Max: trainSpeeds[d(0, len(trainSpeeds)-1)],
	}
}

// Sketch is a route on the drawing board: cells of one grid step that are
// painted with elements of the static speed profile, and spans over them.
type Sketch struct {
	ID         string
	segments   []segment
	directions codes.Directions
	paint      [2][]int // by direction and cell, the number of an element
	elements   []schema.SpeedRow
	spans      []span
	nextID     int
}

// segment is a stretch between jumps; chainage and length in grid steps.
type segment struct{ from, length int }

// span is a row of one of the other tables.
type span struct {
	from, to   int // cells, from < to
	directions codes.Directions
	delay      bool
	limit      [codes.AxleLoads]unit.Speed // of an axle load row
	speed      unit.Speed                  // of a temporary restriction, else 0
	id         string
}

// Sketch draws a route.
func (d Dice) Sketch(id string) *Sketch {
	s := &Sketch{ID: id, directions: codes.Both}
	if d.oneIn(6) {
		s.directions = directionSets[d(1, 2)]
	}
	at := d(-6, 6)
	for range 1 + d(0, 3) {
		seg := segment{at, d(2, 14)}
		s.segments = append(s.segments, seg)
		at = seg.from + seg.length + d(1, 12)*(1-2*d(0, 1))
	}
	for s.track(1) == nil {
		s.segments = s.segments[:len(s.segments)-1]
	}
	n := len(s.cells())
	for _, dir := range codes.AllDirections {
		s.paint[dir] = make([]int, n)
	}
	longest := [...]int{9, 9, 9, n}[d(0, 3)]
	for from := 0; from < n; {
		to := min(n, from+d(1, longest))
		s.brush(codes.Nominal, from, to, d.element(s))
		s.brush(codes.Reverse, from, to, s.paint[0][from])
		if d.oneIn(3) { // rows for one direction only
			middle := d(from, to)
			s.brush(codes.Reverse, from, middle, d.element(s))
			s.brush(codes.Reverse, middle, to, d.element(s))
		}
		from = to
	}
	for range d(0, 4) {
		s.spans = append(s.spans, d.span(s))
	}
	if d.oneIn(5) {
		s.delayAll(false)
	}
	return s
}

func (s *Sketch) brush(direction codes.Direction, from, to, element int) {
	for i := from; i < to; i++ {
		s.paint[direction][i] = element
	}
}

// element draws an element and gives its number.
func (d Dice) element(s *Sketch) int {
	row := schema.SpeedRow{Basic: d.speed()}
	row.Delay = d.oneIn(2)
	for range d(0, 3) {
		row.Cant[d(0, codes.CantDeficiencies-1)] = d.speed()
	}
	for range d(0, 2) {
		c := d(0, codes.Categories-1)
		row.Other[c], row.Replaces[c] = d.speed(), d.oneIn(2)
	}
	s.elements = append(s.elements, row)
	return len(s.elements) - 1
}

// span draws an axle load row or a temporary restriction.
func (d Dice) span(s *Sketch) span {
	n := len(s.paint[0])
	from := d(0, n-1)
	p := span{from: from, to: d(from+1, min(n, from+12)), directions: directionSets[d(0, 2)], delay: d.oneIn(2)}
	if d.oneIn(5) {
		p.from, p.to = 0, n
	}
	if d.oneIn(2) {
		p.speed, p.id = d.speed(), fmt.Sprintf("T%d", s.nextID)
		s.nextID++
		return p
	}
	for range d(1, 2) {
		p.limit[loads[d(0, len(loads)-1)]] = d.speed()
	}
	return p
}

// track gives the track, nil where the segments make none.
func (s *Sketch) track(grid unit.Distance) *chainage.Track {
	first, last := s.segments[0], s.segments[len(s.segments)-1]
	t, err := chainage.NewTrack(unit.Distance(first.from)*grid, unit.Distance(last.from+last.length)*grid, s.jumps(grid))
	if err != nil {
		return nil
	}
	return t
}

func (s *Sketch) jumps(grid unit.Distance) []chainage.Jump {
	var list []chainage.Jump
	for i, seg := range s.segments[1:] {
		arriving := s.segments[i].from + s.segments[i].length
		list = append(list, chainage.Jump{Arriving: unit.Distance(arriving) * grid, Leaving: unit.Distance(seg.from) * grid})
	}
	return list
}

func (s *Sketch) cells() []Cell { return Cells(s.track(1), 1) }

// Route writes the sketch down. The rows stand in the files in any order, each
// on its own line.
func (s *Sketch) Route(d Dice, grid unit.Distance) *schema.Route {
	folder := "routes/" + s.ID
	r := &schema.Route{Folder: folder, ID: s.ID, Name: s.ID, Track: s.track(grid), Directions: s.directions}
	for _, j := range s.jumps(grid) {
		r.Jumps = append(r.Jumps, schema.JumpRow{Jump: j})
	}
	row := func(from, to int, directions codes.Directions, delay bool) schema.Row {
		start, end := unit.Distance(from)*grid, unit.Distance(to)*grid
		written := schema.Span{From: r.Track.Begins(start), To: r.Track.Ends(end), Directions: directions}
		return schema.Row{Span: written, Start: start, End: end, Delay: delay}
	}
	nominal, reverse := runs(s.paint[codes.Nominal]), runs(s.paint[codes.Reverse])
	write := func(x run, directions codes.Directions) {
		if directions&s.directions == 0 {
			return
		}
		e := s.elements[x.element]
		e.Row = row(x.from, x.to, directions, e.Delay)
		r.Speed = append(r.Speed, e)
	}
	for _, x := range nominal {
		if i := slices.Index(reverse, x); i >= 0 && !d.oneIn(5) {
			reverse = slices.Delete(reverse, i, i+1)
			write(x, codes.Both)
			continue
		}
		write(x, codes.OnlyNominal)
	}
	for _, x := range reverse {
		write(x, codes.OnlyReverse)
	}
	for _, p := range s.spans {
		if p.directions&s.directions == 0 {
			continue
		}
		base := row(p.from, p.to, p.directions, p.delay)
		if p.speed != 0 {
			r.Temporary = append(r.Temporary, schema.TemporaryRow{Row: base, ID: p.id, Speed: p.speed})
		} else {
			r.AxleLoad = append(r.AxleLoad, schema.AxleLoadRow{Row: base, Limit: p.limit})
		}
	}
	shuffle(d, r.Speed)
	shuffle(d, r.Temporary)
	shuffle(d, r.AxleLoad)
	for i := range r.Speed {
		r.Speed[i].Pos = source.Position{File: folder + "/speed.csv", Line: i + 2, Column: 1}
	}
	for i := range r.AxleLoad {
		r.AxleLoad[i].Pos = source.Position{File: folder + "/axle-load.csv", Line: i + 2, Column: 1}
	}
	for i := range r.Temporary {
		r.Temporary[i].Pos = source.Position{File: folder + "/temporary.csv", Line: i + 2, Column: 1}
	}
	return r
}

// run is a longest run of cells of one element.
type run struct{ from, to, element int }

func runs(paint []int) []run {
	var list []run
	for i, e := range paint {
		if n := len(list) - 1; n >= 0 && list[n].element == e {
			list[n].to++
		} else {
			list = append(list, run{i, i + 1, e})
		}
	}
	return list
}

func shuffle[T any](d Dice, list []T) {
	for i := len(list) - 1; i > 0; i-- {
		k := i - d(0, i) // drawn 0 leaves the order as it is
		list[i], list[k] = list[k], list[i]
	}
}

// Rows writes the rows of a route, for the report of a failure.
func Rows(r *schema.Route) string {
	text := ""
	add := func(row schema.Row, value any) {
		text += fmt.Sprintf("  %s %s-%s m %s delay %t: %v\n", row.Pos, row.Start.M(), row.End.M(), row.Directions, row.Delay, value)
	}
	for _, s := range r.Speed {
		add(s.Row, fmt.Sprintf("basic %d cant %v other %v replaces %v", s.Basic, s.Cant, s.Other, s.Replaces))
	}
	for _, a := range r.AxleLoad {
		add(a.Row, a.Limit)
	}
	for _, t := range r.Temporary {
		add(t.Row, fmt.Sprint(t.ID, " ", t.Speed))
	}
	return text
}
