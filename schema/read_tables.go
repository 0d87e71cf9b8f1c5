package schema

import (
	"strconv"
	"strings"

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
	switch name {
	case "speed.csv":
		return speedColumns
	case "axle-load.csv":
		return axleLoadColumns
	case "temporary.csv":
		return temporaryColumns
	case "curves.csv":
		return curveColumns
	case "gradients.csv":
		return gradientColumns
	case "places.csv":
		return placeColumns
	}
	return nil
}

// definition is what a table of a route is: its file, its columns, and how its
// rows are read.
type definition[T any] struct {
	name              string
	columns, required []string
	// place: a row is a place, which may have no extent: its columns are km and
	// to_km.
	place bool
	row   func(r *reader, line cells, base Row) (T, bool)
	// common gives what the row has in common with those of all tables.
	common func(*T) *Row
	// together checks the rows together, once each of them is sound.
	together func(r *reader, route *Route, rows []T)
}

// cells are the cells of a row by the place of their column in the definition,
// which the table's header is looked up for once.
type cells struct {
	row    table.Row
	places []int
}

func (c cells) at(column int) table.Cell { return c.row.At(c.places[column]) }

// Places of columns in the definitions.
const (
	basicAt = 3
	cantAt  = 4
	otherAt = cantAt + codes.CantDeficiencies

	limitAt = 3

	idAt, speedAt, validFromAt, validToAt, reasonAt = 0, 4, 5, 6, 7

	radiusAt, cantMMAt, handAt = 2, 3, 4

	permilleAt = 2

	kindAt, nameAt, strikeInAt, warningAt = 3, 4, 5, 6
)

var (
	speedTable = &definition[SpeedRow]{
		name: "speed.csv", columns: speedColumns, required: []string{"from_km", "to_km", "basic"},
		row: (*reader).speedRow, common: func(x *SpeedRow) *Row { return &x.Row },
		together: func(r *reader, route *Route, _ []SpeedRow) {
			if len(route.Speed) == 0 {
				r.faults.Add(source.Position{File: route.Folder + "/speed.csv"}, "no row, the basic speed is always given (SUBSET-026 3.11.3.2.2)")
			} else if route.Track != nil {
				r.coverage(route)
			}
		},
	}
	axleLoadTable = &definition[AxleLoadRow]{
		name: "axle-load.csv", columns: axleLoadColumns, required: []string{"from_km", "to_km"},
		row: (*reader).axleLoadRow, common: func(x *AxleLoadRow) *Row { return &x.Row },
	}
	temporaryTable = &definition[TemporaryRow]{
		name: "temporary.csv", columns: temporaryColumns, required: []string{"from_km", "to_km", "id", "speed"},
		row: (*reader).temporaryRow, common: func(x *TemporaryRow) *Row { return &x.Row },
	}
	curveTable = &definition[CurveRow]{
		name: "curves.csv", columns: curveColumns, required: []string{"from_km", "to_km", "radius_m", "cant_mm"},
		row: (*reader).curveRow, common: func(x *CurveRow) *Row { return &x.Row },
		together: func(r *reader, route *Route, rows []CurveRow) { disjoint(r, route, rows, "curve", curveCommon) },
	}
	gradientTable = &definition[GradientRow]{
		name: "gradients.csv", columns: gradientColumns, required: []string{"from_km", "to_km", "permille"},
		row: (*reader).gradientRow, common: func(x *GradientRow) *Row { return &x.Row },
		together: func(r *reader, route *Route, rows []GradientRow) {
			disjoint(r, route, rows, "gradient", gradientCommon)
		},
	}
	placeTable = &definition[PlaceRow]{
		name: "places.csv", columns: placeColumns, required: []string{"km", "kind", "name"}, place: true,
		row: (*reader).placeRow, common: func(x *PlaceRow) *Row { return &x.Row },
	}
)

// tables reads the tables of a route.
func (r *reader) tables(route *Route, present *present) {
	k := r.kept
	if k == nil {
		k = &kept{}
	}
	speedTable.read(r, route, &route.Speed, &k.speed, present)
	axleLoadTable.read(r, route, &route.AxleLoad, &k.axleLoad, present)
	temporaryTable.read(r, route, &route.Temporary, &k.temporary, present)
	curveTable.read(r, route, &route.Curves, &k.curves, present)
	gradientTable.read(r, route, &route.Gradients, &k.gradients, present)
	placeTable.read(r, route, &route.Places, &k.places, present)
}

// read reads a table, if it is there, into rows. What is known of the version
// that was read before is made use of, and replaced.
func (d *definition[T]) read(r *reader, route *Route, rows *[]T, k *keptTable[T], present *present) {
	identity, ok := present.file(d.name)
	if !ok {
		return
	}
	if k.rows != nil && identity != "" && k.identity == identity {
		*rows = k.rows
		return
	}
	before := *k
	*k = keptTable[T]{}
	file := route.Folder + "/" + d.name
	content, ok := r.file(file, table.MaxTableSize)
	if !ok {
		return
	}
	if r.kept != nil && before.rows != nil {
		if now, ok := d.readAgain(r, route, rows, &before, content); ok {
			*k, k.identity = now, identity
			return
		}
	}
	count := r.faults.Count()
	r.seen = nil
	t := table.ReadCSV(file, content, d.columns, d.required, &r.faults)
	p := d.placesIn(t)
	*rows = d.rowsOf(r, route, t, p)
	if d.together != nil && !t.Broken {
		d.together(r, route, *rows)
	}
	if r.kept != nil && r.faults.Count() == count && route.Track != nil {
		*k = keptTable[T]{identity: identity, content: content, table: t.Bare(), places: p, rows: *rows}
	}
}

// places is where the columns of a table stand.
type places struct {
	own     []int // by the place of the column in the definition
	common  commonAt
	shifted shiftedAt
}

func (d *definition[T]) placesIn(t *table.CSV) *places {
	p := &places{own: make([]int, len(d.columns))}
	for i, c := range d.columns {
		p.own[i] = t.Place(c)
	}
	p.common = commonAt{from: t.Place("from_km"), to: t.Place("to_km"), direction: t.Place("direction"), delay: t.Place("train_length_delay"), note: t.Place("note"), place: d.place}
	if d.place {
		p.common.from = t.Place("km")
	}
	p.shifted = shiftedIn(t)
	return p
}

// rowsOf reads the rows of a table.
func (d *definition[T]) rowsOf(r *reader, route *Route, t *table.CSV, p *places) []T {
	if t.Len() == 0 {
		return nil
	}
	line := cells{places: p.own}
	rows := make([]T, 0, t.Len())
	for line.row = range t.Rows() {
		if r.decimalComma(t, line.row, &p.shifted) {
			t.Broken = true
			continue
		}
		before := r.faults.Count()
		base, good := r.row(route, line.row, &p.common)
		row, sound := d.row(r, line, base)
		if faulty := r.faults.Count() - before; faulty > 0 && r.twoCells(line.row, p.shifted.numbers) {
			r.faults.Drop(faulty) // they come of it
			good = false
		}
		rows = append(rows, row)
		if !good || !sound {
			t.Broken = true
		}
	}
	return rows
}

func (r *reader) axleLoadRow(line cells, base Row) (AxleLoadRow, bool) {
	row := AxleLoadRow{Row: base}
	for a := range codes.AxleLoad(codes.AxleLoads) {
		row.Limit[a] = r.optionalSpeed(line.at(limitAt+int(a)), a.String())
	}
	return row, true
}

func (r *reader) temporaryRow(line cells, base Row) (TemporaryRow, bool) {
	id, speed := line.at(idAt), line.at(speedAt)
	row := TemporaryRow{Row: base, ID: id.Text, Reason: line.at(reasonAt).Text}
	if row.ID == "" || len(row.ID) > 100 {
		r.faults.Add(id.Pos, "id %s is not a text of 1 to 100 bytes", source.Quote(row.ID))
	}
	if r.seen == nil {
		r.seen = map[string]source.Position{}
	}
	r.unique(r.seen, "temporary restriction", row.ID, id.Pos)
	row.Speed = r.speed(speed.Text, speed.Pos, "speed")
	row.Valid = r.validity(line.at(validFromAt), line.at(validToAt))
	return row, true
}

func (r *reader) curveRow(line cells, base Row) (CurveRow, bool) {
	hand := line.at(handAt)
	row := CurveRow{Row: base, Hand: hand.Text}
	row.RadiusM = r.wholeCell(line.at(radiusAt), "radius_m", 1, 1_000_000)
	row.CantMM = r.wholeCell(line.at(cantMMAt), "cant_mm", 0, 300)
	if h := row.Hand; h != "" && h != "left" && h != "right" {
		r.faults.Add(hand.Pos, "hand %s is none of left, right", source.Quote(h))
	}
	return row, true
}

func (r *reader) gradientRow(line cells, base Row) (GradientRow, bool) {
	c := line.at(permilleAt)
	n, ok := decimal(c.Text, 3)
	if !ok || n < -200_000 || n > 200_000 {
		r.faults.Add(c.Pos, "permille %s is not a number from -200 to 200 with at most three decimals", source.Quote(c.Text))
	}
	return GradientRow{Row: base, Slope: int(n)}, ok
}

func curveCommon(x *CurveRow) *Row       { return &x.Row }
func gradientCommon(x *GradientRow) *Row { return &x.Row }

// disjoint checks that no two rows of a table lie in one place.
func disjoint[T any](r *reader, route *Route, rows []T, what string, common func(*T) *Row) {
	if route.Track == nil {
		return
	}
	list := make([]*Row, len(rows))
	for i := range rows {
		list[i] = common(&rows[i])
	}
	r.disjoint(route, list, what)
}

func (r *reader) optionalSpeed(c table.Cell, column string) unit.Speed {
	if c.Text == "" {
		return 0
	}
	return r.speed(c.Text, c.Pos, column)
}

// speedRow reads a row of speed.csv.
func (r *reader) speedRow(line cells, base Row) (SpeedRow, bool) {
	row := SpeedRow{Row: base}
	before := r.faults.Count()
	if c := line.at(basicAt); c.Text == "" {
		r.faults.Add(c.Pos, "basic is blank, the basic speed is always given (SUBSET-026 3.11.3.2.2)")
	} else {
		row.Basic = r.speed(c.Text, c.Pos, "basic")
	}
	for c := range codes.CantDeficiency(codes.CantDeficiencies) {
		row.Cant[c] = r.optionalSpeed(line.at(cantAt+int(c)), c.Column())
	}
	for k := range codes.Category(codes.Categories) {
		speed, rule := line.at(otherAt+2*int(k)), line.at(otherAt+2*int(k)+1)
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
func (r *reader) placeRow(line cells, base Row) (PlaceRow, bool) {
	name, kind := line.at(nameAt), line.at(kindAt)
	row := PlaceRow{Row: base, Name: name.Text}
	if row.Name == "" {
		r.faults.Add(name.Pos, "name is blank")
	}
	switch k := PlaceKind(kind.Text); k {
	case Station, Crossing, Bridge, Tunnel, Junction, Signal, Other:
		row.Kind = k
	default:
		r.faults.Add(kind.Pos, "kind %s is none of station, crossing, bridge, tunnel, junction, signal, other", source.Quote(kind.Text))
	}
	for _, f := range []struct {
		column  string
		at      int
		places  int
		most    int64
		allowed string
		set     func(int64)
	}{
		{"strike_in_m", strikeInAt, 3, 50_000_000, "up to 50000 with at most 3 decimals", func(n int64) { row.StrikeIn = unit.Distance(n) }},
		{"warning_s", warningAt, 1, 6_000, "up to 600 with at most 1 decimal", func(n int64) { row.WarningDS = int(n) }},
	} {
		c := line.at(f.at)
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
	return row, true
}

func (r *reader) wholeCell(c table.Cell, column string, least, most int) int {
	n, err := strconv.Atoi(c.Text)
	if err != nil || n < least || n > most || strings.HasPrefix(c.Text, "+") {
		r.faults.Add(c.Pos, "%s %s is not a whole number from %d to %d", column, source.Quote(c.Text), least, most)
	}
	return n
}

// validity reads the time in which a temporary restriction is in force.
func (r *reader) validity(from, to table.Cell) Validity {
	v := Validity{WrittenFrom: from.Text, WrittenTo: to.Text}
	v.From = r.instant(from, "valid_from", false)
	v.Until = r.instant(to, "valid_to", true)
	if !v.From.IsZero() && !v.Until.IsZero() && !v.From.Before(v.Until) {
		r.faults.Add(to.Pos, "valid_to %s does not lie after valid_from %s", source.Quote(v.WrittenTo), source.Quote(v.WrittenFrom))
	}
	return v
}
