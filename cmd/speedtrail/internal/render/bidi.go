package render

import (
	"bytes"
	"io"
	"slices"
	"unicode"
	"unicode/utf8"
)

// leftToRightMark ends each run of Hebrew, Arabic and the like in the texts of a page.
// Without it a browser sets the number that follows such a name to its left, where it
// reads as that of the name before. What is copied from a page, as lines of files,
// statements and commands, stays as it is, and so do the values of the filters.
const leftToRightMark = "\u200e"

// fromTheRight are the scripts that are written from right to left.
var fromTheRight = []*unicode.RangeTable{
	unicode.Hebrew, unicode.Arabic, unicode.Syriac, unicode.Thaana, unicode.Nko, unicode.Samaritan, unicode.Mandaic, unicode.Adlam, unicode.Hanifi_Rohingya,
}

func isFromTheRight(r rune) bool { return r >= 0x590 && unicode.In(r, fromTheRight...) }

// asTheyStand are the elements whose texts are not touched.
var asTheyStand = []string{"pre", "code", "option", "style", "script", "title"}

// writeMarked writes a page with those marks.
func writeMarked(w io.Writer, page []byte) error {
	var out bytes.Buffer
	element := ""
	for len(page) > 0 {
		end := bytes.IndexByte(page, '<')
		if end < 0 {
			end = len(page)
		}
		if element == "" {
			markText(&out, page[:end])
		} else {
			out.Write(page[:end])
		}
		page = page[end:]
		end = bytes.IndexByte(page, '>') + 1 // of a tag, whose values have it escaped
		if end == 0 {
			end = len(page)
		}
		tag := bytes.Trim(page[:end], "<>")
		out.Write(page[:end])
		page = page[end:]
		name, closing := bytes.CutPrefix(tag, []byte("/"))
		if i := bytes.IndexAny(name, " \n"); i >= 0 {
			name = name[:i]
		}
		switch {
		case closing && string(name) == element:
			element = ""
		case !closing && element == "" && slices.Contains(asTheyStand, string(name)):
			element = string(name)
		}
	}
	_, err := w.Write(out.Bytes())
	return err
}

func markText(out *bytes.Buffer, text []byte) {
	run := -1 // where the last letter of a run ends
	for i := 0; i < len(text); {
		r, size := utf8.DecodeRune(text[i:])
		switch {
		case isFromTheRight(r):
			if run >= 0 {
				out.Write(text[run:i])
			}
			out.Write(text[i : i+size])
			run = i + size
		case run >= 0 && (r == ' ' || unicode.Is(unicode.Mn, r)):
			// It may go on.
		default:
			if run >= 0 {
				out.WriteString(leftToRightMark)
				out.Write(text[run:i])
				run = -1
			}
			out.Write(text[i : i+size])
		}
		i += size
	}
	if run >= 0 {
		out.WriteString(leftToRightMark)
		out.Write(text[run:])
	}
}

// hasFromTheRight tells whether a page has such letters at all.
func hasFromTheRight(page []byte) bool {
	for _, r := range string(page) {
		if isFromTheRight(r) {
			return true
		}
	}
	return false
}
