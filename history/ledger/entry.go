package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"

	"speedtrail/history/chain"
)

// Head gives the newest entry's number and hash.
func (l *Ledger) Head(ctx context.Context) (chain.Head, error) {
	var h chain.Head
	err := l.conn.QueryRowContext(ctx, "SELECT seq, hash FROM entry ORDER BY seq DESC LIMIT 1").Scan(&h.Seq, &h.Hash)
	if errors.Is(err, sql.ErrNoRows) {
		return chain.Head{}, nil
	}
	return h, classify(err)
}

// Entry gives the entry of a number.
func (l *Ledger) Entry(ctx context.Context, seq int64) (chain.Entry, error) {
	e, err := scanEntry(l.conn.QueryRowContext(ctx, "SELECT seq, time, kind, body, previous, hash FROM entry WHERE seq = ?", seq))
	if errors.Is(err, sql.ErrNoRows) {
		return e, fail(ErrDamaged, fmt.Errorf("entry %d is missing", seq))
	}
	return e, err
}

// scanEntry reads the row of an entry.
func scanEntry(row *sql.Row) (e chain.Entry, err error) {
	scanned := row.Scan(&e.Seq, &e.Time, &e.Kind, &e.Body, &e.Previous, &e.Hash)
	err = classify(scanned)
	if errors.Is(err, ErrDamaged) && e.Seq > 0 {
		err = fail(ErrDamaged, fmt.Errorf("entry %d cannot be read: %w", e.Seq, scanned))
	}
	return e, err
}

// insertEntry appends an entry. It is called inside a transaction that has read
// the head, and UNIQUE(previous) keeps two entries from following the same one
// should that ever be wrong.
func (l *Ledger) insertEntry(ctx context.Context, e chain.Entry) error {
	_, err := l.conn.ExecContext(ctx, "INSERT INTO entry (seq, time, kind, body, previous, hash) VALUES (?, ?, ?, ?, ?, ?)",
		e.Seq, e.Time, string(e.Kind), e.Body, e.Previous, e.Hash)
	return err
}
