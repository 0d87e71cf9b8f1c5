package render

import (
	"maps"
	"slices"
	"strings"

	"speedtrail/history/assessment"
)

// declarationIDs lists the request of each declaration, as pieces count them.
func declarationIDs(c *assessment.Computed) []string {
	var ids []string
	for _, q := range c.Requests {
		for range q.Declares {
			ids = append(ids, q.ID)
		}
	}
	return ids
}

// outside stands for the request where none declares a change.
const outside = "outside"

// declaredPart is a piece of a change and what holds it.
type declaredPart struct {
	text string
	by   int // declaration, as pieces count them; -1: none
}

// declaredParts says which requests hold a change; nothing where that was not
// looked at.
func declaredParts(c *assessment.Computed, r *assessment.Route, pieces int) []declaredPart {
	if c.Options.NoRequests {
		return nil
	}
	list := r.Pieces[pieces]
	if len(list) == 0 {
		return []declaredPart{{outside, -1}}
	}
	ids := declarationIDs(c)
	var parts []declaredPart
	for _, p := range list {
		text := outside
		if p.By >= 0 {
			text = ids[p.By]
		}
		if p.RunOut {
			text += " (run-out)"
		}
		if len(list) > 1 {
			text = minus(p.From) + " to " + minus(p.To) + " " + text
		}
		parts = append(parts, declaredPart{text, p.By})
	}
	return parts
}

// declaredWords says which requests hold a change in one text.
func declaredWords(c *assessment.Computed, r *assessment.Route, pieces int) string {
	var words []string
	for _, p := range declaredParts(c, r, pieces) {
		words = append(words, p.text)
	}
	return strings.Join(words, "; ")
}

// declaredFamily says which requests hold changes that differ only by the length of
// the train, and for which trains; empty where that was not looked at.
func declaredFamily(c *assessment.Computed, r *assessment.Route, f family) string {
	if c.Options.NoRequests {
		return ""
	}
	ids := declarationIDs(c)
	trains := map[string][]int{}
	for _, x := range f.all {
		var by, gaps []string
		for _, p := range r.Pieces[x.Pieces] {
			switch {
			case p.By < 0:
				gaps = append(gaps, "km "+minus(p.From)+" to "+minus(p.To))
			case !slices.Contains(by, ids[p.By]):
				by = append(by, ids[p.By])
			}
		}
		text := outside
		if len(by) > 0 {
			text = strings.Join(by, " and ")
			if len(gaps) > 0 { // a request that declares too little: where, is what counts
				text += ", " + outside + " at " + strings.Join(gaps, " and ")
			}
		}
		trains[text] = append(trains[text], x.Trains...)
	}
	words := slices.Sorted(maps.Keys(trains))
	if len(words) == 1 {
		return words[0]
	}
	for i, text := range words {
		slices.Sort(trains[text])
		words[i] = text + " (" + trainNames(c, slices.Compact(trains[text]), 6) + ")"
	}
	return strings.Join(words, "; ")
}

// isOutside tells whether some of a change is outside all declarations.
func isOutside(c *assessment.Computed, r *assessment.Route, pieces int) bool {
	if c.Options.NoRequests { // then there are no pieces
		return false
	}
	list := r.Pieces[pieces]
	return len(list) == 0 || slices.ContainsFunc(list, func(p assessment.Piece) bool { return p.By < 0 })
}

// weight is what a stretch is sorted by for a reviewer.
type weight struct {
	outside, raised, structure bool
	step                       int
}

// weigh looks at the changes of a group.
func weigh(c *assessment.Computed, g *group) weight {
	r := &c.Routes[g.drawn.Route]
	var w weight
	for _, k := range g.changes {
		x := &r.Changes[k]
		step := max(x.After-x.Before, x.Before-x.After)
		w.outside = w.outside || isOutside(c, r, x.Pieces)
		w.raised = w.raised || x.After > x.Before
		w.step = max(w.step, step)
		for _, list := range [...]int{x.BeforeSource, x.AfterSource} {
			for _, s := range r.Sources[list] {
				w.structure = w.structure || strings.HasPrefix(s.Kind, "axle load")
			}
		}
	}
	return w
}

// inReviewOrder sorts what needs eyes first to the front: outside all
// declarations, raised, on structures, by large steps.
func inReviewOrder(c *assessment.Computed, list []*group) {
	first := func(a, b bool) int {
		switch {
		case a == b:
			return 0
		case a:
			return -1
		}
		return 1
	}
	weights := map[*group]weight{}
	for _, g := range list {
		weights[g] = weigh(c, g)
	}
	slices.SortStableFunc(list, func(a, b *group) int {
		v, w := weights[a], weights[b]
		for _, order := range [...]int{first(v.outside, w.outside), first(v.raised, w.raised), first(v.structure, w.structure), w.step - v.step} {
			if order != 0 {
				return order
			}
		}
		return 0
	})
}
