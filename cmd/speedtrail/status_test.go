package main

import (
	"context"
	"errors"
	"fmt"
	"testing"

	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// Status 2 is for what the caller can put right, 3 for the machine, the ledger and a
// repository that cannot be read. Of two sides the data counts before the machine.
func TestStatusOf(t *testing.T) {
	faults, machine := error(&source.Faults{}), errors.New("no space left")
	for _, c := range []struct {
		err  error
		want int
	}{
		{nil, 0}, {errFindings, 1}, {badCall("", "x"), 2}, {faults, 2}, {machine, 3}, {context.Canceled, 3},
		{revision.ErrUnknown, 2}, {revision.ErrAmbiguous, 2}, {revision.ErrNotCommit, 2}, {revision.ErrNoFolder, 2}, {revision.ErrBare, 2}, {ledger.ErrNoAssessment, 2},
		{revision.ErrMissingObject, 3}, {revision.ErrShallow, 3}, {ledger.ErrDamaged, 3}, {ledger.ErrForeign, 3}, {ledger.ErrNoLedger, 3},
		{&schema.PairError{Base: faults}, 2}, {&schema.PairError{Target: faults}, 2}, {&schema.PairError{Base: faults, Target: faults}, 2},
		{&schema.PairError{Base: faults, Target: machine}, 2}, {&schema.PairError{Base: machine, Target: faults}, 2},
		{&schema.PairError{Base: machine}, 3}, {&schema.PairError{Target: machine}, 3}, {&schema.PairError{Base: machine, Target: machine}, 3},
	} {
		if got := statusOf(c.err); got != c.want {
			t.Errorf("%v: status %d, want %d", c.err, got, c.want)
		}
		if c.err == nil {
			continue
		}
		if got := statusOf(fmt.Errorf("of something: %w", c.err)); got != c.want {
			t.Errorf("%v in another error: status %d, want %d", c.err, got, c.want)
		}
	}
}
