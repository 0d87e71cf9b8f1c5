package render

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"speedtrail/history/assessment"
)

// stretchFigure arranges the chart of a part of a stretch.
func stretchFigure(c *assessment.Computed, s *assessment.Stretch, p *panel) *figure {
	r := &c.Routes[s.Route]
	f := &figure{
		Title:     stretchTitle(c, s, p),
		Direction: s.Direction, From: p.WindowFrom, To: p.WindowTo, RouteLength: s.RouteLength,
		Start: r.Start, End: r.End, Elsewhere: "the table lists them",
	}
	for _, g := range s.Segments {
		if from, to := f.within(g.From, g.To); from < to {
			f.Segments = append(f.Segments, assessment.Segment{Chainage: g.Chainage + from - g.From, From: from, To: to})
		}
	}
	for _, place := range s.Places {
		if place.To >= f.From && place.From <= f.To {
			f.Places = append(f.Places, place)
		}
	}
	for _, b := range s.Before {
		if from, to := f.within(b.From, b.To); from < to {
			f.Before = append(f.Before, level{From: from, To: to, Speed: b.Speed})
		}
	}
	for _, a := range s.After {
		if from, to := f.within(a.From, a.To); from < to {
			f.After = append(f.After, level{From: from, To: to, Speed: a.Speed, Govern: governWords(r.Sources[a.Source])})
		}
	}
	var sentences []string
	for _, k := range s.Changes {
		x := &r.Changes[k]
		own := slices.Contains(p.Changes, k)
		if from, to := f.within(x.Start, x.Start+x.Length); from < to {
			f.Marks = append(f.Marks, mark{from, to, x.Before, x.After, x.RunOut, !own})
		}
		if own {
			sentences = append(sentences, fmt.Sprintf("km %s to %s: %d before, %d after", minus(x.From), minus(x.To), x.Before, x.After))
		}
	}
	f.Text = "Speed in km/h over chainage in km. " + strings.Join(sentences, "; ")
	return f
}

// within cuts a range to the window.
func (f *figure) within(from, to int64) (int64, int64) { return max(from, f.From), min(to, f.To) }

// stretchTitle names a part of a stretch and the trains that share its picture.
func stretchTitle(c *assessment.Computed, s *assessment.Stretch, p *panel) string {
	r := &c.Routes[s.Route]
	first, last := r.Changes[p.Changes[0]], r.Changes[p.Changes[len(p.Changes)-1]]
	return fmt.Sprintf("%s %s, %s, km %s to %s: %s", r.ID, r.Name, s.Direction, minus(first.From), minus(last.To), trainNames(c, s.Trains, 8))
}

// governWords words what governs a step: kind, value and row.
func governWords(list []assessment.Source) string {
	parts := make([]string, len(list))
	for i, s := range list {
		file := s.File[strings.LastIndexByte(s.File, '/')+1:]
		parts[i] = fmt.Sprintf("%s: %d km/h (%s:%d)", kindWords(s.Kind), s.Value, file, s.Line)
	}
	return strings.Join(parts, " + ")
}

// profileFigure arranges the chart of a whole profile.
func profileFigure(p Profile) *figure {
	f := &figure{
		Title: p.title(), Text: "Effective speed in km/h over chainage in km.", Direction: p.Direction,
		From: 0, To: p.length(), RouteLength: p.length(), Start: p.Pieces[0].From, End: p.Pieces[len(p.Pieces)-1].To,
		Segments: p.Segments, Places: p.Places, Elsewhere: "the other formats list them",
	}
	for _, piece := range p.Pieces {
		f.After = append(f.After, level{piece.Start, piece.End, piece.Speed, governWords(piece.Sources)})
	}
	return f
}

// The title of a picture: letters to a line, and its height.
const (
	titleLength = 97
	titleHeight = 18
)

// ProfileSVG draws a profile as one SVG file; several are drawn one below the
// other.
func ProfileSVG(w io.Writer, list ...Profile) error {
	type part struct {
		title  []string
		text   string
		height int
	}
	var parts []part
	total := 0
	for i, p := range list {
		f := profileFigure(p)
		text := f.svg(fmt.Sprintf("p%d", i))
		height := 0
		fmt.Sscanf(text[strings.Index(text, `viewBox="`):], fmt.Sprintf(`viewBox="0 0 %d %%d"`, chartWidth), &height)
		// Whole: it says which train it is and which restrictions count.
		title := Wrap(p.title(), titleLength)
		parts = append(parts, part{title, text, height})
		total += height + 16 + titleHeight*len(title)
	}
	if _, err := fmt.Fprintf(w, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" font-family="system-ui, sans-serif">`+"\n<rect width=\"100%%\" height=\"100%%\" fill=\"#fff\"/>\n", chartWidth, total); err != nil {
		return err
	}
	y := 0
	for _, p := range parts {
		for _, line := range p.title {
			y += titleHeight
			fmt.Fprintf(w, `<text x="8" y="%d" font-size="14" font-weight="600">%s</text>`+"\n", y+2, esc(line))
		}
		inner := strings.Replace(p.text, "<svg ", fmt.Sprintf(`<svg y="%d" width="%d" height="%d" `, y+12, chartWidth, p.height), 1)
		if _, err := io.WriteString(w, inner); err != nil {
			return err
		}
		y += p.height + 16
	}
	_, err := io.WriteString(w, "</svg>\n")
	return err
}
