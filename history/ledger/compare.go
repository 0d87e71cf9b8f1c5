package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
)

// Tables lists the tables beside the entries.
var Tables = []string{"assessment", "request", "preparer", "finding", "speed_change", "anchor", "sign_off", "in_force", "revocation"}

// RowCount gives how many rows of a table repeat entries up to a number, and how
// many repeat no entry at all; none for a table that an older format does not
// have. Each count is one query, so that entries that others add meanwhile are
// left out and not miscounted.
func (l *Ledger) RowCount(ctx context.Context, table string, last int64) (n, orphans int64, err error) {
	key := "assessment IN (SELECT number FROM assessment WHERE entry <= ?)"
	orphan := "assessment NOT IN (SELECT number FROM assessment WHERE entry IN (SELECT seq FROM entry))"
	switch {
	case names[Table(table)] != nil:
		if old, err := l.older(ctx); err != nil || old {
			return 0, 0, err
		}
		fallthrough
	case table == "assessment":
		key, orphan = "entry <= ?", "entry NOT IN (SELECT seq FROM entry)"
	}
	// A row of no entry is an orphan and nothing else.
	err = l.conn.QueryRowContext(ctx, "SELECT count(*) FROM "+quoted(table)+" WHERE ("+key+") AND NOT ("+orphan+")", last).Scan(&n)
	if err == nil {
		err = l.conn.QueryRowContext(ctx, "SELECT count(*) FROM "+quoted(table)+" WHERE "+orphan).Scan(&orphans)
	}
	return n, orphans, classify(err)
}

// quoted writes the name of a table; it is one of Tables.
func quoted(table string) string { return `"` + table + `"` }

// CompareRows compares the rows of an assessment with those that its body asks
// for. The error of class ErrDamaged names the first difference; counts gives
// how many rows were compared in each table.
func (l *Ledger) CompareRows(ctx context.Context, number, entry int64, r Record) (counts map[string]int64, err error) {
	changes := int64(0)
	for range r.Changes {
		changes++
	}
	counts = map[string]int64{}
	// All tables are counted, whatever is found in the first ones.
	one := func(table string, want func(yield func([]any) bool)) {
		n, found := l.compareTable(ctx, table, number, want)
		counts[table] = n
		if err == nil {
			err = found
		}
	}
	one("assessment", func(yield func([]any) bool) {
		yield([]any{number, entry, r.Digest, r.Base, r.Target, r.Folder, r.Dataset, int64(r.RulesVersion), changes, int64(len(r.Findings))})
	})
	one("request", func(yield func([]any) bool) {
		for i, q := range r.Requests {
			if !yield([]any{number, int64(i + 1), q.ID, q.Title}) {
				return
			}
		}
	})
	one("preparer", func(yield func([]any) bool) {
		for i, p := range r.Preparers {
			if !yield([]any{number, int64(i + 1), p.Name, p.Email}) {
				return
			}
		}
	})
	one("finding", func(yield func([]any) bool) {
		for i, f := range r.Findings {
			if !yield([]any{number, int64(i + 1), f.ID, f.Route, f.Direction, f.From, f.To, f.Text, f.Accepted}) {
				return
			}
		}
	})
	one("speed_change", func(yield func([]any) bool) {
		place := int64(0)
		for c := range r.Changes {
			place++
			runOut := int64(0)
			if c.RunOut {
				runOut = 1
			}
			if !yield([]any{number, place, c.Route, c.Direction, c.Train, c.From, c.To, c.LengthMM, int64(c.Before), int64(c.After), runOut, c.BeforeSource, c.AfterSource}) {
				return
			}
		}
	})
	return counts, err
}

// compareTable compares the rows of one table, in their order.
func (l *Ledger) compareTable(ctx context.Context, table string, number int64, want func(yield func([]any) bool)) (n int64, err error) {
	key := "assessment"
	if table == "assessment" {
		key = "number"
	}
	rows, err := l.conn.QueryContext(ctx, "SELECT * FROM "+quoted(table)+" WHERE "+key+" = ? ORDER BY 1, 2", number)
	if err != nil {
		return 0, classify(err)
	}
	defer rows.Close()
	names, err := rows.Columns()
	if err != nil {
		return 0, classify(err)
	}
	have, into := make([]any, len(names)), make([]any, len(names))
	for i := range have {
		into[i] = &have[i]
	}
	want(func(row []any) bool {
		if !rows.Next() {
			err = rowError(table, n+1, "is missing")
			return false
		}
		if err = rows.Scan(into...); err != nil {
			err = classify(err)
			return false
		}
		n++
		for i := range row {
			if have[i] != row[i] {
				err = rowError(table, n, fmt.Sprintf("has %s %v, the entry says %v", names[i], have[i], row[i]))
				return false
			}
		}
		return true
	})
	rest := int64(0)
	for rows.Next() {
		rest++
	}
	if err == nil && rest > 0 {
		err = rowError(table, n+1, "is not in the entry")
	}
	if failed := rows.Err(); failed != nil {
		err = classify(failed)
	}
	return n + rest, err
}

func rowError(table string, n int64, what string) error {
	return fail(ErrDamaged, fmt.Errorf("row %d of table %s %s", n, table, what))
}

// CheckFile runs SQLite's own check of the whole file.
func (l *Ledger) CheckFile(ctx context.Context) error {
	rows, err := l.conn.QueryContext(ctx, "PRAGMA integrity_check(20)")
	if err != nil {
		return classify(err)
	}
	defer rows.Close()
	var problems []error
	for rows.Next() {
		var s string
		if err := rows.Scan(&s); err != nil {
			return classify(err)
		}
		if s != "ok" {
			problems = append(problems, errors.New(s))
		}
	}
	if err := rows.Err(); err != nil {
		return classify(err)
	}
	if len(problems) > 0 {
		return fail(ErrDamaged, errors.Join(problems...))
	}
	return nil
}

// EntryHash gives the hash of an entry; empty where there is none.
func (l *Ledger) EntryHash(ctx context.Context, seq int64) (hash string, err error) {
	err = l.conn.QueryRowContext(ctx, "SELECT hash FROM entry WHERE seq = ?", seq).Scan(&hash)
	if errors.Is(err, sql.ErrNoRows) {
		return "", nil
	}
	return hash, classify(err)
}
