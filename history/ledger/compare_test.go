package ledger

import (
	"database/sql"
	"errors"
	"maps"
	"path/filepath"
	"strings"
	"testing"
)

// The first difference is named, and the tables behind it are counted all the same:
// what is missing in one does not make the others look too full.
func TestCompareRows(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	l := open(t, file)
	want := record("a", 3)
	in, err := l.RecordAssessment(t.Context(), when, want)
	if err != nil {
		t.Fatal(err)
	}
	counts := map[string]int64{"assessment": 1, "request": 2, "preparer": 1, "finding": 1, "speed_change": 3}
	if got, err := l.CompareRows(t.Context(), in.Number, in.Head.Seq, want); err != nil || !maps.Equal(got, counts) {
		t.Fatal(got, err)
	}
	db, err := sql.Open("sqlite3", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	for _, statement := range []string{
		"DROP TRIGGER request_update", "DROP TRIGGER finding_delete",
		"UPDATE request SET title = 'another' WHERE place = 2", "DELETE FROM finding",
	} {
		if _, err := db.Exec(statement); err != nil {
			t.Fatal(err)
		}
	}
	counts["finding"] = 0
	got, err := l.CompareRows(t.Context(), in.Number, in.Head.Seq, want)
	if !errors.Is(err, ErrDamaged) || !strings.Contains(err.Error(), "row 2 of table request has title another") || !maps.Equal(got, counts) {
		t.Error(got, err)
	}
}
