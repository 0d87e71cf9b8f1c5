package schema

import (
	"path"
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

// distance is how many letters have to be added, left out or replaced to make one
// text of the other.
func distance(a, b string) int {
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
