package index

import (
	"context"
	"errors"
	"fmt"

	"speedtrail/history/trace"
)

// An index that turns out to be damaged is emptied and made again, while other
// processes may be at work on it. Nothing is ever taken out of an index but by
// making its tables anew, which SQLite counts in the file as changes of the
// schema, the edition: whoever finds another one than that of what it has read
// begins again.

var errEmptied = errors.New("another process has emptied the index meanwhile")

// editionNow gives that count.
func (x *Index) editionNow(ctx context.Context) (n int64, err error) {
	err = x.conn.QueryRowContext(ctx, "PRAGMA schema_version").Scan(&n)
	return n, err
}

// renew lets go of what was read where the index has been made anew since.
func (x *Index) renew(ctx context.Context) error {
	now, err := x.editionNow(ctx)
	if err != nil || now == x.edition {
		return err
	}
	// Perhaps by a speedtrail of another version.
	if current, err := x.check(ctx); err != nil {
		return err
	} else if !current {
		return fmt.Errorf("%w: a speedtrail of another version has made it anew", ErrFailed)
	}
	x.graphs, x.edition = nil, now
	return nil
}

// empty makes the index anew, unless another process has done so since it was
// read.
func (x *Index) empty(ctx context.Context) error {
	return x.transaction(ctx, "BEGIN IMMEDIATE", func() error {
		now, err := x.editionNow(ctx)
		if err != nil || now != x.edition {
			return err
		}
		return x.create(ctx)
	})
}

// mostTries is how often Past begins: others that empty the index do so once each.
const mostTries = 8

// Past gives the past of a route up to a commit, which Update adds if need be. An
// index that is damaged is emptied and made again, once; healing is called
// before.
func (x *Index) Past(ctx context.Context, reader *trace.Reader, name string, tip trace.Hash, route string, progress func(done, total int), healing func()) (*trace.History, error) {
	healed := false
	for range mostTries {
		h, found, err := x.History(ctx, name, tip, route)
		if err == nil && !found {
			if err = x.Update(ctx, reader, name, tip, progress); err == nil {
				h, found, err = x.History(ctx, name, tip, route)
			}
		}
		switch {
		case found && err == nil:
			return h, nil
		case err == nil || errors.Is(err, errEmptied):
			// Another process has emptied it.
		case !errors.Is(err, errDamaged) || healed:
			return nil, err
		default:
			healed = true
			healing()
			if err := x.empty(ctx); err != nil {
				return nil, classify(err)
			}
		}
	}
	return nil, classify(errEmptied)
}
