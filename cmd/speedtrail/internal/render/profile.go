package render

import (
	"fmt"
	"io"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// Profile is the effective profile of one train on one route and direction.
type Profile struct {
	Direction string               `json:"direction"`
	On        string               `json:"on"` // date for temporary restrictions, empty: all count
	Pieces    []Piece              `json:"pieces"`
	Places    []assessment.Place   `json:"places"`
	Revision  string               `json:"revision"`
	Route     string               `json:"route"`
	RouteName string               `json:"route_name"`
	Segments  []assessment.Segment `json:"segments"`
	Train     string               `json:"train"`
	TrainName string               `json:"train_name"`
}

// Piece is a stretch of constant speed.
type Piece struct {
	End     int64               `json:"end_mm"` // running distance
	From    string              `json:"from_km"`
	Sources []assessment.Source `json:"governed_by"`
	Speed   int                 `json:"speed_kmh"`
	Start   int64               `json:"start_mm"` // running distance
	To      string              `json:"to_km"`
}

func (p Profile) length() int64 { return p.Pieces[len(p.Pieces)-1].End }

func (p Profile) title() string {
	t := fmt.Sprintf("%s %s, %s, train %s (%s), at %s", p.Route, p.RouteName, p.Direction, p.Train, p.TrainName, p.Revision)
	if p.On != "" {
		t += ", temporary restrictions of " + p.On
	} else {
		t += ", all temporary restrictions, whatever their dates"
	}
	return source.Visible(t)
}

// ProfileText writes each profile as a chart and a table.
func ProfileText(w io.Writer, s Style, list ...Profile) error {
	for i, p := range list {
		if i > 0 {
			fmt.Fprintln(w)
		}
		if err := ProfileChart(w, s, p); err != nil {
			return err
		}
		t := plainTable()
		t.AppendHeader(table.Row{"from km", "to km", "length m", "km/h", "governed by"})
		t.SetColumnConfigs([]table.ColumnConfig{
			{Number: 1, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 2, Align: text.AlignRight, AlignHeader: text.AlignRight},
			{Number: 3, Align: text.AlignRight, AlignHeader: text.AlignRight}, {Number: 4, Align: text.AlignRight, AlignHeader: text.AlignRight},
		})
		from, to, length := make([]string, len(p.Pieces)), make([]string, len(p.Pieces)), make([]string, len(p.Pieces))
		for k, piece := range p.Pieces {
			from[k], to[k], length[k] = minus(piece.From), minus(piece.To), metres(piece.End-piece.Start)
		}
		from, to, length = onPoint(from), onPoint(to), onPoint(length)
		before := max(7, Cells(from[0])) + max(5, Cells(to[0])) + max(8, Cells(length[0])) + 12
		for k, piece := range p.Pieces {
			lines := make([]string, len(piece.Sources))
			for n, src := range piece.Sources {
				// Wrapped here: the table would run the sources together.
				lines[n] = Hanging(source.Visible(SourcePlace(src.File, src.Line, src.Kind)), max(minWidth, s.Width-before), "  ")
			}
			t.AppendRow(table.Row{from[k], to[k], length[k], piece.Speed, strings.Join(lines, "\n")})
		}
		if _, err := fmt.Fprintf(w, "\n%s\n", tidy(t.Render())); err != nil {
			return err
		}
	}
	return nil
}

// chartRows is the height of a chart in the terminal; a row holds eight steps of
// a block character.
const chartRows = 12

var blocks = []rune(" ▁▂▃▄▅▆▇█")

// ProfileChart draws profiles with block characters, as wide as the terminal.
// A column shows the lowest speed of the track that it stands for, so that no
// short restriction is lost.
func ProfileChart(w io.Writer, s Style, list ...Profile) error {
	for i, p := range list {
		if i > 0 {
			fmt.Fprintln(w)
		}
		if err := chart(w, s, p); err != nil {
			return err
		}
	}
	return nil
}

func chart(w io.Writer, s Style, p Profile) error {
	columns := max(20, min(s.Width, 160)-8)
	top := 0
	for _, piece := range p.Pieces {
		top = max(top, piece.Speed)
	}
	for _, round := range []int{40, 80, 120, 160, 200, 240, 320, 400, 480, 600} {
		if round >= top {
			top = round
			break
		}
	}
	lowest := make([]int, columns)
	k := 0
	for c := range columns {
		from, to := p.length()*int64(c)/int64(columns), p.length()*int64(c+1)/int64(columns)
		for k < len(p.Pieces)-1 && p.Pieces[k].End <= from {
			k++
		}
		lowest[c] = p.Pieces[k].Speed
		for n := k; n < len(p.Pieces) && p.Pieces[n].Start < to; n++ {
			lowest[c] = min(lowest[c], p.Pieces[n].Speed)
		}
	}
	for _, line := range Wrap(p.title(), s.Width) {
		fmt.Fprintln(w, line)
	}
	fmt.Fprintln(w, "km/h")
	for row := chartRows - 1; row >= 0; row-- {
		label := "    "
		if row%3 == 2 {
			label = fmt.Sprintf("%4d", top*(row+1)/chartRows)
		}
		var b strings.Builder
		for _, v := range lowest {
			eighths := v*chartRows*8/top - row*8
			b.WriteRune(blocks[max(0, min(8, eighths))])
		}
		fmt.Fprintf(w, "%s \u2502%s\n", label, strings.TrimRight(b.String(), " "))
	}
	line, labels := axis(p, columns)
	_, err := fmt.Fprintf(w, "   0 \u2514%s\n%s\n", line, labels)
	return err
}

// axis gives the line below a chart and the chainages below that: of both ends, both
// readings of a chainage jump, and round kilometres at about every eleventh column
// where there is room. A label begins at its column, which a mark on the line tells.
func axis(p Profile, columns int) (line, labels string) {
	marks, below := []rune(strings.Repeat("\u2500", columns)), []rune(strings.Repeat(" ", columns+12))
	put := func(column int, label string, mark rune) {
		r := []rune(label)
		for i := max(0, column-1); i < column+len(r)+1; i++ {
			if i >= len(below) || below[i] != ' ' {
				return
			}
		}
		copy(below[column:], r)
		if mark != 0 {
			marks[column] = mark
		}
	}
	first, last := minus(p.Pieces[0].From), minus(p.Pieces[len(p.Pieces)-1].To)
	put(0, first, 0)
	put(columns-len([]rune(last)), last, 0)
	at := func(distance int64) int { return int(distance * int64(columns) / p.length()) }
	for i, s := range p.Segments {
		if i > 0 {
			before := p.Segments[i-1]
			put(at(s.From), minus(km(before.Chainage+before.To-before.From))+"|"+minus(km(s.Chainage)), '\u253c')
		}
	}
	step := tickSteps[len(tickSteps)-1]
	for _, s := range tickSteps {
		if s*int64(columns) >= 11*p.length() {
			step = s
			break
		}
	}
	for _, s := range p.Segments {
		c := (s.Chainage + step - 1) / step * step
		if s.Chainage < 0 {
			c = s.Chainage / step * step
		}
		for ; c < s.Chainage+s.To-s.From; c += step {
			put(at(s.From+c-s.Chainage), minus(km(c)), '\u252c')
		}
	}
	return string(marks), "  km  " + strings.TrimRight(string(below), " ")
}

// plainTable makes a table with a rule below its head and nothing else.
func plainTable() table.Writer {
	t := table.NewWriter()
	style := table.StyleLight
	style.Options.DrawBorder = false
	style.Options.SeparateColumns = false
	style.Format.Header = text.FormatDefault
	style.Box.PaddingLeft, style.Box.PaddingRight = "", "  "
	t.SetStyle(style)
	return t
}

// tidy takes the blanks from the ends of lines, and from the rule below the head of a
// table what stands below such blanks: it would be wider than the terminal.
func tidy(s string) string {
	lines := strings.Split(s, "\n")
	for i, line := range lines {
		lines[i] = strings.TrimRight(line, " ")
		if strings.Trim(line, "\u2500") == "" {
			lines[i] = strings.TrimSuffix(line, "\u2500\u2500")
		}
	}
	return strings.Join(lines, "\n")
}
