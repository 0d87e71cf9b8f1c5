package render

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/diff"
	"speedtrail/history/assessment"
)

// fleetTitle names an account of the whole fleet.
func fleetTitle(f *assessment.Fleet) string {
	s := f.Route + " " + f.Direction
	if f.Permanent {
		s += ", when no temporary restriction is in force"
	}
	return s
}

// fleetStatement is the sentence that holds for every train.
func fleetStatement(f *assessment.Fleet) string {
	end := ""
	if f.Permanent {
		end = " then"
	}
	if len(f.LeftOut) > 0 {
		end += fmt.Sprintf(". What only trains of %s see is not listed", plural(len(f.LeftOut), "more length", "more lengths"))
	}
	if len(f.Reach) == 0 {
		return fmt.Sprintf("No train up to %s m long sees a change%s.", metres(f.Longest), end)
	}
	var parts []string
	for _, r := range f.Reach {
		parts = append(parts, minus(r.From)+" to "+minus(r.To))
	}
	return fmt.Sprintf("No train of any kind up to %s m long sees a change outside km %s%s.", metres(f.Longest), strings.Join(parts, ", "), end)
}

// fleetLine is what one kind of train sees: all pieces with the same speeds.
type fleetLine struct {
	Who, Step, Where string
	Represented      bool
}

// fleetLines gathers the changes of an account by the trains that see them,
// those that no reference train stands for first.
func fleetLines(f *assessment.Fleet) []fleetLine {
	var list []fleetLine
	var pieces [][]*assessment.FleetChange
	for k := range f.Changes {
		x := &f.Changes[k]
		step := fmt.Sprintf("%d to %d km/h", x.Before, x.After)
		for _, m := range x.Members {
			i := slices.IndexFunc(list, func(l fleetLine) bool { return l.Who == m.Who && l.Step == step && l.Represented == m.Represented })
			if i < 0 {
				i = len(list)
				list = append(list, fleetLine{Who: m.Who, Step: step, Represented: m.Represented})
				pieces = append(pieces, nil)
			}
			pieces[i] = append(pieces[i], x)
		}
	}
	for i := range list {
		list[i].Where = whereWords(f, pieces[i])
	}
	slices.SortStableFunc(list, func(a, b fleetLine) int {
		switch {
		case a.Represented == b.Represented:
			return 0
		case b.Represented:
			return -1
		}
		return 1
	})
	return list
}

// whereWords lists the pieces of a line. Run-out stands behind the piece that it
// continues in the direction of travel, and then says only how far it goes.
func whereWords(f *assessment.Fleet, pieces []*assessment.FleetChange) string {
	near, far := func(x *assessment.FleetChange) string { return x.From }, func(x *assessment.FleetChange) string { return x.To }
	if f.Direction == "reverse" {
		near, far = far, near
	}
	last := map[string]int{} // by their far end, the last of the pieces that are not run-out
	behind := map[string][]*assessment.FleetChange{}
	for i, x := range pieces {
		if x.RunOut {
			behind[near(x)] = append(behind[near(x)], x)
		} else {
			last[far(x)] = i
		}
	}
	var parts []string
	for i, x := range pieces {
		if x.RunOut {
			if _, ok := last[near(x)]; !ok {
				parts = append(parts, "run-out km "+minus(x.From)+" to "+minus(x.To)+lengthWords(f, x))
			}
			continue
		}
		parts = append(parts, "km "+minus(x.From)+" to "+minus(x.To)+lengthWords(f, x))
		if last[far(x)] == i {
			for _, r := range behind[far(x)] {
				parts = append(parts, "run-out to km "+minus(far(r))+lengthWords(f, r))
			}
		}
	}
	return strings.Join(parts, "; ")
}

// lengthWords names the lengths of trains for which a change was found; nothing
// where they are those of the shortest and of the longest train.
func lengthWords(f *assessment.Fleet, x *assessment.FleetChange) string {
	if slices.Contains(x.Lengths, f.Shortest) && slices.Contains(x.Lengths, f.Longest) {
		return ""
	}
	var list []string
	for _, l := range x.Lengths {
		list = append(list, metres(l))
	}
	return " (" + strings.Join(list, ", ") + " m long)"
}

// rowWords says in short how a row differs.
func rowWords(f *assessment.SourceFile, d *assessment.RowDiff) string {
	var b strings.Builder
	b.WriteString(d.Kind)
	if d.Table != "" {
		b.WriteString(" [[" + d.Table + "]]")
	}
	switch d.Kind {
	case "added", "removed":
		var cells []string
		for _, c := range d.Cells {
			cells = append(cells, c.Column+" "+c.After+c.Before)
		}
		b.WriteString(": " + strings.Join(cells, ", "))
	default:
		// What matters first, notes last; of a split or merged row, the limits of
		// the parts say nothing new.
		var cells, notes []string
		for _, c := range d.Cells {
			limit := c.Column == "from_km" || c.Column == "to_km"
			if limit && (len(d.TargetLines) > 1 || len(d.BaseLines) > 1) {
				continue
			}
			text := fmt.Sprintf("%s %s now %s", c.Column, blank(c.Before), blank(c.After))
			if len(d.TargetLines) > 1 {
				text = fmt.Sprintf("line %d ", c.TargetLine) + text
			} else if len(d.BaseLines) > 1 {
				text = fmt.Sprintf("line %d ", c.BaseLine) + text
			}
			if c.Column == "note" {
				notes = append(notes, text)
			} else {
				cells = append(cells, text)
			}
		}
		if cells = append(cells, notes...); len(cells) > 0 {
			b.WriteString(": " + strings.Join(cells, ", "))
		}
	}
	return b.String()
}

func blank(cell string) string {
	if cell == "" {
		return "blank"
	}
	return cell
}

// rowLines names the lines of a difference.
func rowLines(d *assessment.RowDiff) string {
	list := func(lines []int) string {
		var s []string
		for _, n := range lines {
			s = append(s, fmt.Sprint(n))
		}
		return strings.Join(s, ", ")
	}
	switch {
	case len(d.BaseLines) == 0:
		return list(d.TargetLines)
	case len(d.TargetLines) == 0:
		return list(d.BaseLines) + " of the base"
	case len(d.BaseLines) == 1 && len(d.TargetLines) == 1 && d.BaseLines[0] == d.TargetLines[0]:
		return list(d.TargetLines)
	}
	return list(d.BaseLines) + " now " + list(d.TargetLines)
}

// consequence sums up the changes that a row causes.
type consequence struct {
	changes          int // one a train and stretch
	raise, reduction int
	trains           []int
}

// consequences gives, for each file and row of Computed.Source, what comes of
// it.
func consequences(c *assessment.Computed) map[assessment.Cause]*consequence {
	out := map[assessment.Cause]*consequence{}
	for i := range c.Routes {
		r := &c.Routes[i]
		for k := range r.Changes {
			x := &r.Changes[k]
			for _, cause := range r.Causes[x.Cause] {
				q := out[cause]
				if q == nil {
					q = &consequence{}
					out[cause] = q
				}
				q.changes += len(x.Trains)
				q.raise = max(q.raise, x.After-x.Before)
				q.reduction = max(q.reduction, x.Before-x.After)
				for _, t := range x.Trains {
					q.add(t)
				}
			}
		}
	}
	return out
}

func (q *consequence) add(train int) {
	at := 0
	for at < len(q.trains) && q.trains[at] < train {
		at++
	}
	if at < len(q.trains) && q.trains[at] == train {
		return
	}
	q.trains = append(q.trains[:at], append([]int{train}, q.trains[at:]...)...)
}

// noSpeed begins what is said of a row without an effect. That it is no change would be
// too much to say of a restriction that ends earlier.
const noSpeed = "no speed changes: "

// effectWords says what comes of a row.
func effectWords(c *assessment.Computed, d *assessment.RowDiff, q *consequence) string {
	switch d.Effect {
	case "changes":
		if q == nil {
			return "changes"
		}
		var steps []string
		if q.raise > 0 {
			steps = append(steps, byUpTo(true, q.raise))
		}
		if q.reduction > 0 {
			steps = append(steps, byUpTo(false, q.reduction))
		}
		return fmt.Sprintf("%s, %s (%s)", plural(q.changes, "change", "changes"), strings.Join(steps, ", "), trainNames(c, q.trains, 6))
	case "track":
		return "track added or removed"
	case "hidden":
		return "hidden today by temporary restrictions (finding masked)"
	}
	if holdsForOthers(d) {
		return "no reference train changes, others may: " + d.Reason
	}
	return noSpeed + d.Reason
}

// holdsForOthers tells whether a row without an effect can have one for trains that
// no reference train stands for.
func holdsForOthers(d *assessment.RowDiff) bool {
	return d.Reason == diff.NoSuchTrain.String() || d.Reason == diff.LowerElsewhere.String()
}
