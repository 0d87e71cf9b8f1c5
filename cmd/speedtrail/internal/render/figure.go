package render

import (
	"fmt"
	"io"
	"strings"

	"speedtrail/history/assessment"
)

// stretchFigure arranges the chart of a stretch.
func stretchFigure(c *assessment.Computed, s *assessment.Stretch) *figure {
	r := &c.Routes[s.Route]
	f := &figure{
		Title:     stretchTitle(c, s),
		Direction: s.Direction, From: s.WindowFrom, To: s.WindowTo, RouteLength: s.RouteLength,
		Start: r.Start, End: r.End, Segments: s.Segments, Places: s.Places,
	}
	for _, b := range s.Before {
		f.Before = append(f.Before, level{From: b.From, To: b.To, Speed: b.Speed})
	}
	numbers := map[string]int{}
	for _, a := range s.After {
		text := governWords(r.Sources[a.Source])
		n, ok := numbers[text]
		if !ok {
			f.Governs = append(f.Governs, text)
			n = len(f.Governs)
			numbers[text] = n
		}
		f.After = append(f.After, level{From: a.From, To: a.To, Speed: a.Speed, Note: n})
	}
	var sentences []string
	for _, k := range s.Changes {
		x := &r.Changes[k]
		f.Marks = append(f.Marks, mark{x.Start, x.Start + x.Length, x.Before, x.After, x.RunOut})
		sentences = append(sentences, fmt.Sprintf("km %s to %s: %d before, %d after", x.From, x.To, x.Before, x.After))
	}
	f.Text = "Speed in km/h over chainage in km. " + strings.Join(sentences, "; ")
	return f
}

// stretchTitle names a stretch and the trains that share its picture.
func stretchTitle(c *assessment.Computed, s *assessment.Stretch) string {
	r := &c.Routes[s.Route]
	first, last := r.Changes[s.Changes[0]], r.Changes[s.Changes[len(s.Changes)-1]]
	return fmt.Sprintf("%s %s, %s, km %s to %s: %s", r.ID, r.Name, s.Direction, minus(first.From), minus(last.To), trainNames(c, s.Trains, 8))
}

// governWords words what governs a step: kind, value and row.
func governWords(list []assessment.Source) string {
	parts := make([]string, len(list))
	for i, s := range list {
		file := s.File[strings.LastIndexByte(s.File, '/')+1:]
		parts[i] = fmt.Sprintf("%s %d (%s:%d)", s.Kind, s.Value, file, s.Line)
	}
	return strings.Join(parts, " + ")
}

// profileFigure arranges the chart of a whole profile.
func profileFigure(p Profile) *figure {
	f := &figure{
		Title: p.title(), Text: "Effective speed in km/h over chainage in km.", Direction: p.Direction,
		From: 0, To: p.length(), RouteLength: p.length(), Start: p.Pieces[0].From, End: p.Pieces[len(p.Pieces)-1].To,
		Segments: p.Segments, Places: p.Places,
	}
	numbers := map[string]int{}
	for _, piece := range p.Pieces {
		text := governWords(piece.Sources)
		n, ok := numbers[text]
		if !ok {
			f.Governs = append(f.Governs, text)
			n = len(f.Governs)
			numbers[text] = n
		}
		f.After = append(f.After, level{piece.Start, piece.End, piece.Speed, n})
	}
	return f
}

// ProfileSVG draws a profile as one SVG file; several are drawn one below the
// other.
func ProfileSVG(w io.Writer, list ...Profile) error {
	type part struct {
		text   string
		height int
	}
	var parts []part
	total := 0
	for i, p := range list {
		f := profileFigure(p)
		text := f.svg(fmt.Sprintf("p%d", i))
		height := 0
		fmt.Sscanf(text[strings.Index(text, `viewBox="`):], `viewBox="0 0 960 %d"`, &height)
		parts = append(parts, part{text, height + 34})
		total += height + 34
	}
	if _, err := fmt.Fprintf(w, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" font-family="system-ui, sans-serif">`+"\n<rect width=\"100%%\" height=\"100%%\" fill=\"#fff\"/>\n", chartWidth, total); err != nil {
		return err
	}
	y := 0
	for i, p := range parts {
		fmt.Fprintf(w, `<text x="8" y="%d" font-size="14" font-weight="600">%s</text>`+"\n", y+20, esc(clip(list[i].title(), 120)))
		inner := strings.Replace(p.text, "<svg ", fmt.Sprintf(`<svg y="%d" width="%d" height="%d" `, y+30, chartWidth, p.height-34), 1)
		if _, err := io.WriteString(w, inner); err != nil {
			return err
		}
		y += p.height
	}
	_, err := io.WriteString(w, "</svg>\n")
	return err
}
