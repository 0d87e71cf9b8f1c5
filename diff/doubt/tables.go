package doubt

import (
	"fmt"
	"strings"

	"speedtrail/diff/impact"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// speedRows looks at the categories of each element of the static speed
// profile.
func (c *check) speedRows() {
	for i := range c.route.Speed {
		row := &c.route.Speed[i]
		// A train of a higher category gets the speed of the highest category
		// at or below its own (SUBSET-026 3.11.3.2.3): a lower speed for a
		// higher category slows the better train.
		last, name := row.Basic, "basic"
		for k := range codes.CantDeficiency(codes.CantDeficiencies) {
			v := row.Cant[k]
			if v == 0 {
				continue
			}
			if v < last {
				c.add(CategoryOrder, &row.Row, fmt.Sprintf("%s is %d km/h, below the %d km/h of %s", k.Column(), v, last, name))
			}
			if v > last {
				last, name = v, k.Column()
			}
		}
	}
}

// mass is what a category admits: axle load in tenths of a tonne and mass per
// length in tenths of a tonne per metre. The categories of EN 15528 are from
// memory of its edition of 2021, table 1; D4XL is taken as D4 and HS17 as 17 t
// with little mass per length (common practice, no source). The figures only
// decide whether a question is asked.
var mass = map[string][2]int{
	"A": {160, 50}, "HS17": {170, 50}, "B1": {180, 50}, "B2": {180, 64}, "C2": {200, 64}, "C3": {200, 72}, "C4": {200, 80},
	"D2": {225, 64}, "D3": {225, 72}, "D4": {225, 80}, "D4XL": {225, 80}, "E4": {250, 80}, "E5": {250, 88},
}

// lighter tells whether a category is lighter than another in the one or the
// other respect and heavier in none. The categories are not strictly ordered.
func lighter(a, b codes.AxleLoad) bool {
	x, y := mass[a.String()], mass[b.String()]
	return x != y && x[0] <= y[0] && x[1] <= y[1]
}

// axleLoadRows looks at the order and the completeness of axle load rows.
func (c *check) axleLoadRows() {
	for i := range c.route.AxleLoad {
		row := &c.route.AxleLoad[i]
		for heavy := range codes.AxleLoad(codes.AxleLoads) {
			for light := range codes.AxleLoad(codes.AxleLoads) {
				h, l := row.Limit[heavy], row.Limit[light]
				if h != 0 && l != 0 && lighter(light, heavy) && h > l {
					c.add(AxleLoadOrder, &row.Row, fmt.Sprintf("%s may run at %d km/h, the lighter %s at %d km/h", heavy, h, light, l))
				}
			}
		}
		c.missing(row)
	}
}

// missing finds categories of reference trains that a row leaves out, although
// it restricts a category that is not heavier: they get no restriction at all
// (SUBSET-026 3.11.4.3, .3.1). A category that is lighter than all that the row
// restricts is left out for good reason.
func (c *check) missing(row *schema.AxleLoadRow) {
	var names []string
	for a := range codes.AxleLoad(codes.AxleLoads) {
		if row.Limit[a] != 0 {
			continue
		}
		lightest := true
		given := false
		for b := range codes.AxleLoad(codes.AxleLoads) {
			if row.Limit[b] != 0 {
				given = true
				lightest = lightest && lighter(a, b)
			}
		}
		if !given {
			c.add(AxleLoadMissing, &row.Row, "no speed for any category: the row restricts no train")
			return
		}
		if lightest {
			continue
		}
		for _, t := range c.trains {
			if t.AxleLoad == a {
				names = append(names, a.String()+" ("+t.ID+")")
				break
			}
		}
	}
	if len(names) > 0 {
		c.add(AxleLoadMissing, &row.Row, "no speed for "+strings.Join(names, ", ")+", which the row then does not restrict")
	}
}

// temporaryRows looks for temporary restrictions that do nothing.
func (c *check) temporaryRows() {
	for i := range c.route.Temporary {
		row := &c.route.Temporary[i]
		if !row.Valid.Until.IsZero() && !row.Valid.Until.After(c.at) {
			c.add(TemporaryExpired, &row.Row, fmt.Sprintf("%s, %d km/h, was valid to %s", row.ID, row.Speed, row.Valid.WrittenTo))
		}
		if highest := c.highest(&row.Row); row.Speed >= highest && highest > 0 && !c.holdsBehind(row, row.Speed) {
			c.add(TemporaryNoEffect, &row.Row, fmt.Sprintf("%s, %d km/h, is nowhere below the line speed, at most %d km/h here for any train", row.ID, row.Speed, highest))
		}
	}
}

// highest is the highest speed that speed.csv gives to any train anywhere on a
// row's stretch and in its directions.
func (c *check) highest(row *schema.Row) (highest unit.Speed) {
	for s := range c.speeds.on(row.Start, row.End) {
		if s.Directions&row.Directions == 0 {
			continue
		}
		for cant := range codes.CantDeficiency(codes.CantDeficiencies) {
			for set := range codes.CategorySet(codes.CategorySets) {
				highest = max(highest, profile.StaticSpeedOf(s, profile.Class{Cant: cant, Categories: set}))
			}
		}
	}
	return highest
}

// holdsBehind tells whether a restriction can hold a train, by its length, where it
// has left the stretch: the row of speed.csv that it ends in lets go of the train for
// its front, and a faster one lies within the longest reference train behind it.
func (c *check) holdsBehind(row *schema.TemporaryRow, v unit.Speed) bool {
	if !row.Delay {
		return false
	}
	for _, d := range codes.AllDirections {
		if !(row.Directions & c.route.Directions).Has(d) {
			continue
		}
		behind, last := row.Row, row.End-1
		behind.Directions, behind.Start, behind.End = 1<<d, row.End, min(row.End+c.longest(), c.route.Track.Length())
		if d == codes.Reverse {
			behind.Start, behind.End, last = max(row.Start-c.longest(), 0), row.Start, row.Start
		}
		for s := range c.speeds.on(last, last+1) {
			if s.Directions.Has(d) && !s.Delay && behind.Start < behind.End && c.highest(&behind) > v {
				return true
			}
		}
	}
	return false
}

// curves looks at the speeds on curves.
func (c *check) curves() {
	for i := range c.route.Curves {
		curve := &c.route.Curves[i]
		var slowest unit.Speed
		for row := range c.speeds.on(curve.Start, curve.End) {
			basic, given := basicFor(row)
			if given = given && impact.CantDeficiencyAbove(row.Basic, curve.RadiusM, curve.CantMM, basic.MM()); given {
				c.curveSpeed(row, curve, fmt.Sprintf("basic is %d km/h", row.Basic), row.Basic, basic)
			}
			for cat := range codes.CantDeficiency(codes.CantDeficiencies) {
				v := row.Cant[cat]
				// A column that repeats the basic speed says nothing more.
				if v > 0 && !(given && v == row.Basic) && impact.CantDeficiencyAbove(v, curve.RadiusM, curve.CantMM, cat.MM()) {
					c.curveSpeed(row, curve, fmt.Sprintf("%s is %d km/h", cat.Column(), v), v, cat)
				}
			}
			c.trainsOnCurve(row, curve)
			for _, t := range c.trains {
				v := min(profile.StaticSpeedOf(row, profile.ClassOf(t)), t.Max)
				if slowest == 0 || v < slowest {
					slowest = v
				}
			}
		}
		if limit := c.limits.CantExcessMM; limit > 0 && slowest > 0 && impact.CantExcessAbove(slowest, curve.RadiusM, curve.CantMM, limit) {
			c.add(CantExcess, &curve.Row, fmt.Sprintf("at %d km/h, the lowest line speed of a reference train, the cant of %d mm on %d m is an excess of %s mm; the limit of dataset.toml is %d mm",
				slowest, curve.CantMM, curve.RadiusM, hundredths(-impact.CantDeficiency(slowest, curve.RadiusM, curve.CantMM)), limit))
		}
	}
}

// basicFor gives the highest cant deficiency category that has the basic speed of a
// row: the one below the first with a speed of its own (SUBSET-026 3.11.3.2.3). What is
// too fast on a curve for that one is so for all. False where the lowest one has its own.
func basicFor(row *schema.SpeedRow) (highest codes.CantDeficiency, ok bool) {
	for cat := range codes.CantDeficiency(codes.CantDeficiencies) {
		if row.Cant[cat] != 0 {
			break
		}
		highest, ok = cat, true
	}
	return highest, ok
}

// trainsOnCurve looks at the speeds that reference trains have on a curve where no
// column by itself is too fast: by that of another category, or by the basic speed.
func (c *check) trainsOnCurve(row *schema.SpeedRow, curve *schema.CurveRow) {
	type reason struct {
		cant codes.CantDeficiency
		v    unit.Speed
	}
	var order []reason
	trains := map[reason][]string{}
	for _, t := range c.trains {
		v := min(profile.StaticSpeedOf(row, profile.ClassOf(t)), t.Max)
		basic, given := basicFor(row)
		byColumn := given && t.Cant <= basic && row.Basic == v && impact.CantDeficiencyAbove(v, curve.RadiusM, curve.CantMM, basic.MM())
		for cat := range t.Cant + 1 {
			byColumn = byColumn || row.Cant[cat] == v && impact.CantDeficiencyAbove(v, curve.RadiusM, curve.CantMM, cat.MM())
		}
		if byColumn || !impact.CantDeficiencyAbove(v, curve.RadiusM, curve.CantMM, t.Cant.MM()) {
			continue
		}
		x := reason{t.Cant, v}
		if trains[x] == nil {
			order = append(order, x)
		}
		trains[x] = append(trains[x], t.ID)
	}
	for _, x := range order {
		c.curveSpeed(row, curve, fmt.Sprintf("%d km/h for %s", x.v, strings.Join(trains[x], ", ")), x.v, x.cant)
	}
}

// curveSpeed adds that a speed in km/h asks for more cant deficiency than a category
// admits, where a row and a curve meet; says is whose speed it is.
func (c *check) curveSpeed(row *schema.SpeedRow, curve *schema.CurveRow, says string, v unit.Speed, cat codes.CantDeficiency) {
	from, to := max(row.Start, curve.Start), min(row.End, curve.End)
	c.list = append(c.list, named(Doubt{ID: CurveSpeed, Directions: row.Directions & c.route.Directions, From: from, To: to, Row: row.Pos, Text: fmt.Sprintf(
		"%s; on the curve of %d m with %d mm of cant (%s) that is a cant deficiency of %s mm, and %d mm carry %d km/h",
		says, curve.RadiusM, curve.CantMM, other, hundredths(impact.CantDeficiency(v, curve.RadiusM, curve.CantMM)), cat.MM(),
		impact.SpeedForCantDeficiency(curve.RadiusM, curve.CantMM, cat.MM()))}, place(curve.Pos.File, curve.Pos.Line)))
}

func place(file string, line int) string {
	return fmt.Sprintf("%s:%d", file[strings.LastIndexByte(file, '/')+1:], line)
}

// hundredths writes hundredths of a millimetre as millimetres.
func hundredths(n int64) string {
	sign := ""
	if n < 0 {
		sign, n = "-", -n
	}
	return fmt.Sprintf("%s%d.%02d", sign, n/100, n%100)
}
