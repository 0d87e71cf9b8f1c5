package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"iter"
	"os"
	"path/filepath"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
)

// ErrExists is the class of the refusal to write over a file.
var ErrExists = errors.New("there is a file already")

// Restored is an entry of another ledger with the rows that repeat it: an
// Assessment, or Rows.
type Restored struct {
	chain.Entry
	Assessment *Record
	Rows       []Row
}

// Restore writes a ledger anew from entries, all in one transaction: the file
// holds all of them, or is removed again. Each entry is checked against the one
// before. A file that exists is refused.
func Restore(ctx context.Context, file string, entries iter.Seq2[Restored, error]) (head chain.Head, err error) {
	if _, err := os.Lstat(file); err == nil {
		return head, fail(ErrExists, nil)
	}
	if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
		return head, fail(ErrReadOnly, err)
	}
	db, err := sql.Open("sqlite3", address(file, Options{Create: true}))
	if err != nil {
		return head, classify(err)
	}
	l := &Ledger{db: db, format: Format}
	defer func() {
		if closed := l.Close(); err == nil {
			err = classify(closed)
		}
		if err != nil {
			os.Remove(file)
		}
	}()
	if l.conn, err = db.Conn(ctx); err != nil {
		return head, classify(err)
	}
	if err := l.exec(ctx, "PRAGMA trusted_schema = OFF", "PRAGMA foreign_keys = ON", "PRAGMA recursive_triggers = ON", "PRAGMA synchronous = EXTRA", "PRAGMA journal_mode = DELETE"); err != nil {
		return head, classify(err)
	}
	err = l.transaction(ctx, func() error {
		if err := migrate(ctx, l.conn, 0, Format); err != nil {
			return err
		}
		if err := l.exec(ctx, fmt.Sprintf("PRAGMA application_id = %d", applicationID), fmt.Sprintf("PRAGMA user_version = %d", Format)); err != nil {
			return err
		}
		number := int64(0)
		for e, err := range entries {
			if err != nil {
				return err
			}
			if err := chain.Check(head, e.Entry); err != nil {
				return err
			}
			if err := canon.Check(e.Body); err != nil {
				return fmt.Errorf("entry %d: the body is %w", e.Seq, err)
			}
			if (e.Seq == 1) != (e.Kind == chain.Ledger) {
				return fmt.Errorf("entry %d is of kind %s", e.Seq, e.Kind)
			}
			if e.Seq == 1 {
				if _, err := idOf(e.Entry); err != nil {
					return err
				}
			}
			if err := l.insertEntry(ctx, e.Entry); err != nil {
				return err
			}
			if e.Assessment != nil {
				number++
				if err := l.insertRows(ctx, number, e.Seq, *e.Assessment); err != nil {
					return err
				}
			}
			for _, r := range e.Rows {
				if err := l.insertRow(ctx, e.Seq, r); err != nil {
					return err
				}
			}
			head = e.Head()
		}
		if head.Seq == 0 {
			return errors.New("no entry was given")
		}
		return nil
	})
	return head, err
}
