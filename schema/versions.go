package schema

import (
	"bytes"
	"io/fs"
	"slices"
	"time"

	"speedtrail/schema/common"
	"speedtrail/schema/table"
)

// Versions reads versions of routes, one after the other. Of each route it keeps
// the version that it read last: of the next one only the files that differ are
// read, and of their tables only the lines that differ. What it gives is what
// Load gives. It is not safe for concurrent use.
type Versions struct {
	zone   *time.Location
	reuse  bool
	routes map[string]*kept // by folder
	rows   int              // of all of them
	most   int              // of rows
}

// NewVersions reads bare dates in a time zone; nil is UTC. It keeps at most so
// many rows, of some 200 bytes each.
func NewVersions(zone *time.Location, rows int) *Versions {
	if zone == nil {
		zone = time.UTC
	}
	return &Versions{zone: zone, routes: map[string]*kept{}, most: rows}
}

// Reusing makes Read write the rows of a version in place of those of the one
// before it, and gives v: a route is good until the next version of its folder is
// read, and whoever wants it for longer takes a Clone.
func (v *Versions) Reusing() *Versions {
	v.reuse = true
	return v
}

// Read reads a route's folder. Where it is faulty, the error is a
// *source.Faults; else it is an error of fsys. The route shares tables with other
// versions: it must not be changed.
func (v *Versions) Read(fsys fs.FS, folder string) (*Route, error) {
	k := v.routes[folder]
	if k == nil {
		k = &kept{}
	}
	v.rows -= k.size()
	delete(v.routes, folder)
	r := &reader{fsys: fsys, zone: v.zone, kept: k, reuse: v.reuse}
	route := r.route(folder)
	if r.err != nil {
		return nil, r.err
	}
	if err := r.faults.Err(); err != nil {
		return nil, err
	}
	if k.size() > v.most {
		return route, nil
	}
	if v.rows += k.size(); v.rows > v.most {
		// Full: begin anew, as everything can be read again.
		clear(v.routes)
		v.rows = k.size()
	}
	v.routes[folder] = k
	return route, nil
}

// kept is the version of a route that was read last, as far as it is sound.
type kept struct {
	identity  string // of route.toml
	route     Route  // what that says
	speed     keptTable[SpeedRow]
	axleLoad  keptTable[AxleLoadRow]
	temporary keptTable[TemporaryRow]
	curves    keptTable[CurveRow]
	gradients keptTable[GradientRow]
	places    keptTable[PlaceRow]
}

func (k *kept) size() int {
	return 1 + len(k.speed.rows) + len(k.axleLoad.rows) + len(k.temporary.rows) + len(k.curves.rows) + len(k.gradients.rows) + len(k.places.rows)
}

// keptRoute reads route.toml, or takes what it said in the version before. Where
// that was something else, nothing else of that version is of use.
func (r *reader) keptRoute(folder, identity string) *Route {
	if r.kept == nil {
		return r.routeTOML(folder)
	}
	if identity != "" && r.kept.identity == identity {
		route := r.kept.route
		return &route
	}
	*r.kept = kept{}
	route := r.routeTOML(folder)
	if route != nil && r.faults.Count() == 0 {
		r.kept.identity, r.kept.route = identity, *route
	}
	return route
}

// keptTable is a table of the version that was read last; rows is nil where
// there is none, or none that is of use.
type keptTable[T any] struct {
	identity string
	content  []byte
	table    *table.CSV // its columns
	places   *places
	rows     []T
}

// readAgain reads a table that was kept in another version: the lines that both
// have at the beginning and at the end are not read again. It is false where
// anything is out of the ordinary; then before is of no use any more.
func (d *definition[T]) readAgain(r *reader, route *Route, rows *[]T, before *keptTable[T], content []byte) (keptTable[T], bool) {
	old := before.content
	// In quotes, a line may not be a row.
	if bytes.IndexByte(content, '"') >= 0 || bytes.IndexByte(old, '"') >= 0 {
		return keptTable[T]{}, false
	}
	head := commonLines(old, content)
	first := 1 + bytes.Count(content[:head], newline)
	if first <= before.table.Header.Line {
		return keptTable[T]{}, false
	}
	tail := commonEnd(old[head:], content[head:])
	oldLines := bytes.Count(old[head:len(old)-tail], newline)
	middle := content[head : len(content)-tail]
	shift := bytes.Count(middle, newline) - oldLines
	scratch := &reader{zone: r.zone}
	t := before.table.More(middle, first, &scratch.faults)
	between := d.rowsOf(scratch, route, t, before.places)
	if t.Broken || scratch.faults.Count() > 0 {
		return keptTable[T]{}, false
	}
	// Rows up to the first differing line, and from the first common one after it.
	from, to := 0, 0
	for ; from < len(before.rows) && d.common(&before.rows[from]).Pos.Line < first; from++ {
	}
	for to = from; to < len(before.rows) && d.common(&before.rows[to]).Pos.Line < first+oldLines; to++ {
	}
	all := before.rows
	if !r.reuse {
		all = slices.Clone(all)
	}
	all = slices.Replace(all, from, to, between...)
	if len(all) == 0 || len(all) > table.MaxRows {
		return keptTable[T]{}, false
	}
	if shift != 0 {
		for i := from + len(between); i < len(all); i++ {
			d.common(&all[i]).Pos.Line += shift
		}
	}
	*rows = all
	if d.together != nil {
		d.together(scratch, route, all)
	}
	if scratch.faults.Count() > 0 || !uniqueIDs(all) {
		*rows = nil
		return keptTable[T]{}, false
	}
	return keptTable[T]{content: content, table: before.table, places: before.places, rows: all}, true
}

// uniqueIDs tells of temporary restrictions whether no id stands twice.
func uniqueIDs[T any](rows []T) bool {
	list, ok := any(rows).([]TemporaryRow)
	if !ok {
		return true
	}
	seen := make(map[string]bool, len(list))
	for i := range list {
		if seen[list[i].ID] {
			return false
		}
		seen[list[i].ID] = true
	}
	return true
}

var newline = []byte("\n")

// commonLines gives the length of the whole lines that two texts have in common
// at their beginning.
func commonLines(a, b []byte) int {
	n := common.Start(a, b)
	return bytes.LastIndexByte(a[:n], '\n') + 1
}

// commonEnd gives the length of the whole lines that two texts have in common at
// their end; what comes before them begins at the beginning of a line.
func commonEnd(a, b []byte) int {
	n := common.End(a, b)
	if n == len(a) && n == len(b) {
		return n
	}
	// The line at which they part does not count.
	end := a[len(a)-n:]
	i := bytes.IndexByte(end, '\n')
	if i < 0 {
		return 0
	}
	return n - i - 1
}
