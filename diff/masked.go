package diff

import (
	"speedtrail/diff/delta"
	"speedtrail/schema/unit"
)

// hidden gives the parts of the permanent changes, those that would be seen
// without temporary restrictions, that are not seen with them: where the
// observed speeds are equal, move in the other sense, or rise less far. A
// reduction that temporary restrictions deepen is seen.
//
// Both lists are in the order of the target's track.
func hidden(permanent, observed []delta.Delta) []delta.Delta {
	var list []delta.Delta
	add := func(p delta.Delta, from, to unit.Distance) {
		if from >= to {
			return
		}
		part := p
		part.Base, part.Target, part.Length = p.Base+from-p.Target, from, to-from
		if n := len(list) - 1; n >= 0 {
			last := &list[n]
			if last.Target+last.Length == part.Target && last.Base+last.Length == part.Base &&
				last.Before == part.Before && last.After == part.After && last.RunOut == part.RunOut {
				last.Length += part.Length
				return
			}
		}
		list = append(list, part)
	}
	k := 0
	for _, p := range permanent {
		at, end := p.Target, p.Target+p.Length
		for k < len(observed) && observed[k].Target+observed[k].Length <= at {
			k++
		}
		for i := k; i < len(observed) && observed[i].Target < end; i++ {
			o := observed[i]
			from, to := max(at, o.Target), min(end, o.Target+o.Length)
			add(p, at, from)
			raised := p.After > p.Before
			if raised != (o.After > o.Before) || raised && p.After > o.After {
				add(p, from, to)
			}
			at = to
		}
		add(p, at, end)
	}
	return list
}
