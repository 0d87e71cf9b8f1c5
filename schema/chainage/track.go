package chainage

import (
	"errors"
	"fmt"
	"sort"

	"speedtrail/schema/unit"
)

// Jump is a joint at which the posts skip or repeat a length: Arriving is the
// chainage read coming up to it in the nominal direction, Leaving the one that
// continues from the same point.
type Jump struct {
	Arriving, Leaving unit.Distance
}

// Segment is a stretch of track between two joints, or the ends: from its
// first to its last chainage, and the running distance at its beginning.
type Segment struct {
	From, To unit.Distance // chainages; From < To
	Start    unit.Distance // running distance of From
}

// End gives the running distance at the segment's end.
func (s Segment) End() unit.Distance { return s.Start + s.To - s.From }

// Track is the chainage of a route. The zero Track is not valid; a Track does
// not change after NewTrack.
//
// Law: Locate(Begins(s)) == Locate(Ends(s)) == s for every running distance s
// from 0 to Length.
type Track struct {
	segments []Segment
}

// A JumpError says which jump of a route cannot be, or with Index -1 which end
// of the route: its start or, without Start, its end.
type JumpError struct {
	Index   int
	Start   bool
	Problem string
}

// Error gives the problem in words.
func (e *JumpError) Error() string { return e.Problem }

// NewTrack builds the track from start to end with the jumps in the order of
// the track. Every error is a *JumpError: a jump must lie strictly inside the
// route and past the one before it, its readings must differ, and the
// chainages of both ends must occur only once.
func NewTrack(start, end unit.Distance, jumps []Jump) (*Track, error) {
	t := &Track{segments: make([]Segment, 0, len(jumps)+1)}
	from, at := start, unit.Distance(0)
	for i, j := range jumps {
		if j.Arriving == j.Leaving {
			return nil, &JumpError{Index: i, Problem: "arriving_km and leaving_km are equal, a jump needs two different readings"}
		}
		if j.Arriving <= from {
			where := "start_km " + start.KM()
			if i > 0 {
				where = "leaving_km " + from.KM() + " of the jump before it"
			}
			return nil, &JumpError{Index: i, Problem: fmt.Sprintf("arriving_km %s does not lie after %s, jumps stand in the order of the track", j.Arriving.KM(), where)}
		}
		t.segments = append(t.segments, Segment{from, j.Arriving, at})
		at += j.Arriving - from
		from = j.Leaving
	}
	if end <= from {
		if len(jumps) == 0 {
			return nil, &JumpError{Index: -1, Problem: fmt.Sprintf("end_km %s does not lie after start_km %s", end.KM(), start.KM())}
		}
		return nil, &JumpError{Index: len(jumps) - 1, Problem: fmt.Sprintf("leaving_km %s does not lie before end_km %s", from.KM(), end.KM())}
	}
	t.segments = append(t.segments, Segment{from, end, at})
	for i, km := range [...]unit.Distance{start, end} {
		if t.Occurrences(km) > 1 {
			name := [...]string{"start_km", "end_km"}[i]
			return nil, &JumpError{Index: -1, Start: i == 0, Problem: fmt.Sprintf("%s %s occurs more than once on the route, both ends must be unique", name, km.KM())}
		}
	}
	return t, nil
}

// Segments lists the stretches between joints in the order of the track. The
// caller must not change them.
func (t *Track) Segments() []Segment { return t.segments }

// Length gives the running distance from start to end.
func (t *Track) Length() unit.Distance { return t.segments[len(t.segments)-1].End() }

// The ways in which a position is not on a track.
var (
	ErrOutside      = errors.New("outside the route")
	ErrMissingPosts = errors.New("among the missing posts of a chainage jump")
	ErrAmbiguous    = errors.New("ambiguous, posts repeat here")
	ErrNotRepeated  = errors.New("marked with # but occurs only once, write it without")
	ErrNoOccurrence = errors.New("an occurrence that does not exist")
)

// Locate gives the running distance of a position. A bare position that occurs
// more than once is ErrAmbiguous, one that occurs only once must not carry an
// occurrence. Both ends of a repeated stretch count as repeated.
func (t *Track) Locate(p Point) (unit.Distance, error) {
	n, at := 0, unit.Distance(0)
	outside := true
	for _, s := range t.segments {
		if p.Chainage < s.From || p.Chainage > s.To {
			continue
		}
		outside = false
		n++
		if n == 1 || n == p.Occurrence {
			at = s.Start + p.Chainage - s.From
		}
	}
	switch {
	case outside && t.spans(p.Chainage):
		return 0, ErrMissingPosts
	case outside:
		return 0, ErrOutside
	case n == 1 && p.Occurrence != 0:
		return 0, ErrNotRepeated
	case n > 1 && p.Occurrence == 0:
		return 0, ErrAmbiguous
	case p.Occurrence > n:
		return 0, ErrNoOccurrence
	}
	return at, nil
}

// Find is Locate for a position that was written for this or for another revision
// of the track: a first occurrence may be marked where nothing repeats.
func (t *Track) Find(p Point) (unit.Distance, error) {
	at, err := t.Locate(p)
	if errors.Is(err, ErrNotRepeated) && p.Occurrence == 1 {
		return t.Locate(p.Plain())
	}
	return at, err
}

// Skipped gives the jump among whose missing posts a chainage lies; false where it
// lies among none.
func (t *Track) Skipped(km unit.Distance) (Jump, bool) {
	for i, s := range t.segments[1:] {
		if j := (Jump{t.segments[i].To, s.From}); j.Arriving < km && km < j.Leaving {
			return j, true
		}
	}
	return Jump{}, false
}

// Occurrences counts the places along the track that read km.
func (t *Track) Occurrences(km unit.Distance) int {
	n := 0
	for _, s := range t.segments {
		if s.From <= km && km <= s.To {
			n++
		}
	}
	return n
}

// spans tells whether a chainage lies between two readings of the route.
func (t *Track) spans(km unit.Distance) bool {
	below, above := false, false
	for _, s := range t.segments {
		below = below || s.From < km
		above = above || s.To > km
	}
	return below && above
}

// Begins writes the point at running distance s, 0 to Length, as the beginning
// of a stretch: at a joint, with the leaving reading.
func (t *Track) Begins(s unit.Distance) Point {
	i := sort.Search(len(t.segments), func(i int) bool { return t.segments[i].End() > s })
	return t.point(min(i, len(t.segments)-1), s)
}

// Ends writes the point at running distance s, 0 to Length, as the end of a
// stretch: at a joint, with the arriving reading.
func (t *Track) Ends(s unit.Distance) Point {
	return t.point(sort.Search(len(t.segments), func(i int) bool { return t.segments[i].End() >= s }), s)
}

// point writes s as it reads in segment i, with the occurrence where it
// repeats.
func (t *Track) point(i int, s unit.Distance) Point {
	km := t.segments[i].From + s - t.segments[i].Start
	before, all := 0, 0
	for k, seg := range t.segments {
		if seg.From <= km && km <= seg.To {
			all++
			if k <= i {
				before++
			}
		}
	}
	if all == 1 {
		return Point{Chainage: km}
	}
	return Point{km, before}
}
