package ledger

import (
	"context"
	"crypto/rand"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"iter"
	"os"
	"path/filepath"

	"github.com/mattn/go-sqlite3"

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

// EntryError is what is wrong with the entries that a ledger was to be made of.
type EntryError struct {
	Seq int64 // of the entry; of the first one where there is none
	Err error
}

// Error gives the entry and what is wrong with it.
func (e *EntryError) Error() string { return fmt.Sprintf("entry %d: %v", e.Seq, e.Err) }

// Unwrap gives what is wrong.
func (e *EntryError) Unwrap() error { return e.Err }

// link gives a file a second name, and fails where there is one by that name.
var link = os.Link

// Restore writes a ledger anew from entries: the file holds all of them, or there
// is none. Each entry is checked against the one before; what is wrong with one is
// an *EntryError. A file that holds something is refused, also one that another
// process makes meanwhile: nothing is written over or removed that this call has not
// made.
func Restore(ctx context.Context, file string, entries iter.Seq2[Restored, error]) (head chain.Head, err error) {
	if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
		return head, fail(ErrReadOnly, err)
	}
	here, err := standing(file)
	if err != nil {
		return head, err
	}
	if here {
		return fill(ctx, file, entries)
	}
	temporary, err := beside(file)
	if err != nil {
		return head, err
	}
	// SQLite takes the journal away itself, unless it was stopped by an error.
	defer os.Remove(temporary + "-journal")
	defer os.Remove(temporary)
	probe := temporary + "-link"
	if err := link(temporary, probe); err != nil {
		// A file system without a second name for a file: the place itself is filled,
		// and where that fails an empty file stays. Others may wait for it by now,
		// and would write into a file that is gone.
		return fill(ctx, file, entries)
	}
	if err := os.Remove(probe); err != nil {
		return head, fail(ErrReadOnly, err)
	}
	if head, err = fill(ctx, temporary, entries); err != nil {
		return chain.Head{}, err
	}
	if err := link(temporary, file); err != nil {
		if errors.Is(err, fs.ErrExist) {
			return chain.Head{}, fail(ErrExists, nil)
		}
		return chain.Head{}, fail(ErrReadOnly, err)
	}
	os.Remove(temporary)
	syncFolder(file)
	return head, nil
}

// standing tells whether something stands in the place of a ledger that only
// SQLite can judge, with its locks: an empty file, or what a process left that was
// stopped while it made the ledger. What is no such thing is refused.
func standing(file string) (bool, error) {
	info, err := os.Lstat(file)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return false, fail(ErrReadOnly, err)
	}
	there := err == nil
	if there && !info.Mode().IsRegular() {
		return false, fail(ErrExists, nil)
	}
	// A journal that stays behind would be played back into a file that is put
	// beside it. Before an empty one SQLite removes it.
	for _, ending := range []string{"-journal", "-wal"} {
		if _, err := os.Lstat(file + ending); err == nil {
			return true, nil
		}
	}
	if there && info.Size() > 0 {
		return false, fail(ErrExists, nil)
	}
	return there, nil
}

// beside makes an empty file in the folder of another one, with the rights that a
// ledger has. What stays of it after a kill disturbs nobody.
func beside(file string) (string, error) {
	name := filepath.Join(filepath.Dir(file), ".ledger-import-"+rand.Text())
	f, err := os.OpenFile(name, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o644)
	if err != nil {
		var inner *fs.PathError
		if errors.As(err, &inner) { // nobody knows the name of the new file
			err = fmt.Errorf("folder %s: %w", filepath.Dir(file), inner.Err)
		}
		return "", fail(ErrReadOnly, err)
	}
	if err := f.Close(); err != nil {
		return "", fail(ErrReadOnly, err)
	}
	return name, nil
}

// syncFolder has the new name outlive a loss of power. Not every system can do
// that, and the ledger is whole without.
func syncFolder(file string) {
	if d, err := os.Open(filepath.Dir(file)); err == nil {
		_ = d.Sync()
		d.Close()
	}
}

// fill writes entries into a file that holds nothing, all in one transaction: a
// file that holds something by the time it is locked is left as it is.
func fill(ctx context.Context, file string, entries iter.Seq2[Restored, error]) (head chain.Head, err error) {
	db, err := sql.Open("sqlite3", address(file, Options{Create: true}))
	if err != nil {
		return head, classify(err)
	}
	l := &Ledger{db: db, format: Format}
	defer func() {
		if closed := l.Close(); err == nil {
			err = classify(closed)
		}
	}()
	if l.conn, err = db.Conn(ctx); err != nil {
		return head, classify(err)
	}
	if err := l.exec(ctx, "PRAGMA trusted_schema = OFF", "PRAGMA cell_size_check = ON", "PRAGMA foreign_keys = ON", "PRAGMA recursive_triggers = ON", "PRAGMA synchronous = EXTRA"); err != nil {
		return head, classify(err)
	}
	err = l.transaction(ctx, func() error {
		empty, err := l.check(ctx)
		if errors.Is(err, ErrForeign) || errors.Is(err, ErrNewer) || err == nil && !empty {
			return fail(ErrExists, nil)
		}
		if err != nil {
			return err
		}
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
			if err := fits(head, e.Entry); err != nil {
				return &EntryError{e.Seq, err}
			}
			if e.Assessment != nil {
				number++
			}
			if err := l.insertRestored(ctx, number, e); err != nil {
				return err
			}
			head = e.Head()
		}
		if head.Seq == 0 {
			return &EntryError{1, errors.New("no entry was given")}
		}
		return nil
	})
	return head, err
}

// fits checks what an entry has to be to follow a head, whatever it says.
func fits(head chain.Head, e chain.Entry) error {
	if err := chain.Check(head, e); err != nil {
		return fmt.Errorf("it %w", errors.Unwrap(err))
	}
	if err := canon.Check(e.Body); err != nil {
		return fmt.Errorf("the body is %w", err)
	}
	if (e.Seq == 1) != (e.Kind == chain.Ledger) {
		return fmt.Errorf("it is of kind %s", e.Kind)
	}
	if e.Seq == 1 {
		_, err := idOf(e)
		return err
	}
	return nil
}

// insertRestored writes an entry with its rows; number is that of its assessment,
// where it is one.
func (l *Ledger) insertRestored(ctx context.Context, number int64, e Restored) error {
	err := l.insertEntry(ctx, e.Entry)
	if err == nil && e.Assessment != nil {
		err = l.insertRows(ctx, number, e.Seq, *e.Assessment)
	}
	for _, r := range e.Rows {
		if err == nil {
			err = l.insertRow(ctx, e.Seq, r)
		}
	}
	var s sqlite3.Error
	if errors.As(err, &s) && s.Code == sqlite3.ErrConstraint {
		// A sign-off of no assessment, a digest that is there already, and the like.
		return &EntryError{e.Seq, fmt.Errorf("it does not go with those before it: %w", err)}
	}
	return err
}
