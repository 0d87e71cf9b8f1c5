package render

import (
	"encoding/csv"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"speedtrail/history/assessment"
)

// harmless prefixes a text that a spreadsheet could take for a formula with an
// apostrophe. Numbers and positions are left alone. Where the decimal sign is a comma,
// spreadsheets take semicolons for what divides the cells of a file, whatever it was
// made with: what follows one is looked at as well.
func harmless(s string) string {
	if !strings.ContainsRune(s, ';') {
		return inert(s)
	}
	parts := strings.Split(s, ";")
	for i, part := range parts {
		parts[i] = inert(part)
	}
	return strings.Join(parts, ";")
}

// inert is harmless for a cell. Quotation marks at its beginning are those of the
// cell where it is taken out of a larger one.
func inert(s string) string {
	first, _ := utf8.DecodeRuneInString(strings.TrimLeft(s, `"`))
	if !strings.ContainsRune("=+-@\t\r\n\uff1d\uff0b\uff0d\uff20", first) || negative.MatchString(s) {
		return s
	}
	return "'" + s
}

// negative is a number or position below 0.
var negative = regexp.MustCompile(`^-[0-9]+(\.[0-9]+)?(#[0-9]+)?$`)

func yesNo(b bool) string {
	if b {
		return "yes"
	}
	return "no"
}

// CSV writes the speed changes, one row a train and stretch.
func CSV(w io.Writer, d *assessment.Document) error {
	out := csv.NewWriter(w)
	out.Write([]string{"route", "direction", "train", "from_km", "to_km", "length_m", "before_kmh", "after_kmh", "run_out", "before_source", "after_source"})
	texts := map[*assessment.Route][]string{}
	for row := range d.Computed.Rows() {
		list, ok := texts[row.Route]
		if !ok {
			for _, s := range row.Route.Sources {
				list = append(list, harmless(assessment.SourceText(s)))
			}
			texts[row.Route] = list
		}
		x := row.Change
		out.Write([]string{
			harmless(row.Route.ID), x.Direction, harmless(row.Train), x.From, x.To, metres(x.Length),
			strconv.Itoa(x.Before), strconv.Itoa(x.After), yesNo(x.RunOut), list[x.BeforeSource], list[x.AfterSource],
		})
	}
	out.Flush()
	return out.Error()
}

// ProfileCSV writes profiles, one row a piece.
func ProfileCSV(w io.Writer, list ...Profile) error {
	out := csv.NewWriter(w)
	out.Write([]string{"route", "direction", "train", "from_km", "to_km", "length_m", "speed_kmh", "governed_by"})
	for _, p := range list {
		for _, piece := range p.Pieces {
			out.Write([]string{
				harmless(p.Route), p.Direction, harmless(p.Train), piece.From, piece.To, metres(piece.End - piece.Start),
				strconv.Itoa(piece.Speed), harmless(assessment.SourceText(piece.Sources)),
			})
		}
	}
	out.Flush()
	return out.Error()
}
