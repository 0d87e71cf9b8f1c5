package render

import (
	"cmp"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"
	"unicode"

	"github.com/jedib0t/go-pretty/v6/text"

	"speedtrail/schema/source"
)

// title names what was traced.
func (t *Trace) title() string {
	where := "km " + minus(t.At)
	if t.At == "" {
		where = "km " + minus(t.From) + " to " + minus(t.To)
	}
	line := "all commits"
	if t.FirstParent {
		line = "the line of first parents"
	}
	return fmt.Sprintf("%s %s, %s: the history up to %s (%s), %s", t.Route, t.RouteName, where, t.Revision.Typed, short(t.Revision.Commit), line)
}

// traceKey says what the speeds of a trace are, and are not.
const traceKey = "Speeds are those of each revision, with all its temporary restrictions whatever their dates; what was in service when, speedtrail inforce says. " +
	"In play are the requests of the whole commit; which of them declare what changed here is remarked, and an assessment judges the run-out of trains beyond it as well."

// speedAt writes a speed with its unit.
func speedAt(v int) string {
	if v == 0 {
		return speedWords(v)
	}
	return speedWords(v) + " km/h"
}

// TraceText writes a trace for the terminal.
func TraceText(w io.Writer, t *Trace, s Style) error {
	b := &strings.Builder{}
	for _, line := range Wrap(source.Visible(t.title()), s.Width) {
		fmt.Fprintln(b, line)
	}
	for _, line := range Wrap(traceKey, s.Width) {
		fmt.Fprintln(b, line)
	}
	for i := range t.Trails {
		t.trailText(b, &t.Trails[i], s)
	}
	for i := range t.Stretches {
		t.stretchText(b, &t.Stretches[i], s)
	}
	if len(t.Stretches) > 0 {
		t.gapsText(b, s, t.Gaps)
	}
	for _, c := range t.Cut {
		fmt.Fprintf(b, "\nThe clone is shallow: its history ends at %s. Fetch the rest with: git fetch --unshallow\n", short(t.Commits[c].Hash))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (t *Trace) trailText(b *strings.Builder, trail *TraceTrail, s Style) {
	fmt.Fprintln(b)
	head := fmt.Sprintf("%s, %s: %s at %s", trail.Direction, strings.Join(trail.Trains, ", "), speedAt(trail.Now.Speed), t.Revision.Typed)
	for _, line := range Wrap(source.Visible(head), s.Width) {
		fmt.Fprintln(b, line)
	}
	gaps := t.Gaps
	for i := range trail.Steps {
		step := &trail.Steps[i]
		n := 0
		for n < len(gaps) && gaps[n].Commit < step.After.Commit {
			n++
		}
		t.gapsText(b, s, gaps[:n])
		gaps = gaps[n:]
		t.stepText(b, step, s)
	}
	t.gapsText(b, s, gaps)
	if len(trail.Steps) == 0 {
		fmt.Fprintln(b, "\n  no revision has this track")
	}
}

// gapsText names revisions that do not load, in one line for those that follow
// each other.
func (t *Trace) gapsText(b *strings.Builder, s Style, gaps []TraceGap) {
	if len(gaps) == 0 {
		return
	}
	newest, oldest := &t.Commits[gaps[0].Commit], &t.Commits[gaps[len(gaps)-1].Commit]
	head := fmt.Sprintf("  gap         %s of %s does not load", short(newest.Hash), day(newest))
	if len(gaps) > 1 {
		head = fmt.Sprintf("  gap         %d revisions do not load, from %s to %s", len(gaps), day(oldest), day(newest))
	}
	fmt.Fprintf(b, "\n%s\n", head)
	const most = 3
	for i, g := range gaps {
		if i == most && len(gaps) > most+1 {
			fmt.Fprintf(b, "              and %d more\n", len(gaps)-most)
			break
		}
		fault := source.Visible(g.Fault)
		if len(gaps) > 1 {
			fault = short(t.Commits[g.Commit].Hash) + " " + fault
		}
		indent(b, margin, fault, s)
	}
}

func day(c *TraceCommit) string {
	return cmp.Or(date(c.Committed), noTime)
}

// indent writes a text over several lines, each behind a margin.
func indent(b *strings.Builder, margin, s string, style Style) {
	for _, line := range Wrap(s, max(40, style.Width-len(margin))) {
		fmt.Fprintln(b, margin+line)
	}
}

// margin is where the lines of a step begin.
const margin = "              "

func (t *Trace) stepText(b *strings.Builder, step *TraceStep, s Style) {
	c := &t.Commits[step.After.Commit]
	before := "none"
	if len(step.Before) > 0 {
		before = speedWords(step.Before[0].Speed)
	}
	change := before + " -> " + speedWords(step.After.Speed)
	if step.After.Speed > 0 {
		change += " km/h"
	}
	if s.Color {
		change = text.Bold.Sprint(change)
	}
	fmt.Fprintf(b, "\n  %s  %s  %s  %s\n", day(c), change, short(c.Hash), source.Visible(c.Author.Name))
	subjectText(b, c.Subject, s)
	lines := [][2]string{}
	for _, v := range step.Before {
		if v.Speed > 0 {
			lines = append(lines, [2]string{"before", strconv.Itoa(v.Speed) + " km/h by " + sourcePlaces(v.Sources)})
		}
	}
	if step.After.Speed > 0 {
		lines = append(lines, [2]string{"after", strconv.Itoa(step.After.Speed) + " km/h by " + sourcePlaces(step.After.Sources)})
	}
	lines = append(lines, [2]string{"in play", requestWords(c)}, [2]string{"assessed", assessmentWords(c)})
	for _, remark := range stepRemarks(t, step) {
		lines = append(lines, [2]string{"remark", remark})
	}
	labelled(b, lines, s)
}

func requestWords(c *TraceCommit) string {
	var list []string
	for _, q := range c.Requests {
		list = append(list, q.ID+" ("+q.Title+")")
	}
	if len(list) == 0 {
		return "no request"
	}
	return strings.Join(list, "; ")
}

func assessmentWords(c *TraceCommit) string {
	var list []string
	if words := c.anchorWords(); words != "" {
		list = append(list, words)
	}
	for _, a := range c.Assessments {
		list = append(list, fmt.Sprintf("in assessment %d (%s)", a.Number, strings.Join(a.words(), "; ")))
	}
	if list == nil {
		return "not assessed"
	}
	return strings.Join(list, ", ")
}

func (t *Trace) stretchText(b *strings.Builder, stretch *TraceStretch, s Style) {
	fmt.Fprintln(b)
	for _, line := range Wrap(source.Visible(stretch.Direction+", "+strings.Join(stretch.Trains, ", ")), s.Width) {
		fmt.Fprintln(b, line)
	}
	from, to := make([]string, len(stretch.Pieces)), make([]string, len(stretch.Pieces))
	for i, p := range stretch.Pieces {
		from[i], to[i] = minus(p.From), minus(p.To)
	}
	from, to = onPoint(from), onPoint(to)
	for i := range stretch.Pieces {
		p := &stretch.Pieces[i]
		c := &t.Commits[p.Origin]
		speed := fmt.Sprintf("%3s km/h", speedWords(p.Speed))
		if s.Color {
			speed = text.Bold.Sprint(speed)
		}
		fmt.Fprintf(b, "\n  km %s to %s  %s  since %s  %s  %s\n", from[i], to[i], speed, day(c), short(c.Hash), source.Visible(c.Author.Name))
		subjectText(b, c.Subject, s)
		lines := [][2]string{{"by", sourcePlaces(p.Sources)}, {"in play", requestWords(c)}, {"assessed", assessmentWords(c)}}
		for _, remark := range pieceRemarks(t, p) {
			lines = append(lines, [2]string{"remark", remark})
		}
		labelled(b, lines, s)
	}
}

// subjectText writes the subject of a commit so that no line of it passes for one that
// has a label: whoever commits words it.
func subjectText(b *strings.Builder, subject string, s Style) {
	words := strings.Fields(source.Visible(subject))
	if len(words) > 0 && slices.Contains(labels, strings.ToLower(firstLetters(words[0]))) {
		words[0] = `"` + words[0]
		words[len(words)-1] += `"`
	}
	for i, line := range Wrap(strings.Join(words, " "), max(40, s.Width-len(margin)-2)) {
		if i > 0 {
			line = "  " + line
		}
		fmt.Fprintln(b, margin+line)
	}
}

// firstLetters leaves the marks around a word out, and what follows them: "assessed:"
// looks like a label, too.
func firstLetters(word string) string {
	other := func(r rune) bool { return !unicode.IsLetter(r) }
	word = strings.TrimLeftFunc(word, other)
	if i := strings.IndexFunc(word, other); i >= 0 {
		return word[:i]
	}
	return word
}

// labels stand before the lines of a step or piece.
var labels = []string{"before", "after", "by", "in play", "assessed", "remark", "gap"}

// labelled writes lines behind a label each.
func labelled(b *strings.Builder, lines [][2]string, s Style) {
	for _, l := range lines {
		for i, line := range Wrap(source.Visible(l[1]), max(40, s.Width-len(margin)-10)) {
			label := l[0]
			if i > 0 {
				label = ""
			}
			fmt.Fprintf(b, "%s%-9s %s\n", margin, label, line)
		}
	}
}
