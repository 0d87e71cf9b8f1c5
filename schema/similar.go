package schema

import (
	"cmp"
	"path"
	"slices"
	"strings"

	"speedtrail/schema/source"
)

// mistyped records a file or folder whose name is nearly one that is read: it
// would hide data. Copies that editors leave behind are not meant.
func mistyped(faults *source.Collector, name, p string, known []string) bool {
	for _, ending := range []string{"~", ".bak", ".orig", ".rej", ".swp", ".tmp", ".lock"} {
		if strings.HasSuffix(name, ending) {
			return false
		}
	}
	for _, k := range known {
		if name != k && near(strings.ToLower(name), k) {
			faults.Add(source.Position{File: p}, "the name is nearly %s and is not read, a mistyped name would hide data", k)
			return true
		}
	}
	return false
}

// NearlyNamed tells whether an entry of a data set's folder has nearly the name of
// one that is read there, which Load refuses.
func NearlyNamed(name string, folder bool) bool {
	var faults source.Collector
	return mistyped(&faults, name, name, namesBeside(folder))
}

// namesBeside lists the names of what is read in a data set's folder.
func namesBeside(folder bool) []string {
	if folder {
		return []string{routesDir, requestsDir}
	}
	return []string{datasetFile, trainsFile, acceptedFile, signoffFile, signersFile}
}

// near tells whether two names differ in at most two letters, and in the ending in
// no more than one or two that change places.
func near(a, b string) bool {
	if a == b {
		return true
	}
	// Two notes for one table, such as speed.md, are no mistake.
	if x, y := path.Ext(a), path.Ext(b); x != y && distance(x, y) > 1 && !swapped(x, y) {
		return false
	}
	return distance(a, b) <= 2 && len(b) > 4
}

// swapped tells whether two letters beside each other have changed places.
func swapped(a, b string) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range len(a) - 1 {
		if a[i] != b[i] {
			return a[i] == b[i+1] && a[i+1] == b[i] && a[i+2:] == b[i+2:]
		}
	}
	return false
}

// Most names that Nearest gives, and the longest text that it looks at: names of
// more letters are not typed by hand.
const (
	mostNearest = 3
	longestNear = 200
)

// Nearest gives those of the known names that a mistyped one can have meant: the
// nearest, and others that are as near, at most three. One letter in three may differ, small and capital
// letters are the same, and one of which more or less than the whole was typed counts.
func Nearest(name string, known []string) []string {
	if name == "" || len(name) > longestNear {
		return nil
	}
	type near struct {
		name string
		off  int
	}
	typed := strings.ToLower(name)
	most := max(1, min(3, len([]rune(name))/3))
	var list []near
	for _, k := range known {
		if k == "" || len(k) > longestNear {
			continue
		}
		lower := strings.ToLower(k)
		off := distance(typed, lower)
		switch {
		case off > 1 && swapped(typed, lower):
			off = 1
		case off > most && min(len(typed), len(lower)) > 1 && (strings.HasPrefix(lower, typed) || strings.HasPrefix(typed, lower)):
			off = most
		}
		// What shares no letter with the other, such as 7 with 4, is no mistyped name.
		if off <= most && off < max(len([]rune(lower)), len([]rune(typed))) {
			list = append(list, near{k, off})
		}
	}
	slices.SortFunc(list, func(a, b near) int { return cmp.Or(cmp.Compare(a.off, b.off), strings.Compare(a.name, b.name)) })
	list = slices.Compact(list)
	var names []string
	for _, n := range list[:min(mostNearest, len(list))] {
		if n.off == list[0].off {
			names = append(names, n.name)
		}
	}
	return names
}

// distance is how many letters have to be added, left out or replaced to make one
// text of the other.
func distance(x, y string) int {
	a, b := []rune(x), []rune(y)
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		left, corner := i+1, i
		for j := range len(b) {
			cost := corner
			if a[i] != b[j] {
				cost = 1 + min(corner, row[j+1], left)
			}
			corner = row[j+1]
			row[j], left = left, cost
		}
		row[len(b)] = left
	}
	return row[len(b)]
}

// Meant words what a mistyped name can have meant, to follow a message; nothing where
// no known name is near.
func Meant(name string, known []string) string {
	near := Nearest(name, known)
	if len(near) == 0 {
		return ""
	}
	for i := range near {
		near[i] = source.Visible(near[i])
	}
	return "; did you mean " + strings.Join(near, " or ") + "?"
}
