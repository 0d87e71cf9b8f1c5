package history

import (
	"context"
	"fmt"
	"time"

	"speedtrail/history/approval"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// formats of the bodies by kind.
var formats = map[chain.Kind]string{
	chain.SignOff: approval.SignOffFormat, chain.InForce: approval.InForceFormat, chain.Revocation: approval.RevocationFormat,
}

// Statement is a signed statement that somebody hands in.
type Statement struct {
	Kind            chain.Kind // of its entry: sign-off, in-force or revocation
	Text, Signature []byte     // as package signoff writes them
}

// RecordSigned checks a signed statement as verify does, and appends it. Both happen
// with the ledger locked, so that nothing can come between. line is what the caller
// has read of the ledger, which is followed to its end first; nil: nothing. The error
// is of class approval.ErrRefused, signoff.ErrSignature or signoff.ErrMalformed, or
// one of the ledger; then nothing was recorded.
func RecordSigned(ctx context.Context, l *ledger.Ledger, line *approval.Line, s Statement, now time.Time) (chain.Head, error) {
	e, err := l.Append(ctx, now, s.Kind, func() ([]byte, []ledger.Row, error) {
		line, err := followed(ctx, l, line)
		if err != nil {
			return nil, nil, err
		}
		signed := approval.Signed{Format: formats[s.Kind], Signature: string(s.Signature), Statement: string(s.Text)}
		// The recorded time has whole seconds, as the entry has.
		r, err := line.Check(s.Kind, signed, now.UTC().Truncate(time.Second))
		if err != nil {
			return nil, nil, err
		}
		body, err := canon.Marshal(signed)
		return body, rowsOf(s.Kind, &r), err
	})
	return e.Head(), err
}

// RecordAnchor checks an anchor and appends it, in the same way.
func RecordAnchor(ctx context.Context, l *ledger.Ledger, line *approval.Line, body approval.AnchorBody, now time.Time) (chain.Head, error) {
	e, err := l.Append(ctx, now, chain.Anchor, func() ([]byte, []ledger.Row, error) {
		line, err := followed(ctx, l, line)
		if err != nil {
			return nil, nil, err
		}
		a, err := line.CheckAnchor(body, now.UTC().Truncate(time.Second))
		if err != nil {
			return nil, nil, err
		}
		b, err := canon.Marshal(body)
		return b, anchorRows(a), err
	})
	return e.Head(), err
}

// followed follows a line to the end of the ledger.
func followed(ctx context.Context, l *ledger.Ledger, line *approval.Line) (*approval.Line, error) {
	if line == nil {
		line = approval.New(l.ID())
	}
	if _, err := ReadOn(ctx, l, line); err != nil {
		return nil, err
	}
	head, err := l.Head(ctx)
	if err == nil && head != line.Head() {
		err = ledger.Damaged(fmt.Errorf("the ledger ends at %s, and a moment ago went on to %s", head, line.Head()))
	}
	return line, err
}
