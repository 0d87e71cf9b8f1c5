package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"iter"
	"time"

	"speedtrail/history/chain"
)

// Row is a row of one of the tables that repeat what people signed. Values stand
// in the order of the table's columns, without the entry's number in front.
type Row struct {
	Table  Table
	Values []any
}

// Table names a table.
type Table string

// The tables of signed statements.
const (
	AnchorTable     Table = "anchor"
	SignOffTable    Table = "sign_off"
	InForceTable    Table = "in_force"
	RevocationTable Table = "revocation"
)

// names are the columns of a table after the entry's number.
var names = map[Table][]string{
	AnchorTable:     {"place", "folder", "revision", "content", "policy", "role", "signer", "key", "time", "statement_sha256"},
	SignOffTable:    {"assessment", "digest", "role", "decision", "reason", "signer", "key", "time", "statement_sha256"},
	InForceTable:    {"folder", "revision", "content", "routes", "since", "corrects", "reason", "signer", "key", "time", "statement_sha256"},
	RevocationTable: {"revoked_key", "role", "reason", "signer", "key", "time", "statement_sha256"},
}

// ColumnName gives the name of a value of a Row.
func ColumnName(table Table, value int) string { return names[table][value] }

// Append adds an entry. build is called with the ledger locked for writing: it
// gives the body and the rows, or an error for which nothing is added. Between
// its reading of the newest entries and the writing of the new one nobody else
// can add any.
func (l *Ledger) Append(ctx context.Context, now time.Time, kind chain.Kind, build func() (body []byte, rows []Row, err error)) (e chain.Entry, err error) {
	err = l.transaction(ctx, func() error {
		head, err := l.Head(ctx)
		if err != nil {
			return err
		}
		body, rows, err := build()
		if err != nil {
			return err
		}
		e = chain.Next(head, now, kind, body)
		if err := l.insertEntry(ctx, e); err != nil {
			return err
		}
		for _, r := range rows {
			if err := l.insertRow(ctx, e.Seq, r); err != nil {
				return err
			}
		}
		return nil
	})
	return e, err
}

func (l *Ledger) insertRow(ctx context.Context, entry int64, r Row) error {
	list, ok := names[r.Table]
	if !ok || len(r.Values) != len(list) {
		return fmt.Errorf("table %q has no row of %d values", r.Table, len(r.Values))
	}
	marks := "?"
	for range r.Values {
		marks += ", ?"
	}
	_, err := l.conn.ExecContext(ctx, "INSERT INTO "+string(r.Table)+" VALUES ("+marks+")", append([]any{entry}, r.Values...)...)
	return err
}

// Rows gives the rows of a table of signed statements that belong to an entry.
func (l *Ledger) Rows(ctx context.Context, table Table, entry int64) ([]Row, error) {
	if names[table] == nil {
		return nil, fmt.Errorf("no table %q", table)
	}
	n := len(names[table]) + 1
	if old, err := l.older(ctx); err != nil || old {
		return nil, err
	}
	rows, err := l.conn.QueryContext(ctx, "SELECT * FROM "+string(table)+" WHERE entry = ? ORDER BY 1, 2", entry)
	if err != nil {
		return nil, classify(err)
	}
	defer rows.Close()
	var list []Row
	for rows.Next() {
		values := make([]any, n)
		into := make([]any, n)
		for i := range values {
			into[i] = &values[i]
		}
		if err := rows.Scan(into...); err != nil {
			return nil, classify(err)
		}
		list = append(list, Row{table, values[1:]})
	}
	return list, classify(rows.Err())
}

// older tells whether the file has not the tables of signed statements. Another
// process may have given it them since it was opened.
func (l *Ledger) older(ctx context.Context) (bool, error) {
	if l.format < 2 {
		if err := l.conn.QueryRowContext(ctx, "PRAGMA user_version").Scan(&l.format); err != nil {
			return false, classify(err)
		}
	}
	return l.format < 2, nil
}

// Entries runs over the entries from a number on, in their order.
func (l *Ledger) Entries(ctx context.Context, from int64) iter.Seq2[chain.Entry, error] {
	return func(yield func(chain.Entry, error) bool) {
		// One at a time, so that the caller may ask for other things in between:
		// the ledger has one connection.
		for seq := from; ; {
			e, err := scanEntry(l.conn.QueryRowContext(ctx, "SELECT seq, time, kind, body, previous, hash FROM entry WHERE seq >= ? ORDER BY seq LIMIT 1", seq))
			if errors.Is(err, sql.ErrNoRows) {
				return
			}
			if err != nil {
				yield(e, err)
				return
			}
			if !yield(e, nil) {
				return
			}
			seq = e.Seq + 1
		}
	}
}

// NumberOf gives the number of the assessment that an entry holds.
func (l *Ledger) NumberOf(ctx context.Context, entry int64) (number int64, err error) {
	err = l.conn.QueryRowContext(ctx, "SELECT number FROM assessment WHERE entry = ?", entry).Scan(&number)
	if errors.Is(err, sql.ErrNoRows) {
		return 0, fail(ErrDamaged, fmt.Errorf("the assessment of entry %d has no row", entry))
	}
	return number, classify(err)
}
