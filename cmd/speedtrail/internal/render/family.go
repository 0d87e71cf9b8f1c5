package render

import (
	"slices"

	"speedtrail/history/assessment"
)

// family is changes with the same speeds, by the same rows, that begin or that end at
// one place: all of them share that end.
type family struct {
	from, to [2]*assessment.Change // those that begin first and last, that end first and last
	trains   []int
	all      []*assessment.Change
}

func (f *family) begin() bool { return f.from[0].Start == f.from[1].Start }
func (f *family) end() bool   { return endOf(f.to[0]) == endOf(f.to[1]) }

func endOf(x *assessment.Change) int64 { return x.Start + x.Length }

// families gathers the changes of one direction of a route.
func families(changes []assessment.Change) []family {
	var list []family
	byStep := map[step][]int{}
	for i := range changes {
		x := &changes[i]
		found := -1
		for _, k := range byStep[stepOf(x)] {
			f := &list[k]
			if f.begin() && f.from[0].Start == x.Start || f.end() && endOf(f.to[0]) == endOf(x) {
				found = k
				break
			}
		}
		if found < 0 {
			byStep[stepOf(x)] = append(byStep[stepOf(x)], len(list))
			list = append(list, family{[2]*assessment.Change{x, x}, [2]*assessment.Change{x, x}, slices.Clone(x.Trains), []*assessment.Change{x}})
			continue
		}
		f := &list[found]
		f.trains = append(f.trains, x.Trains...)
		f.all = append(f.all, x)
		if x.Start < f.from[0].Start {
			f.from[0] = x
		}
		if x.Start > f.from[1].Start {
			f.from[1] = x
		}
		if endOf(x) < endOf(f.to[0]) {
			f.to[0] = x
		}
		if endOf(x) > endOf(f.to[1]) {
			f.to[1] = x
		}
	}
	for i := range list {
		slices.Sort(list[i].trains)
		list[i].trains = slices.Compact(list[i].trains)
	}
	return list
}

// pictures finds the stretches that hold a change.
type pictures map[*assessment.Change][]*assessment.Stretch

func picturesOf(c *assessment.Computed) pictures {
	out := pictures{}
	for i := range c.Stretches.List {
		s := &c.Stretches.List[i]
		r := &c.Routes[s.Route]
		for _, k := range changesOf(r, s) {
			x := &r.Changes[k]
			out[x] = append(out[x], s)
		}
	}
	return out
}

// byLength tells whether the length of the train, and nothing else, puts the end that
// the changes of a family do not share where it is: for each train, the same rows
// govern beyond it. A row that binds two trains by the same cell does so at the same
// places, but for their lengths. A maximum speed ends no change at a place: where it
// binds, lower rows cease or do not.
func (p pictures) byLength(r *assessment.Route, f *family) bool {
	rows := func(source int) string {
		return assessment.SourceText(slices.DeleteFunc(slices.Clone(r.Sources[source]), func(s assessment.Source) bool { return s.Kind == "train" }))
	}
	first := ""
	for i, x := range f.all {
		if len(p[x]) == 0 {
			return false // no picture of it was made
		}
		at := endOf(x)
		if f.end() {
			at = x.Start
		}
		for k, s := range p[x] {
			b, a := beyond(s.Before, at, f.end()), beyond(s.After, at, f.end())
			if b == nil || a == nil {
				return false // the track ends here
			}
			if b.From != at && b.To != at && a.From != at && a.To != at {
				return false // no speed ends here, run-out begins or ceases
			}
			key := rows(b.Source) + "\n" + rows(a.Source)
			if i == 0 && k == 0 {
				first = key
			}
			if key != first {
				return false
			}
		}
	}
	return true
}

// beyond gives the step on one side of a place: with earlier, that before it.
func beyond(list []assessment.Step, at int64, earlier bool) *assessment.Step {
	for i := range list {
		s := &list[i]
		if earlier && s.From < at && at <= s.To || !earlier && s.From <= at && at < s.To {
			return s
		}
	}
	return nil
}
