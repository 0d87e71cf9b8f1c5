package table

import "bytes"

// Unresolved is what is wrong with a file in which a MergeMarker stands.
const Unresolved = "a merge of Git left both versions here: keep the lines that hold, and take the marks <<<<<<<, ======= and >>>>>>> away"

// MergeMarker finds the first line by which Git marks what it could not merge.
func MergeMarker(content []byte) (line int, ok bool) {
	first := len(content)
	for _, mark := range [...]string{"<<<<<<< ", "=======", ">>>>>>> "} {
		for from := 0; from < first; {
			i := bytes.Index(content[from:first], []byte(mark))
			if i < 0 {
				break
			}
			i += from
			if from = i + 1; i > 0 && content[i-1] != '\n' {
				continue
			}
			// The one in the middle stands alone.
			if rest := content[i+len(mark):]; mark[0] != '=' || len(rest) == 0 || rest[0] == '\n' || rest[0] == '\r' {
				first = i
			}
		}
	}
	return 1 + bytes.Count(content[:first], newline), first < len(content)
}
