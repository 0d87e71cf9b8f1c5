package ledger

import (
	"errors"
	"strings"

	"github.com/mattn/go-sqlite3"
)

// The classes of failure; test for them with errors.Is.
var (
	ErrNoLedger     = errors.New("there is no ledger")
	ErrForeign      = errors.New("the file is not a ledger of speedtrail, or was altered by another program")
	ErrNewer        = errors.New("the ledger was written by a newer version")
	ErrLocked       = errors.New("another process holds the ledger")
	ErrReadOnly     = errors.New("the ledger cannot be written")
	ErrFull         = errors.New("no space is left for the ledger")
	ErrDamaged      = errors.New("the ledger's file is damaged")
	ErrSymlink      = errors.New("the ledger is a symbolic link")
	ErrNoAssessment = errors.New("no such assessment")
)

var hints = map[error]string{
	ErrNoLedger:     "name one with --ledger, make one from an export with speedtrail import FILE, or begin one with speedtrail assess BASE TARGET",
	ErrForeign:      "name another file with --ledger, or restore the ledger from a backup",
	ErrNewer:        "use the newer version of speedtrail",
	ErrLocked:       "wait until it is done and try again; nothing was recorded",
	ErrReadOnly:     "check the rights of the file and its folder, or name another file with --ledger; nothing was recorded",
	ErrFull:         "free some space and do it again; register shows whether it was recorded, and nothing is recorded twice",
	ErrDamaged:      "keep the file as it is and restore a backup; compare its head with one noted elsewhere; speedtrail verify says more",
	ErrSymlink:      "name the file itself with --ledger",
	ErrNoAssessment: "speedtrail register lists the assessments",
	ErrExists:       "name a file that is not there yet with --ledger",
}

// Error is a failure of a class, with what was underneath.
type Error struct {
	Class error
	Err   error // may be nil
}

// Error gives the class and what was underneath.
func (e *Error) Error() string {
	if e.Err == nil {
		return e.Class.Error()
	}
	return e.Class.Error() + ": " + e.Err.Error()
}

// Unwrap gives both.
func (e *Error) Unwrap() []error { return []error{e.Class, e.Err} }

// Hint says what to do.
func (e *Error) Hint() string { return hints[e.Class] }

// Damaged gives an error of class ErrDamaged for what a reader of entries finds.
func Damaged(err error) error { return fail(ErrDamaged, err) }

func fail(class, err error) error { return &Error{class, err} }

// classify sorts an error of SQLite, or of reading a row, into a class. One that has
// a class keeps it.
func classify(err error) error {
	var s sqlite3.Error
	var classed *Error
	switch {
	case err == nil || errors.As(err, &classed):
		return err
	case strings.HasPrefix(err.Error(), "sql: Scan error"):
		// A value that the schema does not allow, NULL for the most part: it was written
		// past it. The package database/sql has no type for that error.
		return fail(ErrDamaged, err)
	case !errors.As(err, &s):
		return err
	}
	switch s.Code {
	case sqlite3.ErrBusy, sqlite3.ErrLocked:
		return fail(ErrLocked, err)
	case sqlite3.ErrReadonly, sqlite3.ErrPerm, sqlite3.ErrCantOpen, sqlite3.ErrAuth:
		return fail(ErrReadOnly, err)
	case sqlite3.ErrFull:
		return fail(ErrFull, err)
	case sqlite3.ErrIoErr:
		// What the system said tells more than which call it was.
		if class := systemClass(s.SystemErrno); class != nil {
			return fail(class, err)
		}
		return fail(ErrDamaged, err)
	case sqlite3.ErrNotADB:
		return fail(ErrForeign, err)
	case sqlite3.ErrCorrupt:
		return fail(ErrDamaged, err)
	}
	return err
}

// leftJournal tells whether a ledger could not be read because a process that
// ended early has left its journal, which only a writer may play back.
func leftJournal(err error) bool {
	var s sqlite3.Error
	return errors.As(err, &s) && (s.ExtendedCode == sqlite3.ErrReadonlyRollback || s.ExtendedCode == sqlite3.ErrReadonlyRecovery)
}
