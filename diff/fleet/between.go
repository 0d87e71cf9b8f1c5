package fleet

import (
	"cmp"
	"slices"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/schema/unit"
)

// mostBetween bounds the lengths for which changes are listed beyond those that
// were asked for.
const mostBetween = 8

// LeftOut is what Between would show at more lengths than it is given for.
type LeftOut struct {
	Lengths  []unit.Distance // at which all of it would be seen, ascending
	From, To unit.Distance   // from the first to the last of it, on the target's track
}

// Same tells whether two accounts leave out the same.
func (l LeftOut) Same(m LeftOut) bool {
	return l.From == m.From && l.To == m.To && slices.Equal(l.Lengths, m.Lengths)
}

// sight is a change that trains of a kind see, as long as least to most in whole
// metres, where no length that was asked for does.
type sight struct {
	least, most unit.Distance
	kind        int
	at          align.Interval
}

// lengthsBetween gives the lengths, in whole metres, of trains that see a difference
// at from or further on, before to, where no length that was asked for does; longer
// than the shortest of those, up to the longest. The speed is the same between two
// ends of delayed rows behind a place, as it is for seenUntil.
func (p *pair) lengthsBetween(b, a unit.Speed, behindBefore, behindAfter []profile.Bound, from, to unit.Distance) []sight {
	shortest, longest := slices.Min(p.lengths), slices.Max(p.lengths)
	var list []sight
	asked := false
	i, k := firstBehind(behindBefore, from), firstBehind(behindAfter, from)
	for above := unit.Distance(0); above < longest; {
		// Trains longer than above, up to upTo, see the rows b and a.
		upTo := longest
		for _, rows := range [...][]profile.Bound{behindBefore[i:], behindAfter[k:]} {
			if len(rows) > 0 {
				upTo = min(upTo, from-rows[0].End)
			}
		}
		if b != a && upTo > above {
			asked = asked || slices.ContainsFunc(p.lengths, func(l unit.Distance) bool { return above < l && l < upTo+to-from })
			// Trains have whole metres. One that is a little too long here sees it
			// further on.
			least, most := max(above, shortest)/unit.Metre*unit.Metre+unit.Metre, upTo/unit.Metre*unit.Metre
			if most < least {
				most = least
			}
			if most <= longest && most < upTo+to-from {
				list = append(list, sight{least: least, most: most})
			}
		}
		for i < len(behindBefore) && from-behindBefore[i].End <= upTo {
			b = min(b, behindBefore[i].Speed)
			i++
		}
		for k < len(behindAfter) && from-behindAfter[k].End <= upTo {
			a = min(a, behindAfter[k].Speed)
			k++
		}
		above = upTo
	}
	if asked {
		return nil
	}
	return list
}

// chooseLengths finds the fewest lengths at which all sights are seen, and keeps
// those, up to mostBetween, at which most of them are. It gives, for each length,
// the places to look at, by kind.
func chooseLengths(sights []sight) (map[unit.Distance]map[int][]align.Interval, LeftOut) {
	sights = slices.Clone(sights)
	slices.SortStableFunc(sights, func(a, b sight) int { return cmp.Compare(a.most, b.most) })
	// By their longest trains, each sight that the length before does not show needs
	// one of its own, and that length shows as many of the rest as any would.
	var lengths []unit.Distance
	shown := map[unit.Distance]int{}
	for _, s := range sights {
		if n := len(lengths); n == 0 || lengths[n-1] < s.least {
			lengths = append(lengths, s.most)
		}
		shown[lengths[len(lengths)-1]]++
	}
	kept := slices.Clone(lengths)
	slices.SortStableFunc(kept, func(a, b unit.Distance) int { return shown[b] - shown[a] })
	kept = kept[:min(len(kept), mostBetween)]
	slices.Sort(kept)
	chosen := map[unit.Distance]map[int][]align.Interval{}
	var out LeftOut
	for _, s := range sights {
		within := func(list []unit.Distance) (unit.Distance, bool) {
			i, _ := slices.BinarySearch(list, s.least)
			if i == len(list) || list[i] > s.most {
				return 0, false
			}
			return list[i], true
		}
		length, ok := within(kept)
		if !ok {
			length, _ = within(lengths)
			if n := len(out.Lengths); n == 0 {
				out.From, out.To = s.at.From, s.at.To
			}
			if !slices.Contains(out.Lengths, length) {
				out.Lengths = append(out.Lengths, length)
			}
			out.From, out.To = min(out.From, s.at.From), max(out.To, s.at.To)
			continue
		}
		if chosen[length] == nil {
			chosen[length] = map[int][]align.Interval{}
		}
		chosen[length][s.kind] = append(chosen[length][s.kind], s.at)
	}
	for _, kinds := range chosen {
		for kind, list := range kinds {
			kinds[kind] = align.Union(list)
		}
	}
	slices.Sort(out.Lengths)
	return chosen, out
}
