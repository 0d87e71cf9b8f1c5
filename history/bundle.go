package history

import (
	"bufio"
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"iter"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"

	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/schema/source"
)

// maxLine bounds the line of an entry that is imported, in bytes.
const maxLine = 512 << 20

// exported is an entry as a line of JSON. The body is a text: its bytes are
// hashed as they stand there.
type exported struct {
	Body     string `json:"body"`
	Hash     string `json:"hash"`
	Kind     string `json:"kind"`
	Previous string `json:"previous"`
	Seq      int64  `json:"seq"`
	Time     string `json:"time"`
}

// Export writes the entries of a ledger as JSON Lines, the oldest first. With
// them anyone can check the chain (package chain has the algorithm), and Import
// makes a ledger with the same head.
func Export(ctx context.Context, l *ledger.Ledger, w io.Writer) error {
	b := bufio.NewWriterSize(source.InertJSON(w), 1<<16)
	for e, err := range l.Entries(ctx, 1) {
		if err != nil {
			return err
		}
		line, err := json.Marshal(exported{string(e.Body), e.Hash, string(e.Kind), e.Previous, e.Seq, e.Time}, json.Deterministic(true))
		if err != nil {
			return err
		}
		b.Write(line)
		if err := b.WriteByte('\n'); err != nil {
			return err
		}
	}
	return b.Flush()
}

// CheckBody refuses a body that is so large that no import would read the export of
// its entry: once recorded, it would stand in the way of every export.
func CheckBody(body []byte) error { return checkBody(body, maxLine) }

func checkBody(body []byte, most int) error {
	// Beside the body a line has less than restOfLine bytes, and of the body's bytes
	// none takes more than six.
	const restOfLine, largest = 1000, 6
	if len(body) <= (most-restOfLine)/largest {
		return nil
	}
	text, err := json.Marshal(string(body))
	if err != nil {
		return err
	}
	var n counted
	if _, err := source.InertJSON(&n).Write(text); err != nil {
		return err
	}
	if int(n) > most-restOfLine {
		return fmt.Errorf("it takes %d bytes in an export, of which import reads %d at most", n, most-restOfLine)
	}
	return nil
}

// counted counts what is written.
type counted int

// Write implements io.Writer.
func (n *counted) Write(p []byte) (int, error) {
	*n += counted(len(p))
	return len(p), nil
}

// ImportError is what is wrong with a line of an import.
type ImportError struct {
	Line int
	Err  error
}

// Error gives the line and what is wrong with it.
func (e *ImportError) Error() string { return fmt.Sprintf("line %d: %v", e.Line, e.Err) }

// Unwrap gives what is wrong.
func (e *ImportError) Unwrap() error { return e.Err }

// Import makes a ledger from an export. A file that holds something is refused;
// where the import is faulty nothing is left of it, or an empty file on a file
// system without links. The error is an *ImportError or one of the ledger.
func Import(ctx context.Context, file string, r io.Reader) (chain.Head, error) {
	head, err := ledger.Restore(ctx, file, readExport(ctx, r))
	var wrong *ledger.EntryError
	if errors.As(err, &wrong) {
		// Every entry has a line, and they are numbered in their order.
		err = &ImportError{int(wrong.Seq), wrong.Err}
	}
	return head, err
}

func readExport(ctx context.Context, r io.Reader) iter.Seq2[ledger.Restored, error] {
	return func(yield func(ledger.Restored, error) bool) {
		s := bufio.NewScanner(r)
		s.Buffer(make([]byte, 0, 1<<16), maxLine)
		var head chain.Head
		line, blank := 0, 0
		for s.Scan() {
			line++
			if len(bytes.TrimSpace(s.Bytes())) == 0 {
				blank = cmp.Or(blank, line) // an editor leaves some at the end
				continue
			}
			if blank > 0 {
				yield(ledger.Restored{}, &ImportError{blank, errors.New("it is blank, and entries follow it")})
				return
			}
			e, err := readLine(s.Bytes())
			if err == nil {
				err = chain.Check(head, e.Entry)
			}
			if err == nil {
				err = ctx.Err()
			}
			if err != nil {
				yield(e, &ImportError{line, err})
				return
			}
			head = e.Head()
			if !yield(e, nil) {
				return
			}
		}
		if err := s.Err(); err != nil {
			yield(ledger.Restored{}, &ImportError{line + 1, err})
		}
	}
}

// readLine reads an entry and makes the rows that repeat it.
func readLine(text []byte) (e ledger.Restored, err error) {
	var x exported
	if err := json.Unmarshal(bytes.TrimSpace(text), &x, json.RejectUnknownMembers(true), jsontext.AllowDuplicateNames(false)); err != nil {
		return e, err
	}
	e.Entry = chain.Entry{Seq: x.Seq, Time: x.Time, Kind: chain.Kind(x.Kind), Body: []byte(x.Body), Previous: x.Previous, Hash: x.Hash}
	if e.Kind == chain.Assessment {
		doc, digest, err := assessment.Decode(e.Body)
		if err != nil {
			return e, err
		}
		record := assessment.LedgerRecord(doc, e.Body, digest)
		e.Assessment = &record
		return e, nil
	}
	e.Rows, err = signedRows(e.Entry)
	return e, err
}

// signedRows gives the rows that repeat an entry of signed statements, from its
// body alone: whether the statements count is not asked. It gives none for other
// kinds of entry.
func signedRows(e chain.Entry) ([]ledger.Row, error) {
	switch e.Kind {
	case chain.Anchor:
		var body approval.AnchorBody
		if err := canon.Unmarshal(e.Body, &body); err != nil {
			return nil, err
		}
		a := &approval.AnchorRecord{}
		for _, s := range body.Statements {
			r, err := approval.Read(s)
			if err != nil {
				return nil, err
			}
			a.Records = append(a.Records, r)
		}
		return anchorRows(a), nil
	case chain.SignOff, chain.InForce, chain.Revocation:
		var body approval.Signed
		if err := canon.Unmarshal(e.Body, &body); err != nil {
			return nil, err
		}
		r, err := approval.Read(body)
		if err != nil {
			return nil, err
		}
		return rowsOf(e.Kind, &r), nil
	}
	return nil, nil
}
