package main

import (
	"errors"
	"fmt"

	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema/source"
)

// Exit statuses. They are part of the interface.
const (
	statusDone    = 0 // done, and nothing against it
	statusFinding = 1 // done, and there is an unaccepted finding
	statusInput   = 2 // the call or the data is wrong
	statusFailed  = 3 // the tool could not do its work: disk, ledger, repository
)

// callError is a call that cannot be carried out as it was given.
type callError struct {
	problem, hint string
}

func (e *callError) Error() string { return e.problem }

// Hint says what to do.
func (e *callError) Hint() string { return e.hint }

func badCall(hint, format string, args ...any) error {
	return &callError{fmt.Sprintf(format, args...), hint}
}

// errFindings ends a command whose result holds an unaccepted finding. The
// result itself says which; nothing more is printed.
var errFindings = errors.New("there are unaccepted findings")

// statusOf sorts an error into the exit statuses. Of errors that are joined, such as
// those of two revisions, the data comes before the machine.
func statusOf(err error) int {
	var call *callError
	var faults *source.Faults
	switch {
	case err == nil:
		return statusDone
	case errors.Is(err, errFindings):
		return statusFinding
	case errors.As(err, &call), errors.As(err, &faults), isWrongInput(err):
		return statusInput
	}
	return statusFailed
}

// isWrongInput tells errors about what was asked for from those about the
// repository that was asked.
func isWrongInput(err error) bool {
	for _, input := range []error{
		revision.ErrUnknown, revision.ErrAmbiguous, revision.ErrNotCommit, revision.ErrNoFolder, revision.ErrBare,
		ledger.ErrNoAssessment,
	} {
		if errors.Is(err, input) {
			return true
		}
	}
	return false
}

// hintOf finds what an error says to do.
func hintOf(err error) string {
	var h interface{ Hint() string }
	if errors.As(err, &h) {
		return h.Hint()
	}
	return ""
}
