package render

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/history/assessment"
)

// group is the stretches of one place on which trains see the same steps by the same
// rows, one of them wherever the others do, if further: one chart, that of the train
// for which it reaches furthest, serves them all. The table lists each of them.
type group struct {
	drawn   *assessment.Stretch
	trains  []int // indices in Computed.Trains, ascending
	changes []int // indices in Route.Changes, ascending
}

// groups arranges the stretches of a document, in their order.
func groups(c *assessment.Computed) []*group {
	var list []*group
	seen := map[string][]*group{}
	for i := range c.Stretches.List {
		s := &c.Stretches.List[i]
		r := &c.Routes[s.Route]
		key := signature(r, s)
		var g *group
		for _, x := range seen[key] {
			if within(r, s, x.drawn) {
				g = x
				break
			}
			if within(r, x.drawn, s) {
				g = x
				g.drawn = s
				break
			}
		}
		if g == nil {
			g = &group{drawn: s}
			seen[key] = append(seen[key], g)
			list = append(list, g)
		}
		g.trains = append(g.trains, s.Trains...)
		g.changes = append(g.changes, changesOf(r, s)...)
	}
	for _, g := range list {
		slices.Sort(g.trains)
		slices.Sort(g.changes)
		g.trains, g.changes = slices.Compact(g.trains), slices.Compact(g.changes)
	}
	return list
}

// changesOf lists the changes that the trains of a stretch see there. The stretch names
// those of its first train: others see the same steps by the same rows, and what is
// declared, or a cause, can still make theirs other changes of the document.
func changesOf(r *assessment.Route, s *assessment.Stretch) []int {
	var list []int
	for k := range r.Changes {
		x := &r.Changes[k]
		if x.Direction == s.Direction && x.Start >= s.From && endOf(x) <= s.To &&
			slices.ContainsFunc(x.Trains, func(t int) bool { return slices.Contains(s.Trains, t) }) {
			list = append(list, k)
		}
	}
	return list
}

// signature writes the changes of a stretch without their places: with the rows that
// govern before and after, and what they come of.
func signature(r *assessment.Route, s *assessment.Stretch) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%d %s", s.Route, s.Direction)
	for _, k := range s.Changes {
		if x := &r.Changes[k]; !x.RunOut { // run-out can begin or cease with the length
			fmt.Fprintf(&b, " %v", stepOf(x))
		}
	}
	return b.String()
}

// step is what two changes have in common that differ in their places and trains only.
type step struct {
	before, after, beforeSource, afterSource, cause int
	runOut                                          bool
}

func stepOf(x *assessment.Change) step {
	return step{x.Before, x.After, x.BeforeSource, x.AfterSource, x.Cause, x.RunOut}
}

// within tells whether the chart of one stretch serves another one of the same
// signature: it reaches as far on both sides, each change shares an end with its own,
// and it has each run-out.
func within(r *assessment.Route, s, drawn *assessment.Stretch) bool {
	if s.From < drawn.From || s.To > drawn.To {
		return false
	}
	split := func(s *assessment.Stretch) (changes, runOuts []*assessment.Change) {
		for _, k := range s.Changes {
			if x := &r.Changes[k]; x.RunOut {
				runOuts = append(runOuts, x)
			} else {
				changes = append(changes, x)
			}
		}
		return changes, runOuts
	}
	changes, runOuts := split(s)
	ownChanges, ownRunOuts := split(drawn)
	for i, x := range changes {
		if y := ownChanges[i]; x.From != y.From && x.To != y.To {
			return false
		}
	}
	for _, x := range runOuts {
		if !slices.ContainsFunc(ownRunOuts, func(y *assessment.Change) bool { return stepOf(x) == stepOf(y) }) {
			return false
		}
	}
	return true
}

// trainsOf lists the trains of a change that belong to a group.
func (g *group) trainsOf(x *assessment.Change) []int {
	var list []int
	for _, t := range x.Trains {
		if slices.Contains(g.trains, t) {
			list = append(list, t)
		}
	}
	return list
}

// because names the rows behind a change: one line where the same kind of cell
// in the same table has another value, else the rows before and after.
func because(before, after []assessment.Source) []string {
	if len(before) == 1 && len(after) == 1 && before[0].File == after[0].File && before[0].Kind == after[0].Kind {
		lines := fmt.Sprint(before[0].Line)
		if after[0].Line != before[0].Line {
			lines += " now " + fmt.Sprint(after[0].Line)
		}
		return []string{fmt.Sprintf("%s:%s %s: %d now %d km/h", after[0].File, lines, kindWords(after[0].Kind), before[0].Value, after[0].Value)}
	}
	var list []string
	for _, s := range before {
		list = append(list, "before "+sourceWords(s))
	}
	for _, s := range after {
		list = append(list, "after "+sourceWords(s))
	}
	return list
}
