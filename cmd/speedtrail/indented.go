package main

import (
	"encoding/json"
	"io"
)

// indentedJSON writes a value for people and programs.
func indentedJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
