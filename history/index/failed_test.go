package index

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"github.com/mattn/go-sqlite3"

	"speedtrail/history/internal/past"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
)

// Every error of the driver has a class, but for that of a caller who has had enough.
func TestClassify(t *testing.T) {
	for _, c := range []struct{ err, want error }{
		{nil, nil}, {context.Canceled, context.Canceled}, {io.ErrUnexpectedEOF, io.ErrUnexpectedEOF}, {errDamaged, ErrFailed}, {errEmptied, ErrFailed},
		{sqlite3.Error{Code: sqlite3.ErrFull}, ErrFailed}, {fmt.Errorf("x: %w", sqlite3.Error{Code: sqlite3.ErrIoErr}), ErrFailed},
		{sqlite3.Error{Code: sqlite3.ErrNotADB}, ErrForeign}, {ErrForeign, ErrForeign}, {ErrFailed, ErrFailed},
	} {
		if got := classify(c.err); !errors.Is(got, c.want) || !errors.Is(got, c.err) || (got == nil) != (c.err == nil) {
			t.Errorf("%v is %v, want %v", c.err, got, c.want)
		}
	}
}

// What cannot be written is said, and the index goes on without it: it never answers
// for commits whose rows are not there.
func TestFailedInsert(t *testing.T) {
	ctx := t.Context()
	repo, err := revision.Open(past.Write(t, past.History(rand.New(rand.NewPCG(1, 7)), 20)))
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	head, err := repo.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	tip, err := trace.ParseHash(head.Hash)
	if err != nil {
		t.Fatal(err)
	}
	for _, table := range []string{"version", "change", "chunk"} {
		t.Run(table, func(t *testing.T) {
			x, err := Open(ctx, filepath.Join(t.TempDir(), "index.db"))
			if err != nil {
				t.Fatal(err)
			}
			defer x.Close()
			// A change of temp_store, as Update makes it, would take the trigger away.
			if _, err := x.conn.ExecContext(ctx, "PRAGMA temp_store = MEMORY; CREATE TEMP TRIGGER full BEFORE INSERT ON "+table+" BEGIN SELECT RAISE(ABORT, 'no room'); END"); err != nil {
				t.Fatal(err)
			}
			if err := x.Update(ctx, trace.NewReader(repo, "."), ".", tip, nil); !errors.Is(err, ErrFailed) {
				t.Errorf("the index is written: %v", err)
			}
			if _, found, err := x.History(ctx, ".", tip, "R1"); found || err != nil {
				t.Errorf("it answers: %t, %v", found, err)
			}
			if _, err := x.conn.ExecContext(ctx, "DROP TRIGGER full"); err != nil {
				t.Fatal(err)
			}
			if err := x.Update(ctx, trace.NewReader(repo, "."), ".", tip, nil); err != nil {
				t.Fatal(err)
			}
			if _, found, err := x.History(ctx, ".", tip, "R1"); !found || err != nil {
				t.Errorf("it does not answer afterwards: %t, %v", found, err)
			}
		})
	}
}
