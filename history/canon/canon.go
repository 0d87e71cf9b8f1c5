// Package canon writes and checks canonical JSON (RFC 8785), the form of every
// body in the ledger: members in the order of their names, no blanks, one way
// to write each text and number. Bodies hold no fractions: numbers are whole
// and below 2^53, so that every reader in every language sees the same.
//
//	canon.Marshal(map[string]any{"b": 1, "a": "x"}) // {"a":"x","b":1}
package canon

import (
	"bytes"
	"errors"
	"fmt"
	"reflect"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"
)

// ErrNotCanonical is the error of Check.
var ErrNotCanonical = errors.New("not canonical JSON (RFC 8785)")

// Marshal writes a value as canonical JSON. Texts that are not valid UTF-8 are
// refused; nil slices are empty arrays.
func Marshal(v any) ([]byte, error) {
	b, err := json.Marshal(v)
	if err != nil {
		return nil, err
	}
	value := jsontext.Value(b)
	if err := value.Canonicalize(); err != nil {
		return nil, err
	}
	return value, nil
}

// Append writes a value to b as Marshal does, but in one pass if its type allows
// that: see InOrder.
func Append(b *bytes.Buffer, v any) error {
	if InOrder(reflect.TypeOf(v)) {
		return json.MarshalWrite(b, v)
	}
	text, err := Marshal(v)
	b.Write(text)
	return err
}

// Unmarshal reads canonical JSON into a value and refuses members that the value
// does not have. The error names the member, always in the same words (those of
// the library differ from run to run on purpose).
func Unmarshal(body []byte, v any) error {
	err := json.Unmarshal(body, v, json.RejectUnknownMembers(true))
	var form *json.SemanticError
	var syntax *jsontext.SyntacticError
	switch {
	case errors.As(err, &form):
		return fmt.Errorf("member %q is not of the form that is needed", form.JSONPointer)
	case errors.As(err, &syntax):
		return fmt.Errorf("it is not JSON from byte %d on", syntax.ByteOffset)
	}
	return err
}

// Check proves that bytes are canonical JSON. The error is ErrNotCanonical.
func Check(body []byte) error {
	if plainly(body) {
		return nil
	}
	return checkByLibrary(body)
}

func checkByLibrary(body []byte) error {
	value := jsontext.Value(bytes.Clone(body))
	if err := value.Canonicalize(); err != nil {
		return fmt.Errorf("%w: %w", ErrNotCanonical, err)
	}
	if !bytes.Equal(value, body) {
		return ErrNotCanonical
	}
	return nil
}
