package diff

import (
	"cmp"
	"encoding/binary"
	"path"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/diff/rows"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Cause is a difference of the source that a change comes of.
type Cause struct {
	File, Row int // indices in Route.Files and File.Rows
}

// causeTable finds the differences behind the changes of a route.
type causeTable struct {
	route *Route
	// byLine finds the differences of the tables that hold speeds: side (0 the
	// base), layer and line of a row.
	byLine map[rowPlace][]Cause
	// track are the differences of route.toml that alter the track, joints the
	// places on the target's track where it is not that of the base.
	track   []Cause
	joints  []unit.Distance
	effects map[effectKey]bool
	known   map[changeKey]int
	lists   map[string]int
}

type rowPlace struct {
	side, line int
	layer      profile.Layer
}

type effectKey struct {
	Cause
	direction codes.Direction
	class     profile.Class
}

type changeKey struct {
	before, after int
	direction     codes.Direction
	class         profile.Class
	near          bool
}

// layerOf gives the layer that a table of a route holds.
func layerOf(file string) (profile.Layer, bool) {
	switch path.Base(file) {
	case "speed.csv":
		return profile.StaticSpeed, true
	case "axle-load.csv":
		return profile.AxleLoad, true
	case "temporary.csv":
		return profile.Temporary, true
	}
	return 0, false
}

func newCauseTable(r *Route) causeTable {
	t := causeTable{route: r, byLine: map[rowPlace][]Cause{}, effects: map[effectKey]bool{}, known: map[changeKey]int{}, lists: map[string]int{}}
	for i := range r.Files {
		f := &r.Files[i]
		layer, ok := layerOf(f.Path())
		for k := range f.Rows {
			d, cause := &f.Rows[k], Cause{i, k}
			if !ok {
				if path.Base(f.Path()) == "route.toml" && altersTrack(f, d) {
					t.track = append(t.track, cause)
				}
				continue
			}
			for _, n := range d.Old {
				place := rowPlace{0, f.Tables[d.Table].Old.Rows[n].Line, layer}
				t.byLine[place] = append(t.byLine[place], cause)
			}
			for _, n := range d.New {
				place := rowPlace{1, f.Tables[d.Table].New.Rows[n].Line, layer}
				t.byLine[place] = append(t.byLine[place], cause)
			}
		}
	}
	return t
}

// altersTrack tells whether a difference of route.toml is one of the track.
func altersTrack(f *File, d *RowDifference) bool {
	if f.Tables[d.Table].Name == "jump" {
		return true
	}
	return d.Kind != rows.Altered || slices.ContainsFunc(f.Columns(d), func(c string) bool {
		return c == "start_km" || c == "end_km" || c == "directions"
	})
}

// of gives the index in Route.Causes of the differences behind a change: those
// whose old row governs before, or whose new row governs after, as far as they
// give this class of trains another restriction. A run-out across a place where
// the track differs comes of that as well, and so does a change that none of the
// rows explains.
func (t *causeTable) of(c *Change, class profile.Class, length unit.Distance) int {
	key := changeKey{c.BeforeSources, c.AfterSources, c.Direction, class, c.RunOut && t.jointBehind(c, length)}
	if i, ok := t.known[key]; ok {
		return i
	}
	i := t.index(t.behind([2][]profile.Source{t.route.Sources[c.BeforeSources], t.route.Sources[c.AfterSources]}, c.Direction, class, key.near))
	t.known[key] = i
	return i
}

// behind lists the differences behind a change of which the governing rows before and
// after are given, in the order of files and rows. near: the track differs behind it.
func (t *causeTable) behind(governing [2][]profile.Source, d codes.Direction, class profile.Class, near bool) []Cause {
	var list []Cause
	for side, sources := range governing {
		for _, s := range sources {
			for _, cause := range t.byLine[rowPlace{side, s.Pos.Line, s.Layer}] {
				if s.Layer != profile.TrainSpeed && !slices.Contains(list, cause) && t.hasEffect(cause, d, class) {
					list = append(list, cause)
				}
			}
		}
	}
	if len(list) == 0 || near {
		list = append(list, t.track...)
	}
	slices.SortFunc(list, func(a, b Cause) int { return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Row, b.Row)) })
	return list
}

// jointBehind tells whether the track differs behind a change, no further than
// the rear of a train can be.
func (t *causeTable) jointBehind(c *Change, length unit.Distance) bool {
	from, to := c.From-length, c.From
	if c.Direction == codes.Reverse {
		from, to = c.To, c.To+length
	}
	return slices.ContainsFunc(t.joints, func(j unit.Distance) bool { return from <= j && j <= to })
}

// index gives the place of a list in Route.Causes.
func (t *causeTable) index(list []Cause) int {
	var key []byte
	for _, c := range list {
		key = binary.AppendVarint(binary.AppendVarint(key, int64(c.File)), int64(c.Row))
	}
	i, ok := t.lists[string(key)]
	if !ok {
		i = len(t.route.Causes)
		t.lists[string(key)] = i
		t.route.Causes = append(t.route.Causes, list)
	}
	return i
}

// hasEffect tells whether the old rows of a difference restrict a class of
// trains otherwise than the new ones.
func (t *causeTable) hasEffect(c Cause, d codes.Direction, class profile.Class) bool {
	f := &t.route.Files[c.File]
	layer, ok := layerOf(f.Path())
	if !ok {
		return false
	}
	// Of the class, a row sees only what its layer looks at.
	switch layer {
	case profile.StaticSpeed:
		class.AxleLoad = 0
	case profile.AxleLoad:
		class.Cant, class.Categories = 0, 0
	case profile.Temporary:
		class = profile.Class{}
	}
	key := effectKey{c, d, class}
	if effect, ok := t.effects[key]; ok {
		return effect
	}
	row := &f.Rows[c.Row]
	old := bindings(t.route.Base, layer, linesOf(f.Tables[row.Table].Old.Rows, row.Old), d, class)
	now := bindings(t.route.Target, layer, linesOf(f.Tables[row.Table].New.Rows, row.New), d, class)
	effect := !slices.Equal(old, now)
	t.effects[key] = effect
	return effect
}

// haveEffect tells whether the old rows of several differences of one table
// together restrict a class of trains otherwise than the new ones.
func (t *causeTable) haveEffect(list []Cause, d codes.Direction, class profile.Class) bool {
	if len(list) == 1 {
		return t.hasEffect(list[0], d, class)
	}
	f := &t.route.Files[list[0].File]
	layer, ok := layerOf(f.Path())
	if !ok {
		return false
	}
	var lines [2][]int
	for _, c := range list {
		row := &f.Rows[c.Row]
		lines[0] = append(lines[0], linesOf(f.Tables[row.Table].Old.Rows, row.Old)...)
		lines[1] = append(lines[1], linesOf(f.Tables[row.Table].New.Rows, row.New)...)
	}
	return !slices.Equal(bindings(t.route.Base, layer, lines[0], d, class), bindings(t.route.Target, layer, lines[1], d, class))
}

func linesOf(list []rows.Row, indices []int) []int {
	lines := make([]int, len(indices))
	for i, n := range indices {
		lines[i] = list[n].Line
	}
	return lines
}

// binding is how a row restricts a class of trains.
type binding struct {
	from, to chainage.Point
	delay    bool
	speed    unit.Speed
}

// bindings lists how rows restrict a class in a direction of travel, in the
// order of the track; rows that continue each other count as one.
func bindings(r *schema.Route, layer profile.Layer, lines []int, d codes.Direction, class profile.Class) []binding {
	if r == nil {
		return nil
	}
	type placed struct {
		binding
		start, end unit.Distance
	}
	var all []placed
	for _, line := range lines {
		row, v := rowOf(r, layer, line, class)
		if row != nil && v != 0 && row.Directions.Has(d) {
			all = append(all, placed{binding{row.From.Plain(), row.To.Plain(), row.Delay, v}, row.Start, row.End})
		}
	}
	slices.SortFunc(all, func(a, b placed) int {
		return cmp.Or(cmp.Compare(a.start, b.start), cmp.Compare(a.end, b.end), cmp.Compare(a.speed, b.speed), cmp.Compare(delayed(a.delay), delayed(b.delay)))
	})
	var list []binding
	for _, p := range all {
		b := p.binding
		if n := len(list); n > 0 && list[n-1].to == b.from && list[n-1].delay == b.delay && list[n-1].speed == b.speed {
			list[n-1].to = b.to
			continue
		}
		list = append(list, b)
	}
	return list
}

func delayed(delay bool) int {
	if delay {
		return 1
	}
	return 0
}

// rowOf finds the row of a layer that stands in a line, and the speed that it
// gives to a class. Rows stand in the order of their lines.
func rowOf(r *schema.Route, layer profile.Layer, line int, class profile.Class) (*schema.Row, unit.Speed) {
	switch layer {
	case profile.StaticSpeed:
		if i, ok := slices.BinarySearchFunc(r.Speed, line, func(row schema.SpeedRow, line int) int { return cmp.Compare(row.Pos.Line, line) }); ok {
			return &r.Speed[i].Row, profile.StaticSpeedOf(&r.Speed[i], class)
		}
	case profile.AxleLoad:
		if i, ok := slices.BinarySearchFunc(r.AxleLoad, line, func(row schema.AxleLoadRow, line int) int { return cmp.Compare(row.Pos.Line, line) }); ok {
			return &r.AxleLoad[i].Row, r.AxleLoad[i].Limit[class.AxleLoad]
		}
	case profile.Temporary:
		if i, ok := slices.BinarySearchFunc(r.Temporary, line, func(row schema.TemporaryRow, line int) int { return cmp.Compare(row.Pos.Line, line) }); ok {
			return &r.Temporary[i].Row, r.Temporary[i].Speed
		}
	}
	return nil, 0
}

// anyRow finds the row of a layer that stands in a line.
func anyRow(r *schema.Route, layer profile.Layer, line int) *schema.Row {
	row, _ := rowOf(r, layer, line, profile.Class{})
	return row
}
