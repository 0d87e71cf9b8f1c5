// Package chainage turns what stands on the posts beside the track into
// distances along the track, and back.
//
// Posts skip or repeat a length where a line was realigned. A Track is a row
// of segments in which the chainage grows steadily; at the joint between two
// of them one point of the track has two readings. A position is therefore a
// chainage and, where posts repeat, an occurrence:
//
//	31.180#2   the second place along the track that reads 31.180
//
// Lengths of trains and of stretches follow the running distance, which counts
// from 0 at the start of the track and knows no jump.
package chainage

import (
	"errors"
	"strconv"
	"strings"

	"speedtrail/schema/unit"
)

// Point is a position as it is written: a chainage and an occurrence, from 1
// in the order of the track; 0 where none is written.
type Point struct {
	Chainage   unit.Distance
	Occurrence int
}

// MaxOccurrence bounds the occurrences that are read.
const MaxOccurrence = 99

// ErrOccurrence says what may follow the "#" of a position.
var ErrOccurrence = errors.New("after # stands the occurrence, a whole number from 1 to " + strconv.Itoa(MaxOccurrence))

// ParsePoint reads a position such as "12.4", "-0.350" or "31.180#2".
func ParsePoint(s string) (Point, error) {
	km, occurrence, marked := strings.Cut(s, "#")
	d, err := unit.ParseKM(km)
	if err != nil || !marked {
		return Point{Chainage: d}, err
	}
	n, err := strconv.ParseUint(occurrence, 10, 8)
	if err != nil || n < 1 || n > MaxOccurrence {
		return Point{}, ErrOccurrence
	}
	return Point{d, int(n)}, nil
}

// Plain gives the position without the mark of a first occurrence: with and without
// it, two revisions mean the same point where only one of them repeats the posts.
func (p Point) Plain() Point {
	if p.Occurrence == 1 {
		p.Occurrence = 0
	}
	return p
}

// String writes the position as it is read, with three to six decimals.
func (p Point) String() string {
	if p.Occurrence == 0 {
		return p.Chainage.KM()
	}
	return p.Chainage.KM() + "#" + strconv.Itoa(p.Occurrence)
}
