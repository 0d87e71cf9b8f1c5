package render

import (
	"io"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"

	"speedtrail/history/assessment"
	"speedtrail/schema/source"
)

// Formats of the JSON reports; their schemas stand under schema/json.
const (
	jsonFormat        = "speedtrail-report 1"
	profileJSONFormat = "speedtrail-profile 1"
)

// report is the JSON form of an assessment: the document as it is in the ledger,
// with what the ledger knows about it.
type report struct {
	Assessment *assessment.Document `json:"assessment"`
	Caution    string               `json:"caution"`
	Format     string               `json:"format"`
	// Record is null for an assessment that is not recorded.
	Record  *Record `json:"record" jsonschema:"nullable"`
	Verdict string  `json:"verdict"`
}

// JSON writes a report.
func JSON(w io.Writer, d *assessment.Document, r Record) error {
	out := report{d, Caution, jsonFormat, nil, Verdict(d)}
	if r.Number != 0 {
		out.Record = &r
	}
	return indented(w, out)
}

// profiles is the JSON form of profiles.
type profiles struct {
	Caution  string    `json:"caution"`
	Format   string    `json:"format"`
	Profiles []Profile `json:"profiles"`
}

// ProfileJSON writes profiles.
func ProfileJSON(w io.Writer, list ...Profile) error {
	return indented(w, profiles{Caution, profileJSONFormat, list})
}

// indented writes a value for people; a list without elements is an empty array.
func indented(w io.Writer, v any) error {
	if err := json.MarshalWrite(source.InertJSON(w), v, json.Deterministic(true), jsontext.WithIndent("  ")); err != nil {
		return err
	}
	_, err := io.WriteString(w, "\n")
	return err
}
