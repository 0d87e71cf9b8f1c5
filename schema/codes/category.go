package codes

import (
	"strconv"
	"strings"
)

// CantDeficiency is a cant deficiency category, 0 to 10 (SUBSET-026
// NC_CDDIFF, NC_CDTRAIN). A higher number admits more cant deficiency.
type CantDeficiency uint8

// CantDeficiencies is how many categories there are.
const CantDeficiencies = 11

var cantDeficiencyMM = [CantDeficiencies]int{80, 100, 130, 150, 165, 180, 210, 225, 245, 275, 300}

// MM gives the cant deficiency of the category in millimetres.
func (c CantDeficiency) MM() int { return cantDeficiencyMM[c] }

// Column gives the name of the category's column in speed.csv, as "cd150".
func (c CantDeficiency) Column() string { return cantDeficiencyColumns[c] }

var cantDeficiencyColumns = func() (names [CantDeficiencies]string) {
	for c, mm := range cantDeficiencyMM {
		names[c] = "cd" + strconv.Itoa(mm)
	}
	return names
}()

// CantDeficiencyOf finds the category of exactly mm millimetres.
func CantDeficiencyOf(mm int) (CantDeficiency, bool) {
	for c, have := range cantDeficiencyMM {
		if have == mm {
			return CantDeficiency(c), true
		}
	}
	return 0, false
}

// Category is one of the "other" international train categories, 0 to 2
// (SUBSET-026 NC_DIFF).
type Category uint8

// The other categories.
const (
	FreightP  Category = iota // freight train braked in P position
	FreightG                  // freight train braked in G position
	Passenger                 // passenger train
)

// Categories is how many other categories there are.
const Categories = 3

var categoryNames = [Categories]string{"freight_p", "freight_g", "passenger"}

// String gives the name that the category has in a data set.
func (c Category) String() string { return categoryNames[c] }

// ParseCategory finds a category by its name in a data set.
func ParseCategory(s string) (Category, bool) {
	for c, name := range categoryNames {
		if name == s {
			return Category(c), true
		}
	}
	return 0, false
}

// CategorySet is a set of other categories: one bit each, as 1 << Category. A
// train has any number of them (SUBSET-026 3.11.3.3.2).
type CategorySet uint8

// CategorySets is how many sets there are, the empty one included.
const CategorySets = 1 << Categories

// Has tells whether c is in the set.
func (s CategorySet) Has(c Category) bool { return s&(1<<c) != 0 }

// With returns the set with c in it.
func (s CategorySet) With(c Category) CategorySet { return s | 1<<c }

// String lists the categories of the set in their order, joined by ", ".
func (s CategorySet) String() string {
	var names []string
	for c := range Category(Categories) {
		if s.Has(c) {
			names = append(names, c.String())
		}
	}
	return strings.Join(names, ", ")
}

// AxleLoad is an axle load category, 0 to 12 (SUBSET-026 M_AXLELOADCAT; the
// letters as in EN 15528). The order of the numbers is not an order of how
// heavy a train is on a structure.
type AxleLoad uint8

// AxleLoads is how many axle load categories there are.
const AxleLoads = 13

var axleLoadNames = [AxleLoads]string{"A", "HS17", "B1", "B2", "C2", "C3", "C4", "D2", "D3", "D4", "D4XL", "E4", "E5"}

// String gives the name of the category, which is also its column in
// axle-load.csv.
func (a AxleLoad) String() string { return axleLoadNames[a] }

// ParseAxleLoad finds a category by its name.
func ParseAxleLoad(s string) (AxleLoad, bool) {
	for a, name := range axleLoadNames {
		if name == s {
			return AxleLoad(a), true
		}
	}
	return 0, false
}
