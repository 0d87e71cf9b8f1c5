package render

import (
	"strings"

	"github.com/jedib0t/go-pretty/v6/text"
)

func init() {
	// Else the environment would decide how wide a minus sign is, and the same result
	// would be laid out in two ways. Chinese, Japanese and Korean letters take two
	// columns all the same.
	text.OverrideRuneWidthEastAsianWidth(false)
}

// Cells is how many columns of a terminal a text takes.
func Cells(s string) int {
	n := 0
	for _, r := range s {
		n += text.RuneWidth(r)
	}
	return n
}

// padded fills a text up with blanks on the right.
func padded(s string, width int) string { return s + strings.Repeat(" ", max(0, width-Cells(s))) }

// Wrap breaks a text into lines of at most width columns, at its blanks but for those
// between a number and its unit, and within
// words where letters of two columns stand beside each other: their languages write
// no blanks. A longer word, such as a path, stays whole.
func Wrap(s string, width int) []string {
	var lines []string
	line, used := "", 0
	for _, word := range withUnits(strings.Fields(s)) {
		gap := 1
		for _, part := range parts(word) {
			n := Cells(part)
			switch {
			case line == "":
				line, used = part, n
			case used+gap+n > width:
				lines = append(lines, line)
				line, used = part, n
			default:
				line += strings.Repeat(" ", gap) + part
				used += gap + n
			}
			gap = 0
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

// withUnits joins words that a reader needs beside each other: km and the position
// after it, a number and the unit after it.
func withUnits(words []string) []string {
	var list []string
	for _, word := range words {
		if n := len(list) - 1; n >= 0 {
			before := list[n]
			before = before[strings.LastIndexByte(before, ' ')+1:]
			position := strings.Trim(before, "(") == "km" && startsWithDigit(word)
			unit := strings.TrimRight(word, ",;:.)")
			if position || units[unit] && before[len(before)-1] >= '0' && before[len(before)-1] <= '9' {
				list[n] += " " + word
				continue
			}
		}
		list = append(list, word)
	}
	return list
}

var units = map[string]bool{"km": true, "m": true, "mm": true, "s": true, "km/h": true}

func startsWithDigit(s string) bool {
	s = strings.TrimLeft(s, "\u2212-")
	return s != "" && s[0] >= '0' && s[0] <= '9'
}

// parts cuts a word where a line may end: before and after each letter of two
// columns, but not before a comma and the like.
func parts(word string) []string {
	var list []string
	start, wide := 0, false
	for i, r := range word {
		n := text.RuneWidth(r)
		if n == 0 || strings.ContainsRune(",.;:)]\u3001\u3002\uff0c\uff09", r) { // belongs to the letter before
			continue
		}
		if i > start && (wide || n > 1) {
			list = append(list, word[start:i])
			start = i
		}
		wide = n > 1
	}
	return append(list, word[start:])
}

// Hanging is Wrap with the lines after the first set in.
func Hanging(s string, width int, indent string) string {
	return strings.Join(Wrap(s, max(minWidth, width-len(indent))), "\n"+indent)
}

// columnHeads gives the heads of the columns of numbers of a table: with the unit below
// the name where the numbers would else take more than a width.
func columnHeads(heads []string, most int, width func(heads []string) int) []string {
	if width(heads) <= most {
		return heads
	}
	narrow := make([]string, len(heads))
	for i, h := range heads {
		narrow[i] = strings.Replace(h, " ", "\n", 1)
	}
	width(narrow)
	return narrow
}

// headWidth is how many columns a head takes.
func headWidth(head string) int {
	n := 0
	for line := range strings.Lines(head) {
		n = max(n, Cells(strings.TrimSuffix(line, "\n")))
	}
	return n
}

// minWidth is the width of a text in the narrowest terminal.
const minWidth = 20

// onPoint sets positions, lengths and other numbers below each other by the decimal
// point; what follows the decimals, as the occurrence of a position does, stands out
// on the right.
func onPoint(list []string) []string {
	left, right := 0, 0
	at := make([]int, len(list))
	for i, s := range list {
		if at[i] = strings.IndexByte(s, '.'); at[i] < 0 {
			at[i] = len(s)
		}
		left, right = max(left, Cells(s[:at[i]])), max(right, Cells(s[at[i]:]))
	}
	out := make([]string, len(list))
	for i, s := range list {
		if s != "" {
			s = strings.Repeat(" ", left-Cells(s[:at[i]])) + padded(s, Cells(s[:at[i]])+right)
		}
		out[i] = s
	}
	return out
}
