package schema

import (
	"strconv"
	"strings"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
	"speedtrail/schema/unit"
)

// Columns of the tables of a route, in the order of the documentation.
var (
	speedColumns     = append(append([]string{"from_km", "to_km", "direction", "basic"}, cantColumns()...), append(otherColumns(), "train_length_delay", "note")...)
	axleLoadColumns  = append(append([]string{"from_km", "to_km", "direction"}, axleLoadNames()...), "train_length_delay", "note")
	temporaryColumns = []string{"id", "from_km", "to_km", "direction", "speed", "valid_from", "valid_to", "reason", "train_length_delay", "note"}
	curveColumns     = []string{"from_km", "to_km", "radius_m", "cant_mm", "hand", "note"}
	gradientColumns  = []string{"from_km", "to_km", "permille", "note"}
	placeColumns     = []string{"km", "to_km", "direction", "kind", "name", "strike_in_m", "warning_s", "note"}
)

func cantColumns() []string {
	var list []string
	for c := range codes.CantDeficiency(codes.CantDeficiencies) {
		list = append(list, c.Column())
	}
	return list
}

func otherColumns() []string {
	var list []string
	for c := range codes.Category(codes.Categories) {
		list = append(list, c.String(), c.String()+"_rule")
	}
	return list
}

// TableColumns gives the columns that a table of a route can have, by the
// table's file name; nil for another name.
func TableColumns(name string) []string {
	return map[string][]string{
		"speed.csv": speedColumns, "axle-load.csv": axleLoadColumns, "temporary.csv": temporaryColumns,
		"curves.csv": curveColumns, "gradients.csv": gradientColumns, "places.csv": placeColumns,
	}[name]
}

// tables reads the tables of a route.
func (r *reader) tables(route *Route, present map[string]bool) {
	read := func(name string, required []string, row func(row table.Row, base Row) bool) *table.CSV {
		if !present[name] {
			return nil
		}
		file := route.Folder + "/" + name
		content, ok := r.file(file, table.MaxTableSize)
		if !ok {
			return nil
		}
		t := table.ReadCSV(file, content, TableColumns(name), required, &r.faults)
		for line := range t.Rows() {
			base, good := r.row(route, line, name == "places.csv")
			if !row(line, base) || !good {
				t.Broken = true
			}
		}
		return t
	}
	span := []string{"from_km", "to_km"}
	speed := read("speed.csv", append(span, "basic"), func(line table.Row, base Row) bool {
		row, ok := r.speedRow(line, base)
		route.Speed = append(route.Speed, row)
		return ok
	})
	if speed != nil && speed.Len() == 0 && !speed.Broken {
		r.faults.Add(source.Position{File: route.Folder + "/speed.csv"}, "no row, the basic speed is always given (SUBSET-026 3.11.3.2.2)")
	} else if speed != nil && !speed.Broken && route.Track != nil {
		r.coverage(route)
	}
	read("axle-load.csv", span, func(line table.Row, base Row) bool {
		row := AxleLoadRow{Row: base}
		for a := range codes.AxleLoad(codes.AxleLoads) {
			row.Limit[a] = r.optionalSpeed(line.Cell(a.String()), a.String())
		}
		route.AxleLoad = append(route.AxleLoad, row)
		return true
	})
	seen := map[string]source.Position{}
	read("temporary.csv", append(span, "id", "speed"), func(line table.Row, base Row) bool {
		row := TemporaryRow{Row: base, ID: line.Cell("id").Text, Reason: line.Cell("reason").Text}
		if row.ID == "" || len(row.ID) > 100 {
			r.faults.Add(line.Cell("id").Pos, "id %s is not a text of 1 to 100 bytes", source.Quote(row.ID))
		}
		r.unique(seen, "temporary restriction", row.ID, line.Cell("id").Pos)
		row.Speed = r.speed(line.Cell("speed").Text, line.Cell("speed").Pos, "speed")
		row.Valid = r.validity(line)
		route.Temporary = append(route.Temporary, row)
		return true
	})
	curves := read("curves.csv", append(span, "radius_m", "cant_mm"), func(line table.Row, base Row) bool {
		row := CurveRow{Row: base, Hand: line.Cell("hand").Text}
		row.RadiusM = r.wholeCell(line.Cell("radius_m"), "radius_m", 1, 1_000_000)
		row.CantMM = r.wholeCell(line.Cell("cant_mm"), "cant_mm", 0, 300)
		if h := row.Hand; h != "" && h != "left" && h != "right" {
			r.faults.Add(line.Cell("hand").Pos, "hand %s is none of left, right", source.Quote(h))
		}
		route.Curves = append(route.Curves, row)
		return true
	})
	if curves != nil && !curves.Broken && route.Track != nil {
		rows := make([]*Row, len(route.Curves))
		for i := range route.Curves {
			rows[i] = &route.Curves[i].Row
		}
		r.disjoint(route, rows, "curve")
	}
	gradients := read("gradients.csv", append(span, "permille"), func(line table.Row, base Row) bool {
		c := line.Cell("permille")
		n, ok := decimal(c.Text, 3)
		if !ok || n < -200_000 || n > 200_000 {
			r.faults.Add(c.Pos, "permille %s is not a number from -200 to 200 with at most three decimals", source.Quote(c.Text))
		}
		route.Gradients = append(route.Gradients, GradientRow{Row: base, Slope: int(n)})
		return ok
	})
	if gradients != nil && !gradients.Broken && route.Track != nil {
		rows := make([]*Row, len(route.Gradients))
		for i := range route.Gradients {
			rows[i] = &route.Gradients[i].Row
		}
		r.disjoint(route, rows, "gradient")
	}
	read("places.csv", []string{"km", "kind", "name"}, func(line table.Row, base Row) bool {
		route.Places = append(route.Places, r.placeRow(line, base))
		return true
	})
}

// row reads what all tables have in common; false where its place is faulty.
func (r *reader) row(route *Route, line table.Row, place bool) (Row, bool) {
	row := Row{Pos: line.Pos, Delay: true, Note: line.Cell("note").Text}
	row.Directions = codes.Both
	if c := line.Cell("direction"); c.Text != "" {
		d, ok := codes.ParseDirections(c.Text)
		if !ok {
			r.faults.Add(c.Pos, "direction %s is none of nominal, reverse, both", source.Quote(c.Text))
			d = codes.Both
		}
		row.Directions = d
	}
	if row.Directions&route.Directions == 0 {
		r.faults.Add(line.Cell("direction").Pos, "direction %s is not one in which the route is used", row.Directions)
	}
	switch c := line.Cell("train_length_delay"); c.Text {
	case "", "yes":
	case "no":
		row.Delay = false
	default:
		r.faults.Add(c.Pos, "train_length_delay %s is none of yes, no", source.Quote(c.Text))
	}
	from, to := "from_km", "to_km"
	if place {
		from = "km"
	}
	var goodFrom, goodTo bool
	row.From, goodFrom = r.point(route, line.Cell(from), from)
	if place && line.Cell(to).Text == "" {
		row.To, goodTo = row.From, goodFrom
	} else {
		row.To, goodTo = r.point(route, line.Cell(to), to)
	}
	if !goodFrom || !goodTo {
		return row, false
	}
	row.Start, _ = route.Track.Locate(row.From)
	row.End, _ = route.Track.Locate(row.To)
	if row.Start > row.End || row.Start == row.End && !place {
		r.faults.Add(line.Cell(to).Pos, "%s %s does not lie after %s %s along the track in the nominal direction", to, source.Quote(line.Cell(to).Text), from, source.Quote(line.Cell(from).Text))
		return row, false
	}
	return row, true
}

// point reads a position and finds it on the track.
func (r *reader) point(route *Route, c table.Cell, column string) (chainage.Point, bool) {
	if c.Text == "" {
		r.faults.Add(c.Pos, "%s is blank, a position in kilometres is needed", column)
		return chainage.Point{}, false
	}
	p, err := chainage.ParsePoint(c.Text)
	if err != nil {
		r.faults.Add(c.Pos, "%s %s is %s", column, source.Quote(c.Text), pointProblem(err))
		return p, false
	}
	return r.locate(route, p, c, column)
}

func (r *reader) optionalSpeed(c table.Cell, column string) unit.Speed {
	if c.Text == "" {
		return 0
	}
	return r.speed(c.Text, c.Pos, column)
}

// speedRow reads a row of speed.csv.
func (r *reader) speedRow(line table.Row, base Row) (SpeedRow, bool) {
	row := SpeedRow{Row: base}
	before := r.faults.Count()
	if c := line.Cell("basic"); c.Text == "" {
		r.faults.Add(c.Pos, "basic is blank, the basic speed is always given (SUBSET-026 3.11.3.2.2)")
	} else {
		row.Basic = r.speed(c.Text, c.Pos, "basic")
	}
	for c := range codes.CantDeficiency(codes.CantDeficiencies) {
		row.Cant[c] = r.optionalSpeed(line.Cell(c.Column()), c.Column())
	}
	for k := range codes.Category(codes.Categories) {
		speed, rule := line.Cell(k.String()), line.Cell(k.String()+"_rule")
		row.Other[k] = r.optionalSpeed(speed, k.String())
		switch rule.Text {
		case "", "limits":
		case "replaces":
			row.Replaces[k] = true
		default:
			r.faults.Add(rule.Pos, "%s_rule %s is none of replaces, limits", k, source.Quote(rule.Text))
		}
		if rule.Text != "" && speed.Text == "" {
			r.faults.Add(rule.Pos, "%s_rule is given without a speed for %s", k, k)
		}
	}
	return row, r.faults.Count() == before
}

// placeRow reads a row of places.csv.
func (r *reader) placeRow(line table.Row, base Row) PlaceRow {
	row := PlaceRow{Row: base, Name: line.Cell("name").Text}
	if row.Name == "" {
		r.faults.Add(line.Cell("name").Pos, "name is blank")
	}
	kind := line.Cell("kind")
	switch k := PlaceKind(kind.Text); k {
	case Station, Crossing, Bridge, Tunnel, Junction, Signal, Other:
		row.Kind = k
	default:
		r.faults.Add(kind.Pos, "kind %s is none of station, crossing, bridge, tunnel, junction, signal, other", source.Quote(kind.Text))
	}
	for _, f := range []struct {
		column  string
		places  int
		most    int64
		allowed string
		set     func(int64)
	}{
		{"strike_in_m", 3, 50_000_000, "up to 50000 with at most 3 decimals", func(n int64) { row.StrikeIn = unit.Distance(n) }},
		{"warning_s", 1, 6_000, "up to 600 with at most 1 decimal", func(n int64) { row.WarningDS = int(n) }},
	} {
		c := line.Cell(f.column)
		if c.Text == "" {
			continue
		}
		n, ok := decimal(c.Text, f.places)
		switch {
		case !ok || n <= 0 || n > f.most:
			r.faults.Add(c.Pos, "%s %s is not a number above 0 and %s", f.column, source.Quote(c.Text), f.allowed)
		case kind.Text != string(Crossing):
			r.faults.Add(c.Pos, "%s is for crossings only", f.column)
		default:
			f.set(n)
		}
	}
	return row
}

func (r *reader) wholeCell(c table.Cell, column string, least, most int) int {
	n, err := strconv.Atoi(c.Text)
	if err != nil || n < least || n > most || strings.HasPrefix(c.Text, "+") {
		r.faults.Add(c.Pos, "%s %s is not a whole number from %d to %d", column, source.Quote(c.Text), least, most)
	}
	return n
}

// validity reads the time in which a temporary restriction is in force.
func (r *reader) validity(line table.Row) Validity {
	v := Validity{WrittenFrom: line.Cell("valid_from").Text, WrittenTo: line.Cell("valid_to").Text}
	v.From = r.instant(line.Cell("valid_from"), "valid_from", false)
	v.Until = r.instant(line.Cell("valid_to"), "valid_to", true)
	if !v.From.IsZero() && !v.Until.IsZero() && !v.From.Before(v.Until) {
		r.faults.Add(line.Cell("valid_to").Pos, "valid_to %s does not lie after valid_from %s", source.Quote(v.WrittenTo), source.Quote(v.WrittenFrom))
	}
	return v
}
