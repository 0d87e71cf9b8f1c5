package render

import (
	"encoding/json"
	"io"

	"speedtrail/history/assessment"
)

// Formats of the JSON reports; their schemas stand under schema/json.
const (
	jsonFormat        = "speedtrail-report 1"
	profileJSONFormat = "speedtrail-profile 1"
)

// JSON writes the document as it is in the ledger, with what the ledger knows
// about it, or null.
func JSON(w io.Writer, d *assessment.Document, r Record) error {
	out := struct {
		Assessment *assessment.Document `json:"assessment"`
		Caution    string               `json:"caution"`
		Format     string               `json:"format"`
		Record     *Record              `json:"record"`
		Verdict    string               `json:"verdict"`
	}{d, Caution, jsonFormat, nil, Verdict(d)}
	if r.Number != 0 {
		out.Record = &r
	}
	return indented(w, out)
}

// ProfileJSON writes profiles.
func ProfileJSON(w io.Writer, list ...Profile) error {
	return indented(w, struct {
		Caution  string    `json:"caution"`
		Format   string    `json:"format"`
		Profiles []Profile `json:"profiles"`
	}{Caution, profileJSONFormat, list})
}

func indented(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
