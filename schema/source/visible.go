package source

import (
	"fmt"
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
		if !seen(r) || r == utf8.RuneError {
			plain = false
			break
		}
	}
	if plain {
		return s
	}
	var b strings.Builder
	for i, r := range s {
		switch {
		case seen(r) && r != utf8.RuneError:
			b.WriteRune(r)
			continue
		case Blank(r) && r > 0xffff:
			fmt.Fprintf(&b, `\U%08x`, r)
			continue
		case Blank(r):
			fmt.Fprintf(&b, `\u%04x`, r)
			continue
		}
		_, size := utf8.DecodeRuneInString(s[i:])
		quoted := strconv.Quote(s[i : i+size])
		b.WriteString(quoted[1 : len(quoted)-1])
	}
	return b.String()
}

// Blank tells of a letter, mark or symbol that nobody sees though Unicode counts it
// among those that are printed: selectors of variants, fillers, the blank of Braille.
func Blank(r rune) bool {
	return r > unicode.MaxLatin1 && unicode.IsPrint(r) &&
		(r == '\u2800' || unicode.In(r, unicode.Variation_Selector, unicode.Other_Default_Ignorable_Code_Point))
}

// seen tells whether a character is one that a reader sees, or the blank.
func seen(r rune) bool { return unicode.IsPrint(r) && !Blank(r) }

// VisibleLines does the same for a text of several lines, whose line ends stay.
func VisibleLines(s string) string {
	lines := strings.Split(s, "\n")
	for i, line := range lines {
		lines[i] = Visible(line)
	}
	return strings.Join(lines, "\n")
}
