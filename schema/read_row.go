package schema

import (
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
	"speedtrail/schema/unit"
)

// commonAt is where in a row the columns stand that all tables have, and whether
// the row is a place.
type commonAt struct {
	from, to, direction, delay, note int
	place                            bool
}

// row reads what all tables have in common; false where its place is faulty.
func (r *reader) row(route *Route, line table.Row, at *commonAt) (Row, bool) {
	row := Row{Pos: line.Pos, Delay: true, Note: line.At(at.note).Text}
	row.Directions = codes.Both
	if c := line.At(at.direction); c.Text != "" {
		d, ok := codes.ParseDirections(c.Text)
		if !ok {
			r.faults.Add(c.Pos, "direction %s is none of nominal, reverse, both", source.Quote(c.Text))
			d = codes.Both
		}
		row.Directions = d
	}
	if row.Directions&route.Directions == 0 {
		r.faults.Add(line.At(at.direction).Pos, "direction %s is not one in which the route is used", row.Directions)
	}
	switch c := line.At(at.delay); c.Text {
	case "", "yes":
	case "no":
		row.Delay = false
	default:
		r.faults.Add(c.Pos, "train_length_delay %s is none of yes, no", source.Quote(c.Text))
	}
	fromName, from, to := "from_km", line.At(at.from), line.At(at.to)
	if at.place {
		fromName = "km"
	}
	var goodFrom, goodTo bool
	row.From, row.Start, goodFrom = r.point(route, from, fromName)
	if at.place && to.Text == "" {
		row.To, row.End, goodTo = row.From, row.Start, goodFrom
	} else {
		row.To, row.End, goodTo = r.point(route, to, "to_km")
	}
	if !goodFrom || !goodTo {
		row.Start, row.End = 0, 0
		return row, false
	}
	if row.Start > row.End || row.Start == row.End && !at.place {
		r.faults.Add(to.Pos, "to_km %s does not lie after %s %s along the track in the nominal direction", source.Quote(to.Text), fromName, source.Quote(from.Text))
		return row, false
	}
	return row, true
}

// point reads a position and finds it on the track.
func (r *reader) point(route *Route, c table.Cell, column string) (chainage.Point, unit.Distance, bool) {
	if c.Text == "" {
		r.faults.Add(c.Pos, "%s is blank, a position in kilometres is needed", column)
		return chainage.Point{}, 0, false
	}
	p, err := chainage.ParsePoint(c.Text)
	if err != nil {
		r.faults.Add(c.Pos, "%s %s is %s", column, source.Quote(c.Text), pointProblem(err))
		return p, 0, false
	}
	at, ok := r.locate(route, p, c, column)
	return p, at, ok
}
