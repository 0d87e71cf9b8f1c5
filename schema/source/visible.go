package source

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Visible writes a text so that a terminal shows it and does nothing else:
// control codes, line ends, bidirectional and other invisible marks and invalid
// UTF-8 come out as escapes such as \x1b or \u202e.
func Visible(s string) string {
	plain := true
	for _, r := range s {
		if !unicode.IsPrint(r) || r == utf8.RuneError {
			plain = false
			break
		}
	}
	if plain {
		return s
	}
	var b strings.Builder
	for i, r := range s {
		if unicode.IsPrint(r) && r != utf8.RuneError {
			b.WriteRune(r)
			continue
		}
		_, size := utf8.DecodeRuneInString(s[i:])
		quoted := strconv.Quote(s[i : i+size])
		b.WriteString(quoted[1 : len(quoted)-1])
	}
	return b.String()
}

// VisibleLines does the same for a text of several lines, whose line ends stay.
func VisibleLines(s string) string {
	lines := strings.Split(s, "\n")
	for i, line := range lines {
		lines[i] = Visible(line)
	}
	return strings.Join(lines, "\n")
}
