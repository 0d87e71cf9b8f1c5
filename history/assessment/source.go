package assessment

import (
	"cmp"
	"slices"
	"strings"

	"speedtrail/diff"
	"speedtrail/diff/lines"
	"speedtrail/diff/rows"
	"speedtrail/schema/parallel"
)

// contextLines is how many equal lines surround a difference.
const contextLines = 2

// sourceFiles lists the files that differ, row by row and line by line. places
// gives, for each route, the indices of its files in the list.
func sourceFiles(a *diff.Account) (list []SourceFile, places [][]int) {
	type ref struct {
		file         *diff.File
		route, place int
	}
	var refs []ref
	for i := range a.Frame {
		refs = append(refs, ref{&a.Frame[i], -1, i})
	}
	places = make([][]int, len(a.Routes))
	for i := range a.Routes {
		files := a.Routes[i].Files
		places[i] = make([]int, len(files))
		for k := range files {
			refs = append(refs, ref{&files[k], i, k})
		}
	}
	slices.SortFunc(refs, func(x, y ref) int {
		return cmp.Or(strings.Compare(x.file.Path(), y.file.Path()), strings.Compare(x.file.Base, y.file.Base))
	})
	list = make([]SourceFile, len(refs))
	for i, r := range refs {
		if r.route >= 0 {
			places[r.route][r.place] = i
		}
	}
	parallel.Each(len(refs), func(i int) { list[i] = sourceFile(refs[i].file) })
	return list, places
}

var notes = map[diff.Note]string{
	diff.NewFile: "new file", diff.GoneFile: "file removed", diff.OnlyMoved: "moved, content unchanged",
	diff.OnlyBytes: "only line ends or a byte order mark differ",
	diff.OnlyForm:  "no cell differs: comments, blank lines, quotes or the order of rows and columns",
}

func sourceFile(f *diff.File) SourceFile {
	out := SourceFile{Base: f.Base, Target: f.Target, Hunks: []Hunk{}, Rows: []RowDiff{}, Note: notes[f.Note]}
	if f.Note == diff.NoNote && f.Base != f.Target {
		out.Note = "moved"
	}
	for _, h := range lines.Hunks(string(f.Old), string(f.Now), contextLines) {
		hunk := Hunk{BaseLine: h.OldLine, TargetLine: h.NewLine}
		for _, l := range h.Lines {
			hunk.Lines = append(hunk.Lines, Line{Op: string(l.Op), Text: l.Text})
		}
		out.Hunks = append(out.Hunks, hunk)
	}
	for i := range f.Rows {
		out.Rows = append(out.Rows, rowDiff(f, &f.Rows[i]))
	}
	return out
}

// rowDiff writes a difference of rows.
func rowDiff(f *diff.File, d *diff.RowDifference) RowDiff {
	t := &f.Tables[d.Table]
	out := RowDiff{Kind: d.Kind.String(), Table: t.Name, Reason: d.Reason.String(), Effect: "none", BaseLines: []int{}, TargetLines: []int{}, Cells: []CellDiff{}}
	if f.Moved(d) {
		out.Kind = "moved"
	}
	switch {
	case d.Causes:
		out.Effect = "changes"
	case d.Track:
		out.Effect = "track"
	case d.Masks:
		out.Effect = "hidden"
	}
	for _, i := range d.Old {
		out.BaseLines = append(out.BaseLines, t.Old.Rows[i].Line)
	}
	for _, i := range d.New {
		out.TargetLines = append(out.TargetLines, t.New.Rows[i].Line)
	}
	switch d.Kind {
	case rows.Added:
		for _, i := range d.New {
			for c, cell := range t.New.Rows[i].Cells {
				if cell != "" {
					out.Cells = append(out.Cells, CellDiff{Column: t.New.Columns[c], After: cell, TargetLine: t.New.Rows[i].Line})
				}
			}
		}
	case rows.Removed:
		for _, i := range d.Old {
			for c, cell := range t.Old.Rows[i].Cells {
				if cell != "" {
					out.Cells = append(out.Cells, CellDiff{Column: t.Old.Columns[c], Before: cell, BaseLine: t.Old.Rows[i].Line})
				}
			}
		}
	default:
		for _, c := range d.Cells {
			old, now := &t.Old.Rows[c.Old], &t.New.Rows[c.New]
			out.Cells = append(out.Cells, CellDiff{Column: t.New.Columns[c.Column], Before: old.Cells[c.Column], After: now.Cells[c.Column], BaseLine: old.Line, TargetLine: now.Line})
		}
	}
	return out
}
