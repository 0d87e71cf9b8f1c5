package render

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/history/assessment"
)

// Verdict says in a few sentences what decides, with its numbers.
func Verdict(d *assessment.Document) string { return strings.Join(verdictParts(d), " ") }

// verdictParts are the statements of the verdict, each about something else.
func verdictParts(d *assessment.Document) []string {
	c := &d.Computed
	var parts []string
	for _, f := range c.Findings {
		if f.ID == assessment.BaseNotAncestor && f.Text == assessment.Swapped {
			// It comes first, since it turns the sense of everything after it.
			parts = append(parts, "The target is part of the base's history: base and target were perhaps swapped.")
		}
	}
	parts = append(parts, changedSentence(c))
	for _, s := range []string{
		unseenSentence(c), maskedSentence(c), datesSentence(c), trackSentence(c), timeSentence(c), trainSentence(c), outsideSentence(c), findingSentence(c),
	} {
		if s != "" {
			parts = append(parts, s)
		}
	}
	return parts
}

// changedSentence says how many trains change, where and by how much at most.
func changedSentence(c *assessment.Computed) string {
	changed := 0
	for _, t := range c.Trains {
		if len(t.Routes) > 0 {
			changed++
		}
	}
	if changed == 0 {
		who := fmt.Sprintf("None of the %d reference trains is faster or slower", len(c.Trains))
		if len(c.Trains) == 1 {
			who = "The only reference train is neither faster nor slower"
		}
		where := fmt.Sprintf("the %d routes", targetRoutes(c))
		if targetRoutes(c) == 1 {
			where = "the only route"
		}
		common := ""
		if slices.ContainsFunc(c.Routes, func(r assessment.Route) bool { return len(r.Track) > 0 }) {
			common = ", where both revisions have the track" // other track has nothing to compare its speeds with
		}
		return fmt.Sprintf("%s anywhere on %s of the target%s.", who, where, common)
	}
	routes := 0
	for _, r := range c.Routes {
		if len(r.Changes) > 0 {
			routes++
		}
	}
	s := fmt.Sprintf("%d of %s %s on %d of %s", changed, plural(len(c.Trains), "train", "trains"),
		map[bool]string{true: "changes", false: "change"}[changed == 1], routes, plural(targetRoutes(c), "route", "routes"))
	return s + ": " + extremes(c, func(r *assessment.Route) []assessment.Change { return r.Changes }) + "."
}

// maskedSentence says what temporary restrictions hide.
func maskedSentence(c *assessment.Computed) string {
	s := extremes(c, func(r *assessment.Route) []assessment.Change { return r.Masked })
	if s == "" {
		return ""
	}
	return "Hidden today by temporary restrictions: " + s + "."
}

// targetRoutes counts the routes of the target.
func targetRoutes(c *assessment.Computed) int {
	n := c.EqualRoutes
	for _, r := range c.Routes {
		if r.Fate != "removed" {
			n++
		}
	}
	return n
}

// extremes words the largest raise and the largest reduction of one kind of
// changes; empty where there are none.
func extremes(c *assessment.Computed, of func(*assessment.Route) []assessment.Change) string {
	var parts []string
	for _, up := range []bool{true, false} {
		if e := extreme(c, of, up); e != "" {
			parts = append(parts, e)
		}
	}
	return strings.Join(parts, ", ")
}

// extreme words the largest raise or reduction.
func extreme(c *assessment.Computed, of func(*assessment.Route) []assessment.Change, up bool) string {
	var best *assessment.Change
	// Of all changes of that step and that length.
	var trains []int
	var routes []string
	size := func(x *assessment.Change) int {
		if up {
			return x.After - x.Before
		}
		return x.Before - x.After
	}
	for i := range c.Routes {
		list := of(&c.Routes[i])
		for k := range list {
			x := &list[k]
			if size(x) <= 0 {
				continue
			}
			switch {
			case best == nil || size(x) > size(best) || size(x) == size(best) && x.Length > best.Length:
				best, trains, routes = x, slices.Clone(x.Trains), []string{c.Routes[i].ID}
			case size(x) == size(best) && x.Length == best.Length:
				trains = append(trains, x.Trains...)
				if routes[len(routes)-1] != c.Routes[i].ID {
					routes = append(routes, c.Routes[i].ID)
				}
			}
		}
	}
	if best == nil {
		return ""
	}
	slices.Sort(trains)
	trains = slices.Compact(trains)
	return fmt.Sprintf("%s over %s km on %s (%s)", byUpTo(up, size(best)), km(best.Length), fewNames(routes, 3), trainNames(c, trains, 3))
}

// byUpTo words the largest raise or reduction, as findings do. "Down to" and a number
// would be read as the speed that is left.
func byUpTo(up bool, step int) string {
	if up {
		return fmt.Sprintf("raised by up to %d km/h", step)
	}
	return fmt.Sprintf("lowered by up to %d km/h", step)
}

// unseenSentence says what trains see that no reference train stands for, where it is
// a larger step than any reference train sees: without it the verdict names the
// smaller one as the largest.
func unseenSentence(c *assessment.Computed) string {
	var most [2]int // of reference trains: raise, reduction
	for _, r := range c.Routes {
		for _, x := range r.Changes {
			most[0], most[1] = max(most[0], x.After-x.Before), max(most[1], x.Before-x.After)
		}
	}
	var routes [2]string
	for i := range c.Fleet {
		f := &c.Fleet[i]
		for _, x := range f.Changes {
			if f.Permanent || !slices.ContainsFunc(x.Members, func(m assessment.FleetPart) bool { return !m.Represented }) {
				continue // without temporary restrictions, the sentence on what is hidden would have to say so
			}
			for k, step := range [2]int{x.After - x.Before, x.Before - x.After} {
				if step > most[k] {
					most[k], routes[k] = step, f.Route
				}
			}
		}
	}
	var parts []string
	if routes[0] != "" {
		parts = append(parts, byUpTo(true, most[0])+" on "+routes[0])
	}
	if routes[1] != "" {
		parts = append(parts, byUpTo(false, most[1])+" on "+routes[1])
	}
	if parts == nil {
		return ""
	}
	return "Trains that no reference train stands for: " + strings.Join(parts, ", ") + "."
}

func trackSentence(c *assessment.Computed) string {
	var added, removed int64
	for _, r := range c.Routes {
		for _, t := range r.Track {
			if t.Fate == "added" {
				added += t.Length
			} else {
				removed += t.Length
			}
		}
	}
	var words []string
	if added > 0 {
		words = append(words, km(added)+" km added")
	}
	if removed > 0 {
		words = append(words, km(removed)+" km removed")
	}
	if words == nil {
		return ""
	}
	return "Track, counted for each direction of travel: " + strings.Join(words, ", ") + "."
}

// timeSentence says by how much running times differ on routes where the train sees
// no change of speed: by the track that only one revision has, and its speeds.
func timeSentence(c *assessment.Computed) string {
	var most [2]int64 // longer, less long
	var trains [2][]int
	for i, r := range byTrackAlone(c) {
		k, by := 0, r.After-r.Before
		if by < 0 {
			k, by = 1, -by
		}
		switch {
		case by > most[k]:
			most[k], trains[k] = by, []int{i}
		case by == most[k]:
			trains[k] = append(trains[k], i)
		}
	}
	var parts []string
	for k, sign := range []int64{1, -1} {
		if most[k] > 0 {
			slices.Sort(trains[k])
			parts = append(parts, fmt.Sprintf("up to %s s (%s)", seconds(most[k]*sign), trainNames(c, slices.Compact(trains[k]), 3)))
		}
	}
	if parts == nil {
		return ""
	}
	return "Running time where the track differs: " + strings.Join(parts, ", ") + "."
}

func trainSentence(c *assessment.Computed) string {
	var words []string
	for _, fate := range []string{"added", "removed", "altered"} {
		var ids []string
		for _, t := range c.Trains {
			if t.Fate == fate {
				ids = append(ids, t.ID)
			}
		}
		if len(ids) > 0 {
			words = append(words, fate+" "+strings.Join(ids, ", "))
		}
	}
	if words == nil {
		return ""
	}
	return "Reference trains: " + strings.Join(words, "; ") + "."
}

// mostVerdictTrains is how long the clause about the first change outside may be with
// the trains in it.
const mostVerdictTrains = 120

// withoutTrains leaves the bracket with the trains out of a long clause; the finding
// itself names them. What follows the bracket stays.
func withoutTrains(what string) string {
	from, to := strings.Index(what, " ("), strings.LastIndexByte(what, ')')
	if Cells(what) <= mostVerdictTrains || from < 0 || to < from {
		return what
	}
	return what[:from] + what[to+1:]
}

// outsideSentence says how much lies outside what the requests declare.
func outsideSentence(c *assessment.Computed) string {
	outside, unseen, trains, first := 0, 0, 0, ""
	for _, f := range c.Findings {
		switch f.ID {
		case assessment.Outside:
			if outside++; outside == 1 {
				what, _ := cutTail(f.Text)
				what = withoutTrains(what)
				first = " First: " + findingPlace(f) + ", " + what + "."
			}
		case assessment.Unseen:
			unseen++
		case assessment.TrainsChanged:
			trains++
		}
	}
	var ids []string
	for _, q := range c.Requests {
		ids = append(ids, q.ID)
	}
	declared := "what " + strings.Join(ids, ", ") + " " + map[bool]string{true: "declares", false: "declare"}[len(ids) == 1]
	if len(ids) > 4 {
		declared = fmt.Sprintf("what the %d requests declare", len(ids))
	}
	var words []string
	switch {
	case c.Options.NoRequests:
		return "What requests declare was not looked at."
	case outside > 0 && len(ids) == 0:
		words = append(words, "No change request declares any of it."+first)
	case outside > 0:
		words = append(words, plural(outside, "change lies", "changes lie")+" outside "+declared+"."+first)
	case len(ids) > 0 && unseen == 0 && trains > 0:
		words = append(words, "Everything else is inside "+declared+".")
	case len(ids) > 0 && unseen == 0:
		words = append(words, "Everything is inside "+declared+".")
	}
	if trains > 0 && (outside == 0 || len(ids) > 0) {
		words = append(words, plural(trains, "reference train differs and is", "reference trains differ and are")+" not declared.")
	}
	if unseen > 0 {
		words = append(words, plural(unseen, "declaration is", "declarations are")+" not seen.")
	}
	return strings.Join(words, " ")
}

func findingSentence(c *assessment.Computed) string {
	open, accepted, old := 0, 0, 0
	for _, f := range c.Findings {
		switch {
		case f.Accepted != "":
			accepted++
		case f.AlsoInBase:
			old++
			fallthrough
		default:
			open++
		}
	}
	base := ""
	if old > 0 {
		base = fmt.Sprintf(" (%d also in the base)", old)
	}
	switch {
	case open > 0 && accepted > 0:
		return fmt.Sprintf("%s not accepted%s, %d accepted.", plural(open, "finding", "findings"), base, accepted)
	case open > 0:
		return plural(open, "finding", "findings") + " not accepted" + base + "."
	case accepted > 0:
		return plural(accepted, "finding", "findings") + ", all accepted."
	}
	return ""
}
