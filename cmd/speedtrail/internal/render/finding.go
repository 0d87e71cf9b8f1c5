package render

import (
	"fmt"
	"iter"
	"slices"
	"strings"

	"speedtrail/diff/doubt"
	"speedtrail/history/assessment"
	"speedtrail/schema"
)

// noFinding stands where there is none: silence could be read as a page that is missing.
const noFinding = "No finding."

// findingGroup is the findings of one kind: why they matter is said once.
type findingGroup struct {
	ID, Why, Do string
	List        []assessment.Finding
	Open        int // of them not accepted
}

// findingGroups gathers the findings of a document, in their order.
func findingGroups(c *assessment.Computed) []findingGroup {
	var list []findingGroup
	for _, f := range c.Findings {
		i := slices.IndexFunc(list, func(g findingGroup) bool { return g.ID == f.ID && (g.Open > 0) == (f.Accepted == "") })
		if i < 0 {
			i = len(list)
			list = append(list, findingGroup{ID: f.ID})
			for _, e := range c.Explained {
				if e.ID == f.ID {
					list[i].Why, list[i].Do = e.Why, e.Do
				}
			}
		}
		list[i].List = append(list[i].List, f)
		if f.Accepted == "" {
			list[i].Open++
		}
	}
	return list
}

// commonTail gives the texts of the findings. What all of them end with, after a
// colon, is said once, in tail, where there are more of them than most. Texts about
// doubtful data have no such end; a colon in one is of the name of a place or train.
func (g findingGroup) commonTail(most int) (texts []string, tail string) {
	for i, f := range g.List {
		if slices.Contains(doubt.IDs, g.ID) {
			break
		}
		text, end := cutTail(f.Text)
		if end == "" || i > 0 && end != tail {
			tail = ""
			break
		}
		texts, tail = append(texts, text), end
	}
	if tail == "" || len(g.List) <= most {
		texts = nil
		for _, f := range g.List {
			texts = append(texts, f.Text)
		}
		return texts, ""
	}
	return texts, " Of each: " + tail + "."
}

// cutTail takes what follows the last colon from a text: ids of trains, which stand
// before, can have colons of their own.
func cutTail(text string) (head, tail string) {
	i := strings.LastIndex(text, ": ")
	if i < 0 {
		return text, ""
	}
	return text[:i], text[i+2:]
}

// trainsApart takes the list of the trains out of the text about a change where it is
// long: what happens there is lost between forty ids.
func (g findingGroup) trainsApart(text string) (short, trains string) {
	if g.ID != assessment.Outside && g.ID != assessment.Masked { // brackets of others hold something else
		return text, ""
	}
	short = withoutTrains(text)
	if short == text {
		return text, ""
	}
	from := strings.Index(text, " (")
	return short, text[from+2 : from+len(text)-len(short)-1]
}

func (g findingGroup) title() string {
	s := g.ID
	if n := len(g.List); n > 1 {
		s += fmt.Sprintf(" (%d)", n)
	}
	if g.Open == 0 {
		s += ", accepted"
	}
	return s
}

// findingPlace words where a finding is.
func findingPlace(f assessment.Finding) string {
	var s string
	if f.Route != "" {
		s = f.Route
		if f.Direction == "both" {
			s += " both directions"
		} else if f.Direction != "" {
			s += " " + f.Direction
		}
	}
	switch {
	case f.From == "":
	case f.From == f.To:
		s += ", km " + minus(f.From)
	default:
		s += ", km " + minus(f.From) + " to " + minus(f.To)
	}
	return s
}

// findingRow gives the row behind a finding, and whether the change brought it.
func findingRow(f assessment.Finding) string {
	if f.AlsoInBase {
		return f.Row + "; also in the base"
	}
	return f.Row
}

func joinPlace(place, text string) string {
	if place == "" {
		return text
	}
	return place + ": " + text
}

// acceptanceWords says what became of an entry of accepted.toml; unchecked are the kinds
// of finding that nobody looked for.
func acceptanceWords(a assessment.Acceptance, unchecked []string) string {
	state := map[string]string{
		"used":   fmt.Sprintf("covers %s", plural(a.Covers, "finding", "findings")),
		"unused": "covers nothing and can be removed",
		"new":    "does not count yet: it does not stand unaltered in the base",
		"over":   "does not count any more: it was for the time until " + a.Until,
		"never":  "does not count: a finding of this kind cannot be accepted" + schema.Meant(a.Finding, doubt.IDs),
		"unread": "is for a route that is the same in both revisions",
	}[a.State]
	if a.State == "unused" && slices.Contains(unchecked, a.Finding) {
		state = "is for what was not looked for, as dataset.toml sets no limit"
	}
	return fmt.Sprintf("accepted.toml:%d, %s on %s km %s to %s, %s", a.Line, a.Finding, a.Route, minus(a.From), minus(a.To), state)
}

// seconds writes tenths of a second with a sign; minus is a gain.
func seconds(tenths int64) string {
	if tenths == 0 {
		return "0.0"
	}
	sign := "+"
	if tenths < 0 {
		sign, tenths = "\u2212", -tenths
	}
	return fmt.Sprintf("%s%d.%d", sign, tenths/10, tenths%10)
}

// clock writes tenths of a second as minutes and seconds.
func clock(tenths int64) string {
	return fmt.Sprintf("%d:%02d.%d", tenths/600, tenths/10%60, tenths%10)
}

// runningTimes adds up, for each train, how its running times change; it has no
// entry for a train without any.
func runningTimes(c *assessment.Computed) map[string]string {
	sums := map[string]int64{}
	for _, r := range c.Figures.Runs {
		sums[r.Train] += r.After - r.Before
	}
	out := map[string]string{}
	for train, sum := range sums {
		out[train] = seconds(sum)
	}
	return out
}

// trainRoutes words, for each train, on which routes it sees a change: of speed, or
// of its running time alone. It has no words for one that sees none.
func trainRoutes(c *assessment.Computed) map[string]string {
	timed := make([][]string, len(c.Trains))
	for i, r := range byTrackAlone(c) {
		if n := len(timed[i]); n == 0 || timed[i][n-1] != r.Route { // the runs of a route stand together
			timed[i] = append(timed[i], r.Route)
		}
	}
	out := map[string]string{}
	for i, t := range c.Trains {
		words := routesCell(t.Routes)
		if len(timed[i]) > 0 {
			if words != "" {
				words += "; "
			}
			words += "running time only: " + routesCell(timed[i])
		}
		if words != "" {
			out[t.ID] = words
		}
	}
	return out
}

// mostRoutes is how many routes a table or sentence names.
const mostRoutes = 8

// routesCell lists the routes of a train, or counts many: the first eight of forty are
// much the same for each train, and make lines without a number of a table. The
// sections that follow have them all.
func routesCell(ids []string) string {
	if len(ids) > mostRoutes+1 {
		return fmt.Sprintf("%d routes", len(ids))
	}
	return strings.Join(ids, ", ")
}

// byTrackAlone runs over the running times that differ although the train sees no
// change of speed on the route, each with the index of its train.
func byTrackAlone(c *assessment.Computed) iter.Seq2[int, assessment.RunFigure] {
	return func(yield func(int, assessment.RunFigure) bool) {
		index := map[string]int{}
		for i, t := range c.Trains {
			index[t.ID] = i
		}
		for _, r := range c.Figures.Runs {
			i, ok := index[r.Train]
			if !ok || r.After == r.Before {
				continue
			}
			if _, faster := slices.BinarySearch(c.Trains[i].Routes, r.Route); !faster && !yield(i, r) {
				return
			}
		}
	}
}

// unchangedWords says of a train that it sees no change: of speed alone where track
// became longer or shorter and its running time is not known.
func unchangedWords(c *assessment.Computed, t assessment.Train) string {
	d := t.After
	if d == nil {
		d = t.Before
	}
	other := slices.ContainsFunc(c.Routes, func(r assessment.Route) bool { return r.Fate == "kept" && len(r.Track) > 0 })
	if other && d != nil && (d.Acceleration == "" || d.Braking == "") {
		return "no change of speed"
	}
	return "no change"
}

// seenWords says what was seen inside a declaration, for trains that share the
// same lengths at once.
func seenWords(d assessment.Declaration) string {
	if d.Unseen {
		return "nothing of it (unseen)"
	}
	type group struct {
		inside, hidden, least, most int64
		trains                      []string
	}
	var groups []*group
	for _, s := range d.Seen {
		i := slices.IndexFunc(groups, func(g *group) bool { return g.inside == s.Inside && g.hidden == s.Hidden })
		if i < 0 {
			i = len(groups)
			groups = append(groups, &group{inside: s.Inside, hidden: s.Hidden, least: s.RunOut, most: s.RunOut})
		}
		g := groups[i]
		g.trains = append(g.trains, s.Train)
		g.least, g.most = min(g.least, s.RunOut), max(g.most, s.RunOut)
	}
	var parts []string
	for _, g := range groups {
		text := km(g.inside) + " km"
		switch {
		case g.hidden > 0 && g.inside+g.most == 0:
			text = ""
		case g.most > g.least:
			text += " and " + km(g.least) + " to " + km(g.most) + " km of run-out"
		case g.most > 0:
			text += " and " + km(g.most) + " km of run-out"
		}
		if g.hidden > 0 {
			text = strings.TrimPrefix(text+", "+km(g.hidden)+" km hidden today", ", ")
		}
		parts = append(parts, strings.Join(g.trains, ", ")+" "+text)
	}
	// Asked for by name, and not seen.
	var missing []string
	for _, id := range d.Trains {
		if len(d.Seen) > 0 && d.Track == 0 && !slices.ContainsFunc(d.Seen, func(s assessment.Seen) bool { return s.Train == id }) {
			missing = append(missing, id)
		}
	}
	if len(missing) > 0 {
		parts = append(parts, strings.Join(missing, ", ")+" not seen")
	}
	if d.Track > 0 {
		parts = append(parts, km(d.Track)+" km of added or removed track")
	}
	if d.Dated > 0 {
		parts = append(parts, "other dates of temporary restrictions over "+km(d.Dated)+" km")
	}
	if parts == nil {
		return "a reference train that differs"
	}
	return strings.Join(parts, "; ")
}

// declaredTrains words whom a declaration is for.
func declaredTrains(d assessment.Declaration) string {
	if len(d.Trains) == 0 {
		return "every train"
	}
	return strings.Join(d.Trains, ", ")
}

// reconciliation says with what the changes were compared.
func reconciliation(c *assessment.Computed) string {
	switch {
	case c.Options.NoRequests:
		return "The comparison with change requests was left out (--request none)."
	case len(c.Requests) == 0:
		return "No change request was added or altered between the revisions: whatever changes is outside."
	case len(c.Options.Requests) > 0:
		return "Changes are held against the requests that were named with --request."
	}
	return "Changes are held against the requests that were added or altered between the revisions."
}
