package diff

import (
	"bytes"
	"cmp"
	"path"
	"slices"
	"strings"

	"speedtrail/diff/rows"
	"speedtrail/diff/written"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
)

// File is a file that differs, with its differences row by row. Together, the
// differences of a file make the cells of the target's file from those of the
// base's: nothing that differs is missing.
type File struct {
	Base, Target string // paths, empty for a file that one side does not have
	Old, Now     []byte
	Tables       []written.Table // with the rows only that Rows names
	Rows         []RowDifference
	Note         Note
}

// Path is the path by which a file is known: the target's, if it has it.
func (f *File) Path() string { return cmp.Or(f.Target, f.Base) }

// Note says of a file what its rows do not.
type Note uint8

// The notes.
const (
	NoNote    Note = iota
	NewFile        // only the target has it
	GoneFile       // only the base has it
	OnlyMoved      // the same content in another folder
	OnlyBytes      // only line ends or a byte order mark differ
	OnlyForm       // no cell differs: comments, blank lines, quotes, the order of rows and columns
)

// RowDifference is a difference of rows and what came of it.
type RowDifference struct {
	Table int // index in File.Tables
	rows.Difference
	// Causes tells that changes, masked changes, or added or removed track
	// come of it. Reason says why nothing does.
	Causes, Masks, Track bool
	Reason               Reason
}

// Columns lists the names of the columns that differ, for an alteration.
func (f *File) Columns(d *RowDifference) []string {
	var list []string
	for _, c := range d.Cells {
		if name := f.Tables[d.Table].New.Columns[c.Column]; !slices.Contains(list, name) {
			list = append(list, name)
		}
	}
	return list
}

// Moved tells whether a row only lies elsewhere.
func (f *File) Moved(d *RowDifference) bool {
	columns := f.Columns(d)
	return d.Kind == rows.Altered && len(columns) > 0 && !slices.ContainsFunc(columns, func(c string) bool {
		return c != "from_km" && c != "to_km" && c != "km"
	})
}

// pairFiles pairs the files of both sides that differ. The files of a route
// whose folder was renamed are paired with what they were; those of routes are
// given to the routes, the others returned.
func pairFiles(routes []Route, base, target []schema.File) (frame []File) {
	// By folder: one that was a route's may be another's now.
	was, is := map[string]*Route{}, map[string]*Route{}
	for i := range routes {
		r := &routes[i]
		if r.Base != nil {
			was[r.Base.Folder] = r
		}
		if r.Target != nil {
			is[r.Target.Folder] = r
		}
	}
	for _, f := range pairs(base, target, was) {
		r := is[path.Dir(f.Target)]
		if f.Target == "" {
			r = was[path.Dir(f.Base)]
		}
		if r != nil {
			r.Files = append(r.Files, f)
		} else {
			frame = append(frame, f)
		}
	}
	byPath := func(a, b File) int {
		return cmp.Or(strings.Compare(a.Path(), b.Path()), strings.Compare(a.Base, b.Base))
	}
	for i := range routes {
		slices.SortFunc(routes[i].Files, byPath)
	}
	slices.SortFunc(frame, byPath)
	return frame
}

// pairs pairs the files that differ by their paths, those of a route by what its folder
// is called now; was has the routes of the base by their folders.
func pairs(base, target []schema.File, was map[string]*Route) (list []File) {
	now := map[string][]byte{}
	for _, f := range target {
		now[f.Path] = f.Content
	}
	paired := map[string]bool{}
	for _, f := range base {
		to, r := f.Path, was[path.Dir(f.Path)]
		if r != nil && r.Target != nil {
			to = r.Target.Folder + "/" + path.Base(f.Path)
		}
		content, ok := now[to]
		if gone := r != nil && r.Target == nil; !ok || gone || paired[to] {
			list = append(list, File{Base: f.Path, Old: f.Content, Note: GoneFile})
			continue
		}
		paired[to] = true
		if to != f.Path || !bytes.Equal(content, f.Content) {
			list = append(list, File{Base: f.Path, Target: to, Old: f.Content, Now: content})
		}
	}
	for _, f := range target {
		if !paired[f.Path] {
			list = append(list, File{Target: f.Path, Now: f.Content, Note: NewFile})
		}
	}
	return list
}

// account fills in the differences of a file. The tracks are those of its
// route.
func (f *File) account(base, target *chainage.Track) {
	if f.Base != "" && f.Target != "" && bytes.Equal(f.Old, f.Now) {
		f.Note = OnlyMoved
		return
	}
	f.Tables = written.Pair(f.Path(), f.Old, f.Now, base, target)
	for i := range f.Tables {
		for _, d := range rows.Compare(&f.Tables[i].Old, &f.Tables[i].New) {
			f.Rows = append(f.Rows, RowDifference{Table: i, Difference: d})
		}
	}
	if len(f.Rows) == 0 && f.Note == NoNote {
		f.Note = OnlyForm
		if bytes.Equal(plainBytes(f.Old), plainBytes(f.Now)) {
			f.Note = OnlyBytes
		}
	}
	f.forget()
}

// forget drops the rows of the tables that are in no difference, which are most
// of them and which nobody asks for.
func (f *File) forget() {
	kept := make([][2][]int, len(f.Tables)) // of each table and side, where a row now stands
	for i := range f.Tables {
		kept[i] = [2][]int{make([]int, len(f.Tables[i].Old.Rows)), make([]int, len(f.Tables[i].New.Rows))}
	}
	for i := range f.Rows {
		d := &f.Rows[i]
		for side, list := range [...][]int{d.Old, d.New} {
			for _, n := range list {
				kept[d.Table][side][n] = 1
			}
		}
	}
	for i := range f.Tables {
		for side, t := range [...]*rows.Table{&f.Tables[i].Old, &f.Tables[i].New} {
			var list []rows.Row
			for n, wanted := range kept[i][side] {
				if wanted == 1 {
					kept[i][side][n] = len(list)
					list = append(list, t.Rows[n])
				}
			}
			t.Rows = list
		}
	}
	for i := range f.Rows {
		d := &f.Rows[i]
		old, now := kept[d.Table][0], kept[d.Table][1]
		for k, n := range d.Old {
			d.Old[k] = old[n]
		}
		for k, n := range d.New {
			d.New[k] = now[n]
		}
		for k, c := range d.Cells {
			d.Cells[k].Old, d.Cells[k].New = old[c.Old], now[c.New]
		}
	}
}

// plainBytes takes the byte order mark and the carriage returns from a text.
func plainBytes(b []byte) []byte {
	return bytes.ReplaceAll(bytes.TrimPrefix(b, []byte("\xEF\xBB\xBF")), []byte("\r\n"), []byte("\n"))
}
