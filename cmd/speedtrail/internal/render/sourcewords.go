package render

import (
	"fmt"
	"strings"

	"speedtrail/history/assessment"
)

// sourceWords writes a governing row for a reader. The form of CSV, path:line kind value,
// puts two numbers beside each other: "cant deficiency 150 140".
func sourceWords(s assessment.Source) string {
	return fmt.Sprintf("%s: %d km/h", SourcePlace(s.File, s.Line, s.Kind), s.Value)
}

// SourcePlace is that without the speed, for where it stands beside it: each row that
// governs gives just that.
func SourcePlace(file string, line int, kind string) string {
	return fmt.Sprintf("%s:%d %s", file, line, kindWords(kind))
}

// kindWords says which restriction it is. "Train", a form of its own in CSV, says too
// little to a reader.
func kindWords(kind string) string {
	if kind == "train" {
		return "maximum speed of the train"
	}
	return kind
}

// sourcePlaces joins the places of rows.
func sourcePlaces(list []assessment.Source) string {
	words := make([]string, len(list))
	for i, s := range list {
		words[i] = SourcePlace(s.File, s.Line, s.Kind)
	}
	return strings.Join(words, "; ")
}
