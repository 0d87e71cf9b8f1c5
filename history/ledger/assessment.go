package ledger

import (
	"context"
	"database/sql"
	"database/sql/driver"
	"errors"
	"fmt"
	"iter"
	"runtime/debug"
	"strings"
	"time"

	"github.com/mattn/go-sqlite3"

	"speedtrail/history/chain"
)

// Record is an assessment as it is written to the ledger.
type Record struct {
	Digest       string // SHA-256 in hex, the same for the same result
	Body         []byte // canonical JSON, holds everything
	Base, Target string // full commit hashes
	Folder       string
	Dataset      string
	RulesVersion int
	Requests     []Request
	Preparers    []Person
	Findings     []Finding
	Changes      iter.Seq[Change]
}

// Request is a change request in play.
type Request struct{ ID, Title string }

// Person is somebody who prepared the change.
type Person struct{ Name, Email string }

// Finding is a finding as a row.
type Finding struct{ ID, Route, Direction, From, To, Text, Accepted string }

// Change is a speed change of one train as a row.
type Change struct {
	Route, Direction, Train string
	From, To                string // positions as printed
	LengthMM                int64
	Before, After           int // km/h
	RunOut                  bool
	BeforeSource            string
	AfterSource             string
}

// largeBody is the size of a body from which on memory that is no longer used is
// given back first: SQLite copies the body twice on its way into the file.
const largeBody = 8 << 20

// Recorded is where an assessment stands in a ledger.
type Recorded struct {
	Number int64
	Added  bool       // by this call; else one of its digest was there already
	Head   chain.Head // of the ledger afterwards
}

// RecordAssessment appends an assessment, unless there is one of its digest. One
// without both commits, as of a working tree, is refused.
func (l *Ledger) RecordAssessment(ctx context.Context, now time.Time, r Record) (Recorded, error) {
	if len(r.Body) > largeBody {
		debug.FreeOSMemory()
	}
	if r.Base == "" || r.Target == "" {
		return Recorded{}, errors.New("an assessment of what is not committed cannot be computed anew, and is not recorded")
	}
	var in Recorded
	err := l.transaction(ctx, func() (err error) {
		if in.Head, err = l.Head(ctx); err != nil {
			return err
		}
		err = l.conn.QueryRowContext(ctx, "SELECT number FROM assessment WHERE digest = ?", r.Digest).Scan(&in.Number)
		if err == nil || !errors.Is(err, sql.ErrNoRows) {
			return err
		}
		if err := l.conn.QueryRowContext(ctx, "SELECT coalesce(max(number), 0) + 1 FROM assessment").Scan(&in.Number); err != nil {
			return err
		}
		e := chain.Next(in.Head, now, chain.Assessment, r.Body)
		if err := l.insertEntry(ctx, e); err != nil {
			return err
		}
		if err := l.insertRows(ctx, in.Number, e.Seq, r); err != nil {
			return err
		}
		in.Head, in.Added = e.Head(), true
		return nil
	})
	if err != nil {
		return Recorded{}, err
	}
	return in, nil
}

// insertRows writes the tables that repeat an assessment.
func (l *Ledger) insertRows(ctx context.Context, number, entry int64, r Record) error {
	// The number of rows is known only when they have been written, and a row of
	// the ledger is never altered: they are counted first.
	changes := int64(0)
	for range r.Changes {
		changes++
	}
	if _, err := l.conn.ExecContext(ctx, "INSERT INTO assessment VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
		number, entry, r.Digest, r.Base, r.Target, r.Folder, r.Dataset, r.RulesVersion, changes, len(r.Findings)); err != nil {
		return err
	}
	for i, q := range r.Requests {
		if _, err := l.conn.ExecContext(ctx, "INSERT INTO request VALUES (?, ?, ?, ?)", number, i+1, q.ID, q.Title); err != nil {
			return err
		}
	}
	for i, p := range r.Preparers {
		if _, err := l.conn.ExecContext(ctx, "INSERT INTO preparer VALUES (?, ?, ?, ?)", number, i+1, p.Name, p.Email); err != nil {
			return err
		}
	}
	for i, f := range r.Findings {
		if _, err := l.conn.ExecContext(ctx, "INSERT INTO finding VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)",
			number, i+1, f.ID, f.Route, f.Direction, f.From, f.To, f.Text, f.Accepted); err != nil {
			return err
		}
	}
	return l.conn.Raw(func(c any) error { return insertChanges(ctx, c.(*sqlite3.SQLiteConn), number, r.Changes) })
}

const (
	changeColumns = 13
	// batch is how many rows one INSERT holds: more does not make it quicker.
	batch = 20
)

// insertChanges writes the speed changes in batches through the driver itself,
// which spares a conversion for each of the many values.
func insertChanges(ctx context.Context, conn *sqlite3.SQLiteConn, number int64, changes iter.Seq[Change]) error {
	insert := func(rows int) (driver.Stmt, error) {
		row := ", (?" + strings.Repeat(", ?", changeColumns-1) + ")"
		return conn.Prepare("INSERT INTO speed_change VALUES " + strings.Repeat(row, rows)[2:])
	}
	whole, err := insert(batch)
	if err != nil {
		return err
	}
	defer whole.Close()
	values := make([]driver.NamedValue, 0, batch*changeColumns)
	place := int64(0)
	// Each batch is short, and ctx is looked at between them: the driver need not
	// watch it, which would cost a goroutine a batch.
	unwatched := context.WithoutCancel(ctx)
	flush := func(s driver.Stmt) error {
		_, err := s.(driver.StmtExecContext).ExecContext(unwatched, values)
		values = values[:0]
		return err
	}
	for c := range changes {
		place++
		runOut := int64(0)
		if c.RunOut {
			runOut = 1
		}
		for _, v := range [...]driver.Value{number, place, c.Route, c.Direction, c.Train, c.From, c.To, c.LengthMM,
			int64(c.Before), int64(c.After), runOut, c.BeforeSource, c.AfterSource} {
			values = append(values, driver.NamedValue{Ordinal: len(values) + 1, Value: v})
		}
		if len(values) == cap(values) {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := flush(whole); err != nil {
				return err
			}
		}
	}
	if len(values) == 0 {
		return nil
	}
	rest, err := insert(len(values) / changeColumns)
	if err != nil {
		return err
	}
	defer rest.Close()
	return flush(rest)
}

// AssessmentRow is an assessment as the register shows it.
type AssessmentRow struct {
	Number            int64
	Entry             chain.Head
	Time              string // of recording
	Digest            string
	Base, Target      string
	Folder, Dataset   string
	Requests          []string // ids
	Changes, Findings int64
}

const selectAssessment = `SELECT a.number, e.seq, e.hash, e.time, a.digest, a.base, a.target, a.folder, a.dataset, a.speed_changes, a.findings
FROM assessment a JOIN entry e ON e.seq = a.entry `

func (l *Ledger) scan(row interface{ Scan(...any) error }) (AssessmentRow, error) {
	var a AssessmentRow
	err := row.Scan(&a.Number, &a.Entry.Seq, &a.Entry.Hash, &a.Time, &a.Digest, &a.Base, &a.Target, &a.Folder, &a.Dataset, &a.Changes, &a.Findings)
	return a, err
}

// Assessment gives the row of an assessment and the entry that it names.
func (l *Ledger) Assessment(ctx context.Context, number int64) (AssessmentRow, chain.Entry, error) {
	a, err := l.scan(l.conn.QueryRowContext(ctx, selectAssessment+"WHERE a.number = ?", number))
	if errors.Is(err, sql.ErrNoRows) {
		return a, chain.Entry{}, fail(ErrNoAssessment, fmt.Errorf("number %d; %s", number, l.numbers(ctx)))
	}
	if err != nil {
		return a, chain.Entry{}, classify(err)
	}
	e, err := l.Entry(ctx, a.Entry.Seq)
	return a, e, err
}

// numbers says which numbers of assessments there are: they have no gaps.
func (l *Ledger) numbers(ctx context.Context) string {
	var n int64
	switch err := l.conn.QueryRowContext(ctx, "SELECT COALESCE(MAX(number), 0) FROM assessment").Scan(&n); {
	case err != nil || n == 0:
		return "the ledger has none"
	case n == 1:
		return "the ledger has number 1 only"
	}
	return fmt.Sprintf("the ledger has numbers 1 to %d", n)
}

// AssessmentOf gives the row that repeats the assessment of an entry.
func (l *Ledger) AssessmentOf(ctx context.Context, entry int64) (AssessmentRow, error) {
	a, err := l.scan(l.conn.QueryRowContext(ctx, selectAssessment+"WHERE a.entry = ?", entry))
	if errors.Is(err, sql.ErrNoRows) {
		return a, fail(ErrDamaged, fmt.Errorf("the assessment of entry %d has no row", entry))
	}
	if err == nil {
		a.Requests, err = l.requests(ctx, a.Number)
	}
	return a, classify(err)
}

// Assessments lists all assessments, newest first.
func (l *Ledger) Assessments(ctx context.Context) ([]AssessmentRow, error) {
	rows, err := l.conn.QueryContext(ctx, selectAssessment+"ORDER BY a.number DESC")
	if err != nil {
		return nil, classify(err)
	}
	defer rows.Close()
	var list []AssessmentRow
	for rows.Next() {
		a, err := l.scan(rows)
		if err != nil {
			return nil, classify(err)
		}
		list = append(list, a)
	}
	if err := rows.Err(); err != nil {
		return nil, classify(err)
	}
	for i := range list {
		if list[i].Requests, err = l.requests(ctx, list[i].Number); err != nil {
			return nil, classify(err)
		}
	}
	return list, nil
}

func (l *Ledger) requests(ctx context.Context, number int64) ([]string, error) {
	rows, err := l.conn.QueryContext(ctx, "SELECT id FROM request WHERE assessment = ? ORDER BY place", number)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	ids := []string{}
	for rows.Next() {
		var id string
		if err := rows.Scan(&id); err != nil {
			return nil, err
		}
		ids = append(ids, id)
	}
	return ids, rows.Err()
}
