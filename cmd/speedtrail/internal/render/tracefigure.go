package render

import (
	"fmt"
	"strings"
	"time"
)

// Measures of the pictures of a trace, in their own units.
const (
	traceLeft   = 128
	traceBottom = 250 // of the plot of a point
	bandHeight  = 18  // the least of a band
	bandsHeight = 420 // of all bands, where their number leaves it free
)

// sketch is a picture while it is drawn.
type sketch struct{ strings.Builder }

func (s *sketch) add(format string, args ...any) { fmt.Fprintf(&s.Builder, format, args...) }

// begin opens a picture with words for those who do not see it.
func (s *sketch) begin(id string, height float64, title, text string) {
	s.add(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %.0f" role="img" aria-labelledby="%s-t %s-d" class="chart" font-family="system-ui, sans-serif" font-size="11">`, chartWidth, height, id, id)
	s.add("\n<title id=\"%s-t\">%s</title><desc id=\"%s-d\">%s</desc>\n", id, esc(title), id, esc(text))
}

// stripes fills a box where there is no such track, crosses one of which nothing
// is known.
func (s *sketch) stripes(x, y, width, height float64, crossed bool) {
	path, color := hatch(x, y, width, height, true), "#999"
	if crossed {
		path, color = path+hatch(x, y, width, height, false), "#777"
	}
	s.add(`<path d="%s" stroke="%s" fill="none"/>`, path, color)
}

// instant reads a time of a trace.
func instant(text string) int64 {
	t, err := time.Parse(time.RFC3339, text)
	if err != nil {
		return 0
	}
	return t.Unix()
}

// date gives the day of an instant, empty for none.
func date(text string) string {
	d, _, _ := strings.Cut(text, "T")
	return d
}

// distinct writes the days of instants, with as much of the time of day as tells
// each from those beside it.
func distinct(instants []string) []string {
	lengths := []int{len("2006-01-02"), len("2006-01-02T15:04"), len("2006-01-02T15:04:05")}
	out := make([]string, len(instants))
	for i, text := range instants {
		cut := func(s string, n int) string { return s[:min(n, len(s))] }
		for _, n := range lengths {
			out[i] = strings.Replace(cut(text, n), "T", " ", 1)
			if (i == 0 || cut(instants[i-1], n) != cut(text, n)) && (i+1 == len(instants) || cut(instants[i+1], n) != cut(text, n)) {
				break
			}
		}
	}
	return out
}

// noTime stands in the place of the time of a commit that has none.
const noTime = "no time"

// timeChart draws the speed at a point over time, along the line of first
// parents.
func (t *Trace) timeChart(trail *TraceTrail, id string) string {
	if len(trail.Line) == 0 {
		return ""
	}
	var words []string
	for _, r := range trail.Line {
		word := speedWords(r.Speed)
		if r.Gap {
			word = "does not load"
		}
		words = append(words, date(r.Committed)+" "+word)
	}
	p := timePlotOf(trail.Line, instant(t.Revision.Committed))
	p.begin(id, traceBottom+42, "Speed over time on the line of first parents", strings.Join(words, "; "))
	p.speeds()
	p.reigns(trail.Line)
	p.add("\n</svg>\n")
	return p.String()
}

// timePlot is a picture of speeds over time.
type timePlot struct {
	sketch
	first, last int64 // of the time axis, in seconds since 1970
	top         int   // of the axis of speeds, in km/h
}

// timePlotOf gives an empty picture in which the speeds of a line have room, of which
// the last one holds on at an instant.
func timePlotOf(line []TraceReign, now int64) *timePlot {
	p := &timePlot{first: instant(line[0].Committed), last: now}
	for _, r := range line {
		at := instant(r.Committed)
		p.first, p.last, p.top = min(p.first, at), max(p.last, at), max(p.top, r.Speed)
	}
	// The last speed holds on: some room shows it.
	p.last += max((p.last-p.first)/25, 3600)
	p.top = (p.top + 9 + 20) / 20 * 20
	return p
}

func (p *timePlot) x(at int64) float64 {
	return traceLeft + float64(plotRight-traceLeft)*float64(at-p.first)/float64(p.last-p.first)
}

func (p *timePlot) y(v int) float64 { return traceBottom - 205*float64(v)/float64(p.top) }

// speeds draws the axis of speeds.
func (p *timePlot) speeds() {
	step := 20
	if p.top > 160 {
		step = 40
	}
	for v := 0; v <= p.top; v += step {
		p.add(`<path d="M%d %.1fH%d" stroke="%s"/><text x="%d" y="%.1f" text-anchor="end" fill="#333">%d</text>`, traceLeft, p.y(v), plotRight, map[bool]string{true: "#111", false: "#e2e2e2"}[v == 0], traceLeft-7, p.y(v)+4, v)
	}
	p.add(`<text x="%d" y="30" fill="#333">km/h</text>`+"\n", traceLeft-44)
}

// reigns draws the speeds of a line, each from its day to that of the next.
func (p *timePlot) reigns(line []TraceReign) {
	days := make([]string, len(line))
	for i, r := range line {
		days[i] = r.Committed
	}
	days = distinct(days)
	at, previous := float64(traceLeft), 0.0
	labels := [2]float64{} // how far two rows of days are taken
	for i, r := range line {
		// A commit can be dated before its parent; it follows it all the same.
		from := max(at, p.x(instant(r.Committed)))
		to := float64(plotRight)
		if i+1 < len(line) {
			to = max(from, p.x(instant(line[i+1].Committed)))
		}
		previous = p.reign(r, from, to, previous)
		p.add(`<path d="M%.1f %dv5" stroke="#111"/>`, from, traceBottom)
		for k := range labels {
			if half := float64(len(days[i])) * letterWidth / 2; from-half > labels[k] {
				labels[k] = from + half + 4
				p.add(`<text x="%.1f" y="%d" text-anchor="middle">%s</text>`, min(from, plotRight-half), traceBottom+18+13*k, esc(days[i]))
				break
			}
		}
		at = from
	}
}

// reign draws one speed, joined to the height of the previous one where that is not 0,
// and gives its own height; 0 where there is no speed.
func (p *timePlot) reign(r TraceReign, from, to, previous float64) float64 {
	top := p.y(p.top)
	if r.Gap || r.Speed == 0 {
		p.stripes(from, top, max(to-from, 2), p.y(0)-top, r.Gap)
		return 0
	}
	height := p.y(r.Speed)
	line := fmt.Sprintf("M%.1f %.1f", from, height)
	if previous != 0 {
		line = fmt.Sprintf("M%.1f %.1fV%.1f", from, previous, height)
	}
	p.add(`<path d="%sH%.1f" fill="none" stroke="#111" stroke-width="2.4"/>`, line, to)
	p.add(`<text x="%.1f" y="%.1f" font-weight="600">%d</text>`, from+3, height-5, r.Speed)
	return height
}

// distanceChart draws the profile on a stretch over time: distance to the right,
// time upwards.
func (t *Trace) distanceChart(stretch *TraceStretch, id string) string {
	bands := stretch.Bands
	if len(bands) == 0 {
		return ""
	}
	from, to := bands[0].Pieces[0].Start, bands[0].Pieces[len(bands[0].Pieces)-1].End
	x := func(s int64) float64 {
		return traceLeft + float64(plotRight-traceLeft)*float64(s-from)/float64(to-from)
	}
	top := 1
	for _, b := range bands {
		for _, p := range b.Pieces {
			top = max(top, p.Speed)
		}
	}
	days := make([]string, len(bands))
	for i := range bands {
		days[i] = bands[i].Committed
	}
	days = distinct(days)
	heights, height := bandHeights(bands, instant(t.Revision.Committed))
	s := &sketch{}
	s.begin(id, height+92, "Profile over time on the line of first parents",
		fmt.Sprintf("%d profiles from %s to %s; the table below says which revision each piece of today's dates from", len(bands), date(bands[0].Committed), date(t.Revision.Committed)))
	y := 24 + height
	for i := range bands {
		y -= heights[i]
		s.add(`<text x="%d" y="%.1f" text-anchor="end">%s</text>`, traceLeft-8, y+heights[i]-5, esc(days[i]))
		box := bandBox{x: x, y: y, height: heights[i], top: top}
		box.draw(s, &bands[i])
		if i+1 < len(bands) {
			box.mark(s, &bands[i], &bands[i+1])
		}
		s.add("\n")
	}
	s.add(`<text x="%d" y="16" text-anchor="end" fill="#333">since</text><text x="%d" y="16" fill="#333">km/h</text>`+"\n", traceLeft-8, traceLeft)
	t.kilometres(s, x, from, to, 24+height)
	s.add("</svg>\n")
	return s.String()
}

// bandHeights shares the height among the bands by the time that they lasted,
// but for a least height.
func bandHeights(bands []TraceBand, end int64) (heights []float64, all float64) {
	total := max(end-instant(bands[0].Committed), 1)
	free := max(0, bandsHeight-float64(bandHeight*len(bands)))
	for i := range bands {
		until := end
		if i+1 < len(bands) {
			until = instant(bands[i+1].Committed)
		}
		h := bandHeight + free*max(0, float64(until-instant(bands[i].Committed)))/float64(total)
		heights = append(heights, h)
		all += h
	}
	return heights, all
}

// bandBox is where a profile is drawn.
type bandBox struct {
	x         func(int64) float64 // of a running distance in mm
	y, height float64
	top       int // the highest speed of all profiles, in km/h
}

// draw draws one profile as a row of boxes.
func (box bandBox) draw(s *sketch, b *TraceBand) {
	y, h := box.y, box.height
	for _, p := range b.Pieces {
		left, width := box.x(p.Start), box.x(p.End)-box.x(p.Start)
		fill, halo := "none", ""
		if b.Gap {
			halo = ` stroke="#fff" stroke-width="4" paint-order="stroke"`
		}
		if p.Speed > 0 && !b.Gap {
			shade := 118 + 132*p.Speed/box.top // black on the darkest has a contrast of 4.5 to 1
			fill = fmt.Sprintf("#%02x%02x%02x", shade, shade, shade)
		} else {
			s.stripes(left, y, width, h, b.Gap)
		}
		s.add(`<rect x="%.1f" y="%.1f" width="%.1f" height="%.1f" fill="%s" stroke="#fff" stroke-width="0.6"/>`, left, y, width, h, fill)
		label := ""
		if b.Gap {
			label = "does not load"
		} else if p.Speed > 0 {
			label = itoa(p.Speed)
		}
		if label != "" && width > float64(len(label))*letterWidth+4 {
			s.add(`<text x="%.1f" y="%.1f" text-anchor="middle"%s>%s</text>`, left+width/2, y+h-5, halo, label)
		}
	}
}

// mark draws where the next profile, above it, differs.
func (box bandBox) mark(s *sketch, b, next *TraceBand) {
	if b.Gap || next.Gap {
		return
	}
	for _, p := range altered(b.Pieces, next.Pieces) {
		left := box.x(p.Start)
		s.add(`<path d="M%.1f %.1fH%.1f" stroke="#111" stroke-width="2.6"/>`, left, box.y, max(box.x(p.End), left+1.5))
	}
}

// altered lists where two profiles of one stretch differ.
func altered(old, now []TraceLevel) []TraceLevel {
	var list []TraceLevel
	i, k := 0, 0
	for i < len(old) && k < len(now) {
		start, end := max(old[i].Start, now[k].Start), min(old[i].End, now[k].End)
		if old[i].Speed != now[k].Speed {
			if n := len(list); n > 0 && list[n-1].End == start {
				list[n-1].End = end
			} else {
				list = append(list, TraceLevel{Start: start, End: end})
			}
		}
		if old[i].End == end {
			i++
		}
		if now[k].End == end {
			k++
		}
	}
	return list
}

// kilometres draws the axis below, with the places.
func (t *Trace) kilometres(s *sketch, x func(int64) float64, from, to int64, y float64) {
	step := tickSteps[len(tickSteps)-1]
	for _, d := range tickSteps {
		if float64(plotRight-traceLeft)*float64(d)/float64(to-from) >= 64 {
			step = d
			break
		}
	}
	free := float64(traceLeft - 40)
	label := func(at float64, text string) {
		if half := float64(len(text)) * letterWidth / 2; at-half > free+6 && at+half < chartWidth {
			s.add(`<text x="%.1f" y="%.1f" text-anchor="middle">%s</text>`, at, y+18, text)
			free = at + half
		}
	}
	for i, g := range t.Segments {
		if i > 0 {
			before := t.Segments[i-1]
			s.add(`<path d="M%.1f 24V%.1f" stroke="#111" stroke-dasharray="3 3"/>`, x(g.From), y+6)
			label(x(g.From), minus(km(before.Chainage+before.To-before.From))+"|"+minus(km(g.Chainage)))
		}
		first := (g.Chainage + step - 1) / step * step
		if g.Chainage < 0 {
			first = g.Chainage / step * step
		}
		for c := first; c <= g.Chainage+g.To-g.From; c += step {
			at := x(g.From + c - g.Chainage)
			s.add(`<path d="M%.1f %.1fv5" stroke="#111"/>`, at, y)
			label(at, minus(km(c)))
		}
	}
	s.add(`<text x="8" y="%.1f" fill="#333">km</text><text x="8" y="%.1f" fill="#333">places</text>`, y+18, y+36)
	free = traceLeft - 40
	for _, p := range t.Places {
		at := (x(max(p.From, from)) + x(min(p.To, to))) / 2
		name := clip(p.Name, 24)
		s.add(`<path d="M%.1f %.1fv-5" stroke="#111" stroke-width="1.5"/>`, at, y+26)
		half := float64(len([]rune(name))) * letterWidth / 2
		if middle := min(max(at, free+half+5), chartWidth-half); middle-at < half && middle-half > free+4 {
			s.add(`<text x="%.1f" y="%.1f" text-anchor="middle">%s</text>`, middle, y+38, esc(name))
			free = middle + half
		}
	}
	s.add("\n")
}
