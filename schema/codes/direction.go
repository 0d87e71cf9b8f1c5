// Package codes holds the closed value lists of the standard: directions,
// cant deficiency categories, other international train categories and axle
// load categories (SUBSET-026 issue 4.0.0, 7.5.1), with the names that they
// have in a data set.
//
//	codes.ParseAxleLoad("D4")         // 9, true
//	codes.CantDeficiency(3).Column()  // "cd150"
package codes

// Direction is a direction of travel: nominal with, reverse against the
// running distance of the track.
type Direction uint8

// The two directions, in the order in which results are given.
const (
	Nominal Direction = iota
	Reverse
)

// AllDirections lists both, nominal first.
var AllDirections = [...]Direction{Nominal, Reverse}

// String gives "nominal" or "reverse".
func (d Direction) String() string {
	if d == Reverse {
		return "reverse"
	}
	return "nominal"
}

// Directions is a set of directions of travel (SUBSET-026 Q_DIR without its
// spare value): one bit each, as 1 << Direction.
type Directions uint8

// The three sets that a row can be for.
const (
	OnlyNominal Directions = 1 << Nominal
	OnlyReverse Directions = 1 << Reverse
	Both                   = OnlyNominal | OnlyReverse
)

// Has tells whether d is in the set.
func (s Directions) Has(d Direction) bool { return s&(1<<d) != 0 }

// String gives "nominal", "reverse" or "both", the empty string for none.
func (s Directions) String() string {
	return [...]string{"", "nominal", "reverse", "both"}[s&Both]
}

// ParseDirections reads "nominal", "reverse" or "both".
func ParseDirections(s string) (Directions, bool) {
	for d := OnlyNominal; d <= Both; d++ {
		if s == d.String() {
			return d, true
		}
	}
	return 0, false
}
