package main

import (
	"encoding/json"
	"io"

	"speedtrail/schema/source"
)

// indentedJSON writes a value for people and programs.
func indentedJSON(w io.Writer, v any) error {
	e := json.NewEncoder(source.InertJSON(w))
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
