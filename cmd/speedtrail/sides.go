package main

import (
	"errors"
	"strings"

	"speedtrail/schema"
	"speedtrail/schema/source"
)

// sideError is what is wrong with the data set at one revision.
type sideError struct {
	label string
	err   error
}

// Error names the revision; faults of its data stand a line each.
func (e *sideError) Error() string {
	var faults *source.Faults
	if !errors.As(e.err, &faults) {
		return e.label + ": " + e.err.Error()
	}
	return "the data set of " + e.label + " is faulty\n" + faults.Error()
}

// Unwrap gives what is wrong.
func (e *sideError) Unwrap() error { return e.err }

// requestError is a request in play that names what neither revision has. Over many
// releases it can be right: a route that came and went in between.
type requestError struct {
	label string
	err   error
}

func (e *requestError) Error() string {
	return "requests in play of " + e.label + " do not fit the two revisions\n" + e.err.Error()
}

func (e *requestError) Unwrap() error { return e.err }

// Hint says what to do.
func (e *requestError) Hint() string {
	return "correct the request; where it was right for a revision in between, name the requests that count with --request, or none"
}

// inSides says of which revision an error of LoadPair is.
func inSides(err error, base, target side) error {
	var pair *schema.PairError
	if !errors.As(err, &pair) {
		return err
	}
	var list []error
	if pair.Base != nil {
		list = append(list, &sideError{base.label(), pair.Base})
	}
	if pair.Target != nil {
		list = append(list, &sideError{target.label(), pair.Target})
	}
	return &bothError{list}
}

// bothError joins the errors of both revisions; the exit status is that of the
// first.
type bothError struct{ list []error }

// Error gives the errors one below the other.
func (e *bothError) Error() string {
	texts := make([]string, len(e.list))
	for i, err := range e.list {
		texts[i] = err.Error()
	}
	return strings.Join(texts, "\n")
}

// Unwrap gives the errors.
func (e *bothError) Unwrap() []error { return e.list }
