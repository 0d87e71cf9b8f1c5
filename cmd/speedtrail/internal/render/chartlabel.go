package render

import (
	"fmt"
	"math"
	"strings"
)

// numberHeight is the room of the numbers above the pieces that are too narrow to
// hold theirs.
const numberHeight = 12

// stepLabel is the signed step of a change, above the plot.
type stepLabel struct {
	mark *mark
	text string
	x    float64
	row  int
}

// placeLabels finds room for the signed steps in up to three rows, so that none
// covers another, and counts those for which there is none.
func (d *drawing) placeLabels() (list []stepLabel, left int) {
	rows := [3]float64{}
	for i := range d.f.Marks {
		m := &d.f.Marks[i]
		if m.Aside {
			continue
		}
		text, letter := signed(m.After-m.Before), 8.6 // bold
		if m.RunOut {
			text, letter = text+" run-out", 7.2
		}
		half := float64(len([]rune(text))) * letter / 2
		x := min(max((d.x(m.From)+d.x(m.To))/2, plotLeft+half), plotRight-half)
		row := 0
		for row < len(rows) && x-half < rows[row]+6 {
			row++
		}
		if row == len(rows) {
			left++
			continue
		}
		rows[row] = x + half
		list = append(list, stepLabel{m, text, x, row})
	}
	return list, left
}

// labels writes the signed steps. Their lines come first: a label that a line
// crosses stays readable.
func (d *drawing) labels(list []stepLabel) {
	y := func(l stepLabel) float64 { return float64(plotTop - 4 - 13*l.row) }
	for _, l := range list {
		d.add(`<path d="M%.1f %.1fV%.1f" stroke="#bbb" stroke-width="0.8"/>`, l.x, y(l)+2, d.y(max(l.mark.Before, l.mark.After)))
	}
	for _, l := range list {
		weight := "600"
		if l.mark.RunOut {
			weight = "400"
		}
		d.add(`<text x="%.1f" y="%.1f" text-anchor="middle" font-weight="%s" font-size="12" stroke="#fff" stroke-width="3" paint-order="stroke">%s</text>`, l.x, y(l), weight, l.text)
	}
	d.add("\n")
}

// placeLetter is a place in the strip below the axis.
type placeLetter struct {
	letter   string // empty: there is no room for it
	words    string
	from, to float64
	extent   bool
	x        float64
}

// letter numbers places: A to Z, then A1, B1, ...
func letter(i int) string {
	s := string(rune('A' + i%26))
	if i >= 26 {
		s += fmt.Sprint(i / 26)
	}
	return s
}

// placeLetters gives a letter to each place, a little to the right of it where
// that of the place before is in its way, and counts those without room.
func (d *drawing) placeLetters() (list []placeLetter, left int) {
	free, n := math.Inf(-1), 0
	for _, p := range d.f.Places {
		l := placeLetter{
			from: max(d.x(max(p.From, d.f.From)), plotLeft), to: min(d.x(min(p.To, d.f.To)), plotRight),
			extent: p.To > p.From, words: p.Name + " (" + p.Kind + ")",
		}
		middle, text := (l.from+l.to)/2, letter(n)
		half := float64(len(text)) * 7.5 / 2
		if l.x = max(middle, free+half); l.x-middle > 30 {
			left++
		} else {
			l.letter = text
			free = l.x + half + 2
			n++
		}
		list = append(list, l)
	}
	return list, left
}

func letterLegend(list []placeLetter) (items []string) {
	for _, l := range list {
		if l.letter != "" {
			items = append(items, l.letter+" "+l.words)
		}
	}
	return items
}

// cell is a piece of the profile after the change in the lowest strip, under
// the number of the rows that govern it.
type cell struct {
	x, width float64
	number   int     // 0: there is no room for it
	above    bool    // the number stands above
	at       float64 // of the number
}

// cells arranges the lowest strip. The legend has the numbers that are drawn, and
// none besides.
func (d *drawing) cells() (list []cell, governs []string, left int) {
	numbers := map[string]int{}
	free := math.Inf(-1)
	levels := d.f.After
	for i := 0; i < len(levels); i++ {
		l := levels[i]
		for i+1 < len(levels) && levels[i+1].From == l.To && levels[i+1].Govern == l.Govern {
			i++
			l.To = levels[i].To
		}
		c := cell{x: d.x(l.From), width: d.x(l.To) - d.x(l.From)}
		c.at = c.x + c.width/2
		if l.Govern != "" {
			n, known := numbers[l.Govern]
			if !known {
				n = len(governs) + 1
			}
			wide := float64(len(fmt.Sprint(n)))*letterWidth + 2
			switch {
			case c.width > wide:
				c.number = n
			case c.at-wide/2 > free:
				c.number, c.above = n, true
				free = c.at + wide/2 + 2
			default:
				left++
			}
			if c.number > 0 && !known {
				numbers[l.Govern] = n
				governs = append(governs, fmt.Sprintf("%d %s", n, l.Govern))
			}
		}
		list = append(list, c)
	}
	return list, governs, left
}

// leftOut says what a chart has no room for.
func (d *drawing) leftOut(labels, letters, numbers int) []string {
	var parts []string
	if labels > 0 {
		parts = append(parts, plural(labels, "step has", "steps have")+" no room for a label")
	}
	if numbers > 0 {
		parts = append(parts, plural(numbers, "narrow piece has", "narrow pieces have")+" no room for a number")
	}
	var lines []string
	if parts != nil {
		lines = append(lines, "Not printed: "+strings.Join(parts, ", ")+"; "+d.f.Elsewhere+".")
	}
	if letters > 0 {
		lines = append(lines, plural(letters, "place that stands close to another has", "places that stand close to others have")+" a mark without a letter.")
	}
	return lines
}

// fill puts items into lines of about legendLength characters.
func fill(items []string) []string {
	var lines []string
	line := ""
	for _, s := range items {
		s = clip(s, legendLength)
		if line != "" && Cells(line)+Cells(s)+3 > legendLength {
			lines = append(lines, line)
			line = ""
		}
		if line != "" {
			line += "   "
		}
		line += s
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

// clip cuts a long text to a number of letters, of which wide ones count twice.
func clip(s string, most int) string {
	if Cells(s) <= most {
		return s
	}
	n := 0
	for i, r := range s {
		if n += Cells(string(r)); n > most-1 {
			return s[:i] + "\u2026"
		}
	}
	return s
}

// strips draws what lies below the axis: the places, and what governs each step.
func (d *drawing) strips(letters []placeLetter, cells []cell, above bool, legend []string) {
	y := float64(plotBottom + 42)
	d.add(`<text x="8" y="%.1f" fill="#333">places</text>`, y+11)
	if len(letters) == 0 {
		d.add(`<text x="%d" y="%.1f" fill="#555">none given here</text>`, plotLeft, y+11)
	}
	for _, l := range letters {
		d.add(`<path d="M%.1f %.1fv-5" stroke="#111" stroke-width="1.5"/>`, l.from, y)
		if l.extent {
			d.add(`<path d="M%.1f %.1fH%.1f" stroke="#111" stroke-width="3"/>`, l.from, y-2, max(l.to, l.from+1))
		}
		if l.letter != "" {
			d.add(`<text x="%.1f" y="%.1f" text-anchor="middle">%s</text>`, l.x, y+11, l.letter)
		}
	}
	y += 18
	if above {
		y += numberHeight
	}
	d.add("\n"+`<text x="8" y="%.1f" fill="#333">by</text>`, y+12)
	for _, c := range cells {
		d.add(`<rect x="%.1f" y="%.1f" width="%.1f" height="16" fill="#fff" stroke="#777" stroke-width="0.8"/>`, c.x, y, c.width)
		if c.number > 0 {
			top := y + 12
			if c.above {
				top = y - 3
			}
			d.add(`<text x="%.1f" y="%.1f" text-anchor="middle">%d</text>`, c.at, top, c.number)
		}
	}
	y += 32
	for _, line := range legend {
		d.add("\n"+`<text x="%d" y="%.1f" fill="#222" xml:space="preserve">%s</text>`, plotLeft, y, esc(line))
		y += 15
	}
	d.add("\n")
}
