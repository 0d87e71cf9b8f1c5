package render

import "strings"

// tied joins what a reader needs beside each other, as km and the position after it, by
// blanks at which a browser ends no line: it would put a number on one line and its
// unit, or its minus sign, on the next.
func tied(s string) string {
	words := withUnits(strings.Split(s, " "))
	for i, w := range words {
		words[i] = strings.ReplaceAll(w, " ", "\u00a0")
	}
	return strings.Join(words, " ")
}

func tiedLines(list []fleetLine) []fleetLine {
	for i := range list {
		list[i].Step, list[i].Where = tied(list[i].Step), tied(list[i].Where)
	}
	return list
}
