// Package table reads CSV tables and TOML files into cells and values that
// know their position, and records what is wrong with their form.
//
// It knows nothing of railways: which columns and keys there are, and what
// their values mean, is said by the caller. It refuses what hides data: unknown
// columns and keys, ragged rows, invalid UTF-8, control and bidirectional codes
// in texts. Sizes and counts are bounded.
//
//	var faults source.Collector
//	t := table.ReadCSV("speed.csv", content, []string{"from_km", "to_km", "note"}, []string{"from_km", "to_km"}, &faults)
//	for row := range t.Rows() {
//		cell := row.Cell("from_km") // cell.Text, cell.Pos
//	}
package table

import (
	"bytes"
	"unicode"
	"unicode/utf8"

	"speedtrail/schema/source"
)

// Bounds of what is read.
const (
	MaxTableSize = 16 << 20 // bytes of a CSV file
	MaxTOMLSize  = 1 << 20  // bytes of a TOML file
	MaxColumns   = 64
	MaxRows      = 200_000
	MaxCell      = 4096 // bytes of a cell or of a text
	MaxKeys      = 1000 // of one TOML table, and tables of different names in a file
)

var byteOrderMark = []byte("\xEF\xBB\xBF")

// CheckUTF8 records the first invalid byte of each of the first lines that have
// one, and tells whether the content can be read.
func CheckUTF8(file string, content []byte, faults *source.Collector) bool {
	if utf8.Valid(content) {
		return true
	}
	const most = 20
	found := 0
	for line := 1; len(content) > 0 && found < most; line++ {
		text, rest, _ := bytes.Cut(content, []byte("\n"))
		content = rest
		for i := 0; i < len(text); {
			r, size := utf8.DecodeRune(text[i:])
			if r == utf8.RuneError && size == 1 {
				faults.Add(source.Position{File: file, Line: line, Column: i + 1},
					"byte 0x%02x is not valid UTF-8, save the file as UTF-8", text[i])
				found++
				break
			}
			i += size
		}
	}
	return false
}

// TextProblem says why a text may not stand in a data set: it holds a code that
// a reader does not see, or it is too long. It is empty for a good text.
func TextProblem(s string) string {
	if len(s) <= MaxCell && plain(s) {
		return ""
	}
	if !utf8.ValidString(s) {
		return "not valid UTF-8"
	}
	if len(s) > MaxCell {
		return "longer than 4096 bytes"
	}
	for _, r := range s {
		switch {
		case unicode.IsControl(r):
			return "holding a control code, only visible characters are allowed"
		case unicode.Is(unicode.Cf, r), r == '\u2028', r == '\u2029', r >= '\U000E0000' && r <= '\U000E007F':
			// Format characters: marks of direction, blanks and joiners of no
			// width, soft hyphens, byte order marks; and the block of tags.
			return "holding an invisible mark that can deceive a reader, only visible characters are allowed"
		}
	}
	return ""
}

// plain tells whether a text is made of visible ASCII characters and blanks, as
// most are.
func plain(s string) bool {
	for i := range len(s) {
		if s[i] < ' ' || s[i] > '~' {
			return false
		}
	}
	return true
}
