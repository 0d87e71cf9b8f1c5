// Package lines compares two texts line by line, for readers who want to see
// the rows that were edited.
//
//	lines.Hunks("a\nb\n", "a\nc\n", 3)
//
// gives one hunk: "a" kept, "b" removed, "c" added. The result depends on the
// texts alone, never on how long the comparison takes.
package lines

import (
	"strings"

	"github.com/sergi/go-diff/diffmatchpatch"
)

// Op says which of the texts a line is in.
type Op byte

// The three cases, as they are written in a diff.
const (
	Kept    Op = '='
	Removed Op = '-'
	Added   Op = '+'
)

// Line is a line without its end.
type Line struct {
	Op   Op
	Text string
}

// Hunk is a run of lines around differences, with the numbers, from 1, of its
// first line in both texts.
type Hunk struct {
	OldLine, NewLine int
	Lines            []Line
}

// workLimit bounds the product of the lines that two texts do not share at
// their ends. Past it the middle is given as removed and added as a whole,
// which is true, too, only less fine.
const workLimit = 25_000_000

// runeLimit bounds the lines that are compared finely: each distinct one takes
// a code point.
const runeLimit = 1_000_000

// Compare lists all lines of both texts in order. Carriage returns before line
// ends and a byte order mark are not compared.
func Compare(old, now string) []Line {
	a, b := split(old), split(now)
	head := 0
	for head < len(a) && head < len(b) && a[head] == b[head] {
		head++
	}
	tail := 0
	for tail < len(a)-head && tail < len(b)-head && a[len(a)-1-tail] == b[len(b)-1-tail] {
		tail++
	}
	list := make([]Line, 0, len(a)+len(b)-head-tail)
	for _, text := range a[:head] {
		list = append(list, Line{Kept, text})
	}
	list = append(list, middle(a[head:len(a)-tail], b[head:len(b)-tail])...)
	for _, text := range a[len(a)-tail:] {
		list = append(list, Line{Kept, text})
	}
	return list
}

// middle compares two lists of lines that differ at both ends.
func middle(a, b []string) []Line {
	var list []Line
	if len(a)*len(b) > workLimit || len(a)+len(b) > runeLimit {
		for _, text := range a {
			list = append(list, Line{Removed, text})
		}
		for _, text := range b {
			list = append(list, Line{Added, text})
		}
		return list
	}
	// Each distinct line becomes one rune, so that the library compares lines.
	// Surrogates are no runes and are stepped over.
	numbers := map[string]rune{}
	var texts []string
	encode := func(list []string) []rune {
		runes := make([]rune, len(list))
		for i, text := range list {
			n, ok := numbers[text]
			if !ok {
				n = rune(len(texts))
				numbers[text] = n
				texts = append(texts, text)
			}
			if n >= 0xD800 {
				n += 0x800
			}
			runes[i] = n
		}
		return runes
	}
	x, y := encode(a), encode(b)
	d := diffmatchpatch.New()
	d.DiffTimeout = 0 // a time limit would make the result depend on the machine
	for _, part := range d.DiffMainRunes(x, y, false) {
		op := Kept
		switch part.Type {
		case diffmatchpatch.DiffDelete:
			op = Removed
		case diffmatchpatch.DiffInsert:
			op = Added
		}
		for _, n := range part.Text {
			if n >= 0xD800 {
				n -= 0x800
			}
			list = append(list, Line{op, texts[n]})
		}
	}
	return list
}

// split cuts a text into lines without their ends.
func split(text string) []string {
	text = strings.TrimPrefix(text, "\uFEFF")
	if text == "" {
		return nil
	}
	list := strings.Split(strings.TrimSuffix(text, "\n"), "\n")
	for i, line := range list {
		list[i] = strings.TrimSuffix(line, "\r")
	}
	return list
}

// Hunks gives the differences with up to context kept lines around them.
func Hunks(old, now string, context int) []Hunk {
	all := Compare(old, now)
	show := make([]bool, len(all))
	for i, l := range all {
		if l.Op == Kept {
			continue
		}
		for k := max(0, i-context); k < min(len(all), i+context+1); k++ {
			show[k] = true
		}
	}
	var hunks []Hunk
	oldLine, newLine := 1, 1
	for i, l := range all {
		if show[i] {
			if i == 0 || !show[i-1] {
				hunks = append(hunks, Hunk{OldLine: oldLine, NewLine: newLine})
			}
			h := &hunks[len(hunks)-1]
			h.Lines = append(h.Lines, l)
		}
		if l.Op != Added {
			oldLine++
		}
		if l.Op != Removed {
			newLine++
		}
	}
	return hunks
}
