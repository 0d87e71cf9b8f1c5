// Package source says where in the input a thing stands, and collects what is
// wrong there.
//
// A position is a file of the data set (slash-separated path from the data
// set's folder), a line and a column, both counted from 1; the column counts
// bytes of the line, a byte order mark not included. A fault is a position and
// a sentence. Reading goes on after a fault, so that one run reports all of
// them, in the order of the files and lines:
//
//	routes/sm1/speed.csv:4:11: speed "47" is not a multiple of 5 from 5 to 600
package source

import (
	"cmp"
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"
)

// Position is a place in the input. The zero Position is "nowhere"; Line 0
// stands for a file as a whole, Column 0 for a line as a whole.
type Position struct {
	File         string // slash-separated path from the data set's folder
	Line, Column int    // from 1; 0 = the whole file, the whole line
}

// String gives file:line:column, without the parts that are not known. A path
// with control codes in it comes out escaped.
func (p Position) String() string {
	file := Visible(p.File)
	switch {
	case p.Line == 0:
		return file
	case p.Column == 0:
		return file + ":" + strconv.Itoa(p.Line)
	}
	return fmt.Sprintf("%s:%d:%d", file, p.Line, p.Column)
}

// Compare orders positions by file (bytes), line and column.
func (p Position) Compare(q Position) int {
	return cmp.Or(
		strings.Compare(p.File, q.File),
		cmp.Compare(p.Line, q.Line),
		cmp.Compare(p.Column, q.Column),
	)
}

// quoteLimit is how many bytes of a quoted input an error message shows.
const quoteLimit = 80

// Quote quotes a piece of input for a message: control codes, invalid UTF-8
// and bidirectional marks come out escaped, and a long text is cut, so that
// hostile data cannot disturb a terminal or drown the message.
func Quote(s string) string {
	if len(s) <= quoteLimit {
		return Visible(strconv.Quote(s))
	}
	n := quoteLimit
	// No half letter; a byte that belongs to none stays, to be escaped.
	for back := 1; back < utf8.UTFMax; back++ {
		if start := n - back; utf8.RuneStart(s[start]) {
			if _, size := utf8.DecodeRuneInString(s[start:]); size > back {
				n = start
			}
			break
		}
	}
	return Visible(strconv.Quote(s[:n])) + "..."
}
