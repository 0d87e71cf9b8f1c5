package revision

import (
	"errors"
	"fmt"
	"io/fs"
	"strings"
	"unicode/utf8"
)

// The classes of failure. Test for them with errors.Is; the error itself is an
// *Error, whose text names the repository, revision, object or folder and says
// on a second line what to do next.
var (
	ErrNoRepository  = errors.New("no git repository")
	ErrUnsupported   = errors.New("unsupported repository format")
	ErrUnknown       = errors.New("unknown revision")
	ErrAmbiguous     = errors.New("ambiguous revision")
	ErrNotCommit     = errors.New("not a commit")
	ErrMissingObject = errors.New("missing object")
	ErrShallow       = errors.New("shallow boundary")
	ErrCorrupt       = errors.New("corrupt repository")
	ErrNoFolder      = errors.New("no such folder")
	ErrBare          = errors.New("no working tree")
	ErrNotFile       = errors.New("not a regular file")
	ErrTooLarge      = errors.New("too large")
	ErrUnreadable    = errors.New("may not be read") // the system refuses it, mostly for lack of rights

	// ErrMalformed is a class within ErrCorrupt: the object has the content that its
	// hash says, and that is not of the form that is needed. Somebody made it so, and
	// every clone has it.
	ErrMalformed = errors.New("malformed object")
)

// Error is a failure to read a repository.
type Error struct {
	Kind error  // one of the classes above
	Text string // what is wrong, with the name it is about
	Hint string // what to do next; may be empty
	Err  error  // what was underneath; may be nil

	malformed bool
}

// Is tells whether the error is of class ErrMalformed as well.
func (e *Error) Is(target error) bool { return e.malformed && target == ErrMalformed }

// Error gives the text and, on a line of its own, the hint.
func (e *Error) Error() string {
	s := e.Text
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Hint != "" {
		s += "\nhint: " + e.Hint
	}
	return s
}

// Unwrap gives the class and the error underneath.
func (e *Error) Unwrap() []error {
	if e.Err == nil {
		return []error{e.Kind}
	}
	return []error{e.Kind, e.Err}
}

// corrupt is the error for what is damaged. What the system refuses to show is
// not damaged, so that has its own class here, too.
func corrupt(text string, err error) *Error {
	if errors.Is(err, fs.ErrPermission) {
		return unreadable(text, err)
	}
	return &Error{
		Kind: ErrCorrupt, Text: text, Err: err,
		Hint: "run `git fsck`, then fetch the object again or use another clone",
	}
}

// malformed is the error for an object of which nothing is damaged.
func malformed(text string, err error) *Error {
	return &Error{Kind: ErrCorrupt, Text: text, Err: err, Hint: "it was made so, and every clone has it; `git fsck` says more", malformed: true}
}

// unreadable is the error for what the system refuses to open or to list.
func unreadable(text string, err error) *Error {
	e := &Error{Kind: ErrUnreadable, Text: text, Err: err}
	if errors.Is(err, fs.ErrPermission) {
		e.Hint = "see to it that this user may read the repository, all of its folders and files"
	}
	return e
}

// orUnreadable gives an error of the system the class of what may not be read
// where rights are the reason, and leaves any other as it is.
func orUnreadable(text string, err error) error {
	var classed *Error
	if !errors.Is(err, fs.ErrPermission) || errors.As(err, &classed) {
		return err
	}
	return unreadable(text, err)
}

// nameError refuses a path that is not UTF-8. A file of such a name can stand in
// a tree and on disk, and is listed there, but fs.FS has no path that leads to
// it. The text has the name escaped.
type nameError struct{ op, name string }

func (e *nameError) Error() string {
	return fmt.Sprintf("%s %q: %v", e.op, e.name, errNotUTF8)
}

// Unwrap gives what fs.FS asks for, and the class.
func (e *nameError) Unwrap() []error {
	return []error{&fs.PathError{Op: e.op, Path: e.name, Err: fs.ErrInvalid}, errNotUTF8}
}

var errNotUTF8 = &Error{
	Kind: ErrNotFile, Text: "the name is not UTF-8, so it cannot be part of a data set",
	Hint: "rename it",
}

// checkPath applies the rules of fs.FS to a path that comes from a caller.
func checkPath(op, name string) error {
	switch {
	case fs.ValidPath(name):
		return nil
	case !utf8.ValidString(name) && fs.ValidPath(strings.ToValidUTF8(name, "\uFFFD")):
		return &nameError{op, name}
	}
	return pathError(op, name, fs.ErrInvalid)
}
