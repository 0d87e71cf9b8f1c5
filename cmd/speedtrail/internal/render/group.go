package render

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/history/assessment"
)

// group is the stretches of one place whose pictures differ only in how far the
// length of a train carries a change: one chart, that of the train for which it
// reaches furthest, serves them all. The table lists each of them.
type group struct {
	drawn   *assessment.Stretch
	trains  []int // indices in Computed.Trains, ascending
	changes []int // indices in Route.Changes, ascending
}

// groups arranges the stretches of a document, in their order.
func groups(c *assessment.Computed) []*group {
	var list []*group
	seen := map[string]*group{}
	for i := range c.Stretches.List {
		s := &c.Stretches.List[i]
		key := signature(&c.Routes[s.Route], s)
		g := seen[key]
		if g == nil || !overlap(g.drawn, s) {
			g = &group{drawn: s}
			seen[key] = g
			list = append(list, g)
		}
		if s.To-s.From > g.drawn.To-g.drawn.From {
			g.drawn = s
		}
		g.trains = append(g.trains, s.Trains...)
		g.changes = append(g.changes, s.Changes...)
	}
	for _, g := range list {
		slices.Sort(g.trains)
		slices.Sort(g.changes)
		g.trains, g.changes = slices.Compact(g.trains), slices.Compact(g.changes)
	}
	return list
}

// signature writes the changes of a stretch without their places.
func signature(r *assessment.Route, s *assessment.Stretch) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%d %s", s.Route, s.Direction)
	for _, k := range s.Changes {
		x := &r.Changes[k]
		if !x.RunOut { // run-out can begin or cease with the length
			fmt.Fprintf(&b, " %d>%d", x.Before, x.After)
		}
	}
	return b.String()
}

func overlap(a, b *assessment.Stretch) bool { return a.From < b.To && b.From < a.To }

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

// family is changes that differ only in how far the length of a train carries
// them: they begin or end at the same place, with the same speeds.
type family struct {
	first, last *assessment.Change // the ones that reach least and furthest
	trains      []int
	all         []*assessment.Change
}

// families gathers the changes of one direction of a route.
func families(changes []assessment.Change) []family {
	var list []family
	for i := range changes {
		x := &changes[i]
		k := slices.IndexFunc(list, func(f family) bool {
			return f.first.Before == x.Before && f.first.After == x.After && f.first.RunOut == x.RunOut &&
				(f.first.From == x.From || f.first.To == x.To)
		})
		if k < 0 {
			list = append(list, family{x, x, slices.Clone(x.Trains), []*assessment.Change{x}})
			continue
		}
		f := &list[k]
		f.trains = append(f.trains, x.Trains...)
		f.all = append(f.all, x)
		if x.Length > f.last.Length {
			f.last = x
		}
		if x.Length < f.first.Length {
			f.first = x
		}
	}
	for i := range list {
		slices.Sort(list[i].trains)
		list[i].trains = slices.Compact(list[i].trains)
	}
	return list
}

// between writes one position, or two between which it lies.
func between(a, b string) string {
	if a == b {
		return minus(a)
	}
	return minus(a) + " .. " + minus(b)
}

// because names the rows behind a change: one line where the same kind of cell
// in the same table has another value, else the rows before and after.
func because(before, after []assessment.Source) []string {
	if len(before) == 1 && len(after) == 1 && before[0].File == after[0].File && before[0].Kind == after[0].Kind {
		lines := fmt.Sprint(before[0].Line)
		if after[0].Line != before[0].Line {
			lines += " now " + fmt.Sprint(after[0].Line)
		}
		return []string{fmt.Sprintf("%s:%s %s, %d now %d", after[0].File, lines, after[0].Kind, before[0].Value, after[0].Value)}
	}
	var list []string
	for _, s := range before {
		list = append(list, "before "+s.Text())
	}
	for _, s := range after {
		list = append(list, "after "+s.Text())
	}
	return list
}
