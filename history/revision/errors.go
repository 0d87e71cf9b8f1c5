package revision

import "errors"

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
)

// Error is a failure to read a repository.
type Error struct {
	Kind error  // one of the classes above
	Text string // what is wrong, with the name it is about
	Hint string // what to do next; may be empty
	Err  error  // what was underneath; may be nil
}

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

func corrupt(text string, err error) *Error {
	return &Error{
		Kind: ErrCorrupt, Text: text, Err: err,
		Hint: "run `git fsck`, then fetch the object again or use another clone",
	}
}
