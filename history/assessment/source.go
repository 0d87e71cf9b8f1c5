package assessment

import (
	"bytes"
	"path"
	"slices"
	"strings"

	"speedtrail/diff"
	"speedtrail/diff/lines"
	"speedtrail/schema"
)

// contextLines is how many equal lines surround a difference.
const contextLines = 2

// sourceFiles lists the files that differ, line by line. The files of a route
// whose folder was renamed are compared with what they were.
func sourceFiles(a *diff.Account, base, target []schema.File) []SourceFile {
	movedTo := map[string]string{}
	for _, r := range a.Routes {
		if r.Base != nil && r.Target != nil {
			movedTo[r.Base.Folder] = r.Target.Folder
		}
	}
	now := map[string][]byte{}
	for _, f := range target {
		now[f.Path] = f.Content
	}
	list := []SourceFile{}
	paired := map[string]bool{}
	for _, f := range base {
		to := f.Path
		if folder, ok := movedTo[path.Dir(f.Path)]; ok {
			to = folder + "/" + path.Base(f.Path)
		}
		content, ok := now[to]
		if !ok {
			list = append(list, sourceFile(f.Path, "", f.Content, nil))
			continue
		}
		paired[to] = true
		if to != f.Path || !bytes.Equal(content, f.Content) {
			list = append(list, sourceFile(f.Path, to, f.Content, content))
		}
	}
	for _, f := range target {
		if !paired[f.Path] {
			list = append(list, sourceFile("", f.Path, nil, f.Content))
		}
	}
	slices.SortFunc(list, func(a, b SourceFile) int { return strings.Compare(a.name(), b.name()) })
	return list
}

// name is the path by which a file is sorted.
func (f SourceFile) name() string {
	if f.Target != "" {
		return f.Target
	}
	return f.Base
}

func sourceFile(base, target string, old, now []byte) SourceFile {
	f := SourceFile{Base: base, Target: target, Hunks: []Hunk{}}
	for _, h := range lines.Hunks(string(old), string(now), contextLines) {
		hunk := Hunk{BaseLine: h.OldLine, TargetLine: h.NewLine}
		for _, l := range h.Lines {
			hunk.Lines = append(hunk.Lines, Line{Op: string(l.Op), Text: l.Text})
		}
		f.Hunks = append(f.Hunks, hunk)
	}
	switch {
	case base == "":
		f.Note = "new file"
	case target == "":
		f.Note = "file removed"
	case bytes.Equal(old, now):
		f.Note = "moved, content unchanged"
	case len(f.Hunks) == 0:
		f.Note = "only line ends or a byte order mark differ"
	case base != target:
		f.Note = "moved"
	}
	return f
}
