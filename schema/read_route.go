package schema

import (
	"errors"
	"fmt"
	"io/fs"
	"slices"
	"strings"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
	"speedtrail/schema/unit"
)

// maxDepth bounds how deep folders below a route's are searched for data that
// stands in the wrong place.
const maxDepth = 8

// route reads the folder of a route; nil where the route cannot be told.
func (r *reader) route(folder string) *Route {
	entries, err := fs.ReadDir(r.fsys, folder)
	if err != nil {
		r.err = err
		return nil
	}
	var here present
	for _, e := range entries {
		p := folder + "/" + e.Name()
		switch {
		case r.badName(e, p):
		case e.IsDir():
			if slices.Contains(routeFiles[:], e.Name()) {
				checkType(&r.faults, e, p, false)
			}
			r.noDataBelow(p, 1)
		case !checkType(&r.faults, e, p, false):
		case slices.Contains(routeFiles[:], e.Name()):
			here.add(e)
		case !isData(e.Name()) && mistyped(&r.faults, e.Name(), p, routeFiles[:]):
		case isData(e.Name()):
			r.faults.Add(source.Position{File: p}, "unknown file, a route has %s; another name would hide data", strings.Join(routeFiles[:], ", "))
		}
	}
	identity, ok := here.file(routeFile)
	if !ok {
		r.faults.Add(source.Position{File: folder + "/" + routeFile}, "the file is missing, every folder in routes/ is a route")
		return nil
	}
	route := r.keptRoute(folder, identity)
	known := route != nil
	if !known {
		// The tables are read all the same, for their faults.
		route = &Route{Folder: folder, Directions: codes.Both}
	}
	if _, ok := here.file("speed.csv"); !ok {
		r.faults.Add(source.Position{File: folder + "/speed.csv"}, "the file is missing, the basic speed is always given (SUBSET-026 3.11.3.2.2)")
	}
	r.tables(route, &here)
	if !known {
		return nil
	}
	return route
}

// present are the files of a route that are there, in the order of routeFiles.
type present [7]struct {
	here     bool
	identity string
}

func (p *present) add(e fs.DirEntry) {
	i := slices.Index(routeFiles[:], e.Name())
	p[i].here, p[i].identity = true, identityOf(e)
}

// file tells whether a file is there, and its identity.
func (p *present) file(name string) (identity string, here bool) {
	f := &p[slices.Index(routeFiles[:], name)]
	return f.identity, f.here
}

func identityOf(e fs.DirEntry) string {
	if id, ok := e.(Identified); ok {
		return id.Identity()
	}
	return ""
}

// noDataBelow records tables and TOML files, and links, in folders where the
// data set has none; depth is that of dir, 1 for the first.
func (r *reader) noDataBelow(dir string, depth int) {
	entries, err := fs.ReadDir(r.fsys, dir)
	if err != nil {
		r.err = err
		return
	}
	for _, e := range entries {
		p := dir + "/" + e.Name()
		switch {
		case r.badName(e, p):
		case e.IsDir() && depth < maxDepth:
			r.noDataBelow(p, depth+1)
		case e.IsDir():
			r.faults.Add(source.Position{File: p}, "folders are nested more than %d deep", maxDepth)
		case checkType(&r.faults, e, p, false) && isData(e.Name()):
			r.faults.Add(source.Position{File: p}, "a table or TOML file in a folder where none is read, it would hide data")
		}
	}
}

// badName records a folder, table or TOML file whose name cannot be written in a
// report. Other files are left alone.
func (r *reader) badName(e fs.DirEntry, p string) bool {
	problem := table.TextProblem(e.Name())
	if problem == "" || !e.IsDir() && !isData(e.Name()) {
		return false
	}
	r.faults.Add(source.Position{File: p}, "the name is %s", problem)
	return true
}

// isRouteID tells whether a text is made of up to 100 letters, digits, '-', '_'
// and '.'.
func isRouteID(s string) bool { return madeOf(s, 100, "-_.", true) }

// madeOf tells whether a text is made of ASCII letters, digits and some other
// characters, one at least and most at most. (Compiling a regular expression
// would cost every start of the program more than all names of a data set do.)
func madeOf(s string, most int, others string, capitals bool) bool {
	for i := range len(s) {
		switch c := s[i]; {
		case 'a' <= c && c <= 'z', '0' <= c && c <= '9', capitals && 'A' <= c && c <= 'Z':
		case strings.IndexByte(others, c) < 0:
			return false
		}
	}
	return s != "" && len(s) <= most
}

// routeTOML reads route.toml; nil where the track cannot be told.
func (r *reader) routeTOML(folder string) *Route {
	m, ok := r.toml(folder+"/"+routeFile, true)
	if !ok {
		return nil
	}
	route := &Route{Folder: folder, Pos: m.Place("id"), ID: m.Text("id", true), Name: m.Text("name", true), Directions: codes.Both}
	r.id = valuePlace(m, "id")
	if route.ID != "" && !isRouteID(route.ID) {
		r.faults.Add(r.id, "route id %s is not made of up to 100 letters, digits, '-', '_' and '.'", source.Quote(route.ID))
	}
	before := r.faults.Count()
	start, end := r.chainageOf(m, "start_km"), r.chainageOf(m, "end_km")
	route.StartPos, route.EndPos = m.Place("start_km"), m.Place("end_km")
	jumps := m.Tables("jump")
	if len(jumps) > MaxJumps {
		r.faults.Add(m.Place("jump"), "%d chainage jumps, at most %d are allowed", len(jumps), MaxJumps)
		jumps = nil
	}
	list := make([]chainage.Jump, len(jumps))
	for i, j := range jumps {
		list[i] = chainage.Jump{Arriving: r.chainageOf(j, "arriving_km").Chainage, Leaving: r.chainageOf(j, "leaving_km").Chainage}
		route.Jumps = append(route.Jumps, JumpRow{j.Pos, list[i]})
		j.Finish()
	}
	r.directions(m, route)
	m.Finish()
	if r.faults.Count() > before {
		return nil
	}
	track, err := chainage.NewTrack(start.Chainage, end.Chainage, list)
	var jump *chainage.JumpError
	if errors.As(err, &jump) {
		at := route.EndPos
		switch {
		case jump.Index >= 0:
			at = route.Jumps[jump.Index].Pos
		case jump.Start:
			at = route.StartPos
		}
		r.faults.Add(at, "%s", jump.Problem)
		return nil
	}
	route.Track = track
	return route
}

// directions reads the directions of travel that a route is used in.
func (r *reader) directions(m table.Reader, route *Route) {
	if m.Get("directions") == nil {
		return
	}
	before := r.faults.Count()
	route.Directions = 0
	for _, v := range m.Texts("directions") {
		d, ok := codes.ParseDirections(v.Text)
		if !ok || d == codes.Both {
			r.faults.Add(v.Pos, "direction %s is none of nominal, reverse", source.Quote(v.Text))
			continue
		}
		if route.Directions&d != 0 {
			r.faults.Add(v.Pos, "direction %s stands twice", source.Quote(v.Text))
			continue
		}
		route.Directions |= d
	}
	if route.Directions == 0 && r.faults.Count() == before {
		r.faults.Add(valuePlace(m, "directions"), `directions names none, write ["nominal"] or ["reverse"], or leave it out for both`)
	}
}

// chainageOf reads a chainage that carries no occurrence.
func (r *reader) chainageOf(m table.Reader, key string) chainage.Point {
	if v := m.Get(key); v != nil && v.Mark != "" {
		r.faults.Add(v.Pos, "%s is a chainage without an occurrence, and %s is taken for a comment: take it away, or put a blank before it", key, v.Mark)
		return chainage.Point{}
	}
	p := r.pointOf(m, key)
	if p.Occurrence != 0 {
		r.faults.Add(valuePlace(m, key), "%s is a chainage without an occurrence", key)
	}
	return p
}

// pointOf reads a position: a number, or a text where it needs an occurrence.
func (r *reader) pointOf(m table.Reader, key string) chainage.Point {
	v := m.Get(key)
	if v == nil {
		r.faults.Add(m.Pos, "%s is missing", key)
		return chainage.Point{}
	}
	if v.Kind != table.NumberKind && v.Kind != table.StringKind {
		r.faults.Add(v.Pos, "%s is %s, a position in kilometres is needed", key, v.Kind)
		return chainage.Point{}
	}
	if v.Mark != "" {
		// Else the first place that reads so, or an ambiguous one, would be taken.
		written := v.Text + v.Mark
		r.faults.Add(v.Pos, "%s %s needs quotes, without them %s is a comment: write %s = %s", key, source.Visible(written), v.Mark, key, source.Quote(written))
		return chainage.Point{}
	}
	p, err := chainage.ParsePoint(strings.TrimSpace(v.Text))
	if err != nil {
		r.faults.Add(v.Pos, "%s %s is %s", key, source.Quote(v.Text), pointProblem(err))
	}
	return p
}

// pointProblem words why a text is no position.
func pointProblem(err error) string {
	if errors.Is(err, chainage.ErrOccurrence) {
		return "no position, " + err.Error()
	}
	return err.Error()
}

// locate gives the running distance of a position on a route's track, and
// records why there is none.
func (r *reader) locate(route *Route, p chainage.Point, c table.Cell, column string) (at unit.Distance, ok bool) {
	if route.Track == nil {
		return 0, false
	}
	at, err := route.Track.Locate(p)
	if err == nil {
		return at, true
	}
	r.faults.Add(c.Pos, "%s %s is %s", column, source.Quote(c.Text), LocationProblem(route.Track, p, err))
	return 0, false
}

// LocationProblem words why a position is not on a track, and what can be written in
// its place.
func LocationProblem(t *chainage.Track, p chainage.Point, err error) string {
	segments := t.Segments()
	switch {
	case errors.Is(err, chainage.ErrOutside):
		return fmt.Sprintf("%v, which runs from %s to %s", err, segments[0].From.KM(), segments[len(segments)-1].To.KM())
	case errors.Is(err, chainage.ErrMissingPosts):
		if j, ok := t.Skipped(p.Chainage); ok {
			return fmt.Sprintf("%v: from %s the posts go on at %s", err, j.Arriving.KM(), j.Leaving.KM())
		}
	case errors.Is(err, chainage.ErrAmbiguous):
		return err.Error() + ": write " + readings(p, t)
	case errors.Is(err, chainage.ErrNoOccurrence):
		return err.Error() + ": there are " + readings(p, t)
	}
	return err.Error()
}

// readings lists the ways in which a repeated chainage is written.
func readings(p chainage.Point, t *chainage.Track) string {
	list := make([]string, min(t.Occurrences(p.Chainage), 9))
	for i := range list {
		list[i] = chainage.Point{Chainage: p.Chainage, Occurrence: i + 1}.String()
	}
	return strings.Join(list, " or ")
}
