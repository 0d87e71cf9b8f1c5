package render

import (
	"fmt"
	"html"
	"slices"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// figure is a speed-chainage chart. Distances are running distances in
// millimetres; the picture runs from left to right in the nominal direction,
// whatever the direction of travel.
type figure struct {
	Title, Text   string // for those who do not see it
	Direction     string
	From, To      int64 // the window
	RouteLength   int64
	Start, End    string // chainages of the route's ends, for the small line above
	Segments      []assessment.Segment
	Before, After []level
	Marks         []mark
	Places        []assessment.Place
	Elsewhere     string // where that stands for which a chart has no room
}

// level is a piece of a profile, with the rows that govern it.
type level struct {
	From, To int64
	Speed    int
	Govern   string
}

// mark is a change in a chart.
type mark struct {
	From, To      int64
	Before, After int
	RunOut        bool
	Aside         bool // of another chart: it is hatched and not labelled
}

// Measures of a chart in its own units; it scales to the width of the page. It is no
// wider than that its letters, of 11 units, are of some 6.6 points on a page of A4.
const (
	chartWidth   = 860
	plotLeft     = 52
	plotRight    = 844
	plotTop      = 62
	plotHeight   = 170
	plotBottom   = plotTop + plotHeight
	letterWidth  = 6.1 // of the small text, about
	legendLength = 126 // characters of a legend line
)

type drawing struct {
	strings.Builder
	f   *figure
	top int // speed at the upper edge
}

func (d *drawing) add(format string, args ...any) { fmt.Fprintf(&d.Builder, format, args...) }

// esc writes a text for SVG.
func esc(s string) string { return html.EscapeString(source.Visible(s)) }

// x places a running distance; tenths of a unit are enough.
func (d *drawing) x(s int64) float64 {
	return plotLeft + float64(plotRight-plotLeft)*float64(s-d.f.From)/float64(d.f.To-d.f.From)
}

func (d *drawing) y(speed int) float64 {
	return plotBottom - plotHeight*float64(speed)/float64(d.top)
}

// svg draws the figure. id tells its title from those of other figures of the
// page.
func (f *figure) svg(id string) string {
	d := &drawing{f: f}
	for _, list := range [][]level{f.Before, f.After} {
		for _, l := range list {
			d.top = max(d.top, l.Speed)
		}
	}
	d.top = (d.top + 9 + 20) / 20 * 20
	labels, unlabelled := d.placeLabels()
	letters, unlettered := d.placeLetters()
	cells, governs, unnumbered := d.cells()
	legend := slices.Concat(fill(letterLegend(letters)), fill(governs), d.leftOut(unlabelled, unlettered, unnumbered))
	height := plotBottom + 92 + 15*len(legend)
	above := slices.ContainsFunc(cells, func(c cell) bool { return c.above })
	if above {
		height += numberHeight
	}
	d.add(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" role="img" aria-labelledby="%s-t %s-d" class="chart" font-family="system-ui, sans-serif" font-size="11" data-from="%d" data-to="%d" data-left="%d" data-right="%d" data-width="%d" data-before="%s" data-after="%s" data-km="%s">`,
		chartWidth, height, id, id, f.From, f.To, plotLeft, plotRight, chartWidth, levelData(f.Before), levelData(f.After), segmentData(f.Segments))
	d.add("\n<title id=\"%s-t\">%s</title><desc id=\"%s-d\">%s</desc>\n", id, esc(f.Title), id, esc(f.Text))
	d.overview()
	d.grid()
	d.axis()
	d.marks()
	d.line(f.Before, `stroke="#8a8a8a" stroke-width="1.4"`)
	d.line(f.After, `stroke="#111" stroke-width="2.6"`)
	d.labels(labels)
	d.strips(letters, cells, above, legend)
	d.add("</svg>\n")
	return d.String()
}

func levelData(list []level) string {
	parts := make([]string, len(list))
	for i, l := range list {
		parts[i] = fmt.Sprintf("%d,%d,%d", l.From, l.To, l.Speed)
	}
	return strings.Join(parts, ";")
}

func segmentData(list []assessment.Segment) string {
	parts := make([]string, len(list))
	for i, s := range list {
		parts[i] = fmt.Sprintf("%d,%d,%d", s.From, s.To, s.Chainage)
	}
	return strings.Join(parts, ";")
}

// overview draws the small line above: the whole route and the window on it.
func (d *drawing) overview() {
	f := d.f
	left, right := 270.0, 700.0
	at := func(s int64) float64 { return left + (right-left)*float64(s)/float64(f.RouteLength) }
	d.add(`<text x="%.1f" y="17" text-anchor="end" fill="#555">km %s</text><text x="%.1f" y="17" fill="#555">km %s</text>`, left-8, esc(minus(f.Start)), right+8, esc(minus(f.End)))
	d.add(`<path d="M%.1f 13H%.1f" stroke="#999" stroke-width="2"/>`, left, right)
	from, to := at(f.From), at(f.To)
	if to-from < 4 {
		from, to = (from+to)/2-2, (from+to)/2+2
	}
	d.add(`<path d="M%.1f 13H%.1f" stroke="#111" stroke-width="7"/>`+"\n", from, to)
	arrow := "nominal direction \u2192"
	if f.Direction == "reverse" {
		arrow = "\u2190 reverse direction"
	}
	d.add(`<text x="%d" y="17" font-weight="600">%s</text>`+"\n", plotLeft, arrow)
}

func (d *drawing) grid() {
	step := 20
	if d.top > 160 {
		step = 40
	}
	for v := 0; v <= d.top; v += step {
		d.add(`<path d="M%d %.1fH%d" stroke="%s" stroke-width="1"/><text x="%d" y="%.1f" text-anchor="end" fill="#333">%d</text>`,
			plotLeft, d.y(v), plotRight, map[bool]string{true: "#111", false: "#e2e2e2"}[v == 0], plotLeft-7, d.y(v)+4, v)
	}
	d.add(`<text x="%d" y="%d" fill="#333">km/h</text>`+"\n", plotLeft-44, plotTop-10)
}

// steps are the distances between ticks, in millimetres.
var tickSteps = []int64{10e3, 20e3, 50e3, 100e3, 200e3, 500e3, 1e6, 2e6, 5e6, 10e6, 20e6, 50e6, 100e6, 200e6, 500e6}

// axis writes round kilometres, and both readings at a chainage jump.
func (d *drawing) axis() {
	f := d.f
	step := tickSteps[len(tickSteps)-1]
	for _, s := range tickSteps {
		if float64(plotRight-plotLeft)*float64(s)/float64(f.To-f.From) >= 64 {
			step = s
			break
		}
	}
	free := 24.0 // the right end of the last label, at first of that of the axis
	for i, s := range f.Segments {
		first := (s.Chainage + step - 1) / step * step
		if s.Chainage < 0 {
			first = s.Chainage / step * step
		}
		for c := first; c <= s.Chainage+s.To-s.From; c += step {
			// At a joint both readings stand below; one of them here would be read as the
			// reading.
			if at := s.From + c - s.Chainage; at == s.From && i > 0 || at == s.To && i < len(f.Segments)-1 {
				continue
			}
			x := d.x(s.From + c - s.Chainage)
			d.add(`<path d="M%.1f %dv5" stroke="#111"/>`, x, plotBottom)
			label := minus(km(c))
			half := float64(len([]rune(label))) * letterWidth / 2
			if middle := min(x, chartWidth-4-half); middle-half > free+6 { // at the edge it stands a little aside
				d.add(`<text x="%.1f" y="%d" text-anchor="middle">%s</text>`, middle, plotBottom+18, label)
				free = middle + half
			}
		}
		if i > 0 {
			before := f.Segments[i-1]
			x := d.x(s.From)
			d.add(`<path d="M%.1f %dV%d" stroke="#fff" stroke-width="5"/><path d="M%.1f %dV%dM%.1f %dV%d" stroke="#111" stroke-dasharray="3 3"/>`,
				x, plotTop, plotBottom+6, x-2.5, plotTop, plotBottom+6, x+2.5, plotTop, plotBottom+6)
			d.add(`<text x="%.1f" y="%d" text-anchor="end" font-style="italic">%s</text><text x="%.1f" y="%d" font-style="italic">%s</text>`,
				x-5, plotBottom+32, minus(km(before.Chainage+before.To-before.From)), x+5, plotBottom+32, minus(km(s.Chainage)))
		}
	}
	d.add(`<text x="%d" y="%d" fill="#333">km</text>`+"\n", 8, plotBottom+18)
}

// marks hatches what lies between before and after: one slant for raised, the
// other for lowered, lighter for run-out.
func (d *drawing) marks() {
	for _, m := range d.f.Marks {
		color := "#a33b00"
		if m.After < m.Before {
			color = "#00508f"
		}
		opacity := ""
		if m.RunOut {
			opacity = ` opacity="0.45"`
		}
		high, low := max(m.Before, m.After), min(m.Before, m.After)
		x, y := d.x(m.From), d.y(high)
		d.add(`<path d="%s" stroke="%s" stroke-width="1.1" fill="none"%s/>`, hatch(x, y, d.x(m.To)-x, d.y(low)-y, m.After > m.Before), color, opacity)
	}
	d.add("\n")
}

// line draws a profile as a step line; where the track has a gap, so has it.
func (d *drawing) line(list []level, style string) {
	var path strings.Builder
	for i, l := range list {
		if i == 0 || list[i-1].To != l.From {
			fmt.Fprintf(&path, "M%.1f %.1f", d.x(l.From), d.y(l.Speed))
		} else {
			fmt.Fprintf(&path, "V%.1f", d.y(l.Speed))
		}
		fmt.Fprintf(&path, "H%.1f", d.x(l.To))
	}
	if path.Len() > 0 {
		d.add(`<path d="%s" fill="none" %s/>`+"\n", path.String(), style)
	}
}
