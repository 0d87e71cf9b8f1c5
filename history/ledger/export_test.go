package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"testing"
	"time"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
)

// WithVFS gives options with another layer below SQLite.
func WithVFS(o Options, name string) Options {
	o.vfs = name
	return o
}

// WithoutLinks has files have one name only, as some file systems do.
func WithoutLinks() (back func()) {
	link = func(string, string) error { return errors.ErrUnsupported }
	return func() { link = os.Link }
}

// FormatOf is the format of an open ledger's file.
func FormatOf(l *Ledger) int { return l.format }

// SmallCache makes a large entry go to the file piece by piece before it is
// committed, as one does that is larger than SQLite's memory for it.
func SmallCache(ctx context.Context, l *Ledger) error { return l.exec(ctx, "PRAGMA cache_size = 10") }

// Objects lists the tables, indexes, triggers and views of a ledger.
func Objects(ctx context.Context, l *Ledger) ([]string, error) { return objects(ctx, l.conn) }

// CreateFormat makes a ledger as the version of the tool did that knew only the
// first formats.
func CreateFormat(t testing.TB, file string, format int, now time.Time, id string, records ...Record) chain.Head {
	t.Helper()
	must := func(err error) {
		if err != nil {
			t.Helper()
			t.Fatal(err)
		}
	}
	ctx := context.Background()
	db, err := sql.Open("sqlite3", address(file, Options{Create: true}))
	must(err)
	l := &Ledger{db: db, format: format}
	defer l.Close()
	l.conn, err = db.Conn(ctx)
	must(err)
	must(l.transaction(ctx, func() error {
		if err := migrate(ctx, l.conn, 0, format); err != nil {
			return err
		}
		if err := l.exec(ctx, fmt.Sprintf("PRAGMA application_id = %d", applicationID), fmt.Sprintf("PRAGMA user_version = %d", format)); err != nil {
			return err
		}
		body, err := canon.Marshal(firstBody{Format: firstFormat, ID: id})
		if err != nil {
			return err
		}
		return l.insertEntry(ctx, chain.Next(chain.Head{}, now, chain.Ledger, body))
	}))
	for _, r := range records {
		_, err := l.RecordAssessment(ctx, now, r)
		must(err)
	}
	head, err := l.Head(ctx)
	must(err)
	return head
}
