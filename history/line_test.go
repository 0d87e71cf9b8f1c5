package history_test

import (
	"database/sql"
	"errors"
	"testing"

	"speedtrail/history"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
)

// The signer signs for the findings that nobody accepted, and for requests that
// nobody looked at.
func TestFindingsOfStatement(t *testing.T) {
	list := []assessment.Finding{{ID: "outside"}, {ID: "masked"}, {ID: "outside"}, {ID: "step-size", Accepted: "looked at"}}
	for _, x := range []struct {
		list       []assessment.Finding
		noRequests bool
		rules      int
		want       string
	}{
		{nil, false, 4, "none"},
		{list[3:], false, 4, "none"},
		{list, false, 4, "outside 2, masked 1"},
		{list, true, 4, "requests not looked at, outside 2, masked 1"},
		{nil, true, 4, "requests not looked at"},
		{list, true, 3, "outside 2, masked 1"},
		{nil, true, 3, "none"},
	} {
		c := &assessment.Computed{Findings: x.list, Options: assessment.Options{NoRequests: x.noRequests}, RulesVersion: x.rules}
		if got := history.Findings(c); got != x.want {
			t.Errorf("got %q, want %q", got, x.want)
		}
	}
}

// Lists are made of the rows of assessments, and nobody is shown one that does not
// repeat its entry: each column of it, and the requests that lists name.
func TestLineOfAlteredRows(t *testing.T) {
	for name, statement := range map[string]string{
		"nothing":         "SELECT 1",
		"digest":          "UPDATE assessment SET digest = 'x' WHERE number = 1",
		"base":            "UPDATE assessment SET base = target WHERE number = 1",
		"target":          "UPDATE assessment SET target = base WHERE number = 1",
		"folder":          "UPDATE assessment SET folder = 'elsewhere' WHERE number = 1",
		"data set":        "UPDATE assessment SET dataset = 'another' WHERE number = 1",
		"changes":         "UPDATE assessment SET speed_changes = speed_changes + 1 WHERE number = 1",
		"findings":        "UPDATE assessment SET findings = findings + 1 WHERE number = 1",
		"id of a request": "UPDATE request SET id = 'CR-99' WHERE assessment = 1",
		"no requests":     "DELETE FROM request WHERE assessment = 1",
		"no row":          "DELETE FROM assessment WHERE number = 4",
		"no such entry":   "INSERT INTO assessment SELECT 99, 999, 'x', base, target, folder, dataset, rules_version, speed_changes, findings FROM assessment WHERE number = 1",
	} {
		t.Run(name, func(t *testing.T) {
			file := baseLedger(t)
			x := &tamperer{t: t, file: file}
			x.sql(func(db *sql.DB) { x.exec(db, statement) })
			line, _, err := history.ReadLine(t.Context(), openLedger(t, file))
			if name == "nothing" {
				if err != nil || line.Numbered() != 4 {
					t.Fatal(line, err)
				}
			} else if !errors.Is(err, ledger.ErrDamaged) {
				t.Errorf("%v is not an error of class ErrDamaged", err)
			}
		})
	}
}
