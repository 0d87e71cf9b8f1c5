// Package ledger keeps the append-only record of assessments in one SQLite
// file: a hash chain of entries (package chain), and ordinary tables that repeat
// what stands in their bodies, for anyone with SQL.
//
// It refuses files that are not such a ledger, were written by a newer version,
// or hold tables, views or triggers of somebody else. Triggers refuse updates
// and deletions; they stop accidents, not administrators.
//
//	l, err := ledger.Open(ctx, "ledger.db", ledger.Options{Create: true, Now: time.Now})
//	in, err := l.RecordAssessment(ctx, time.Now(), record) // assessment in.Number
package ledger

import (
	"context"
	"crypto/rand"
	"database/sql"
	"embed"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	_ "github.com/mattn/go-sqlite3" // the driver "sqlite3"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
)

// applicationID marks the file's header as a ledger of speedtrail ("sptr").
const applicationID = 0x73707472

// Format is the number of the ledger's format: how many migrations it has had.
const Format = 2

//go:embed migrations/*.sql
var migrations embed.FS

// Options of Open.
type Options struct {
	ReadOnly bool
	Create   bool             // make the ledger where there is none
	Wait     time.Duration    // for other processes; 0: ten seconds
	Now      func() time.Time // for the first entry of a new ledger

	// vfs names the layer through which SQLite reaches files, empty for its own:
	// tests put in one that fails calls, or writes them down.
	vfs string
}

// Ledger is an open ledger. It holds one connection and is not safe for
// concurrent use; open it once for each goroutine.
type Ledger struct {
	db   *sql.DB
	conn *sql.Conn
	id   string
	// format is that of the file: older than Format where it was opened for
	// reading only.
	format int
}

// firstFormat is the number in the first entry: of the form of the entries, not
// of the tables beside them.
const firstFormat = 1

// firstBody is the body of the first entry.
type firstBody struct {
	Format int    `json:"format"`
	ID     string `json:"id"` // 128 random bits in hex
}

// Open opens a ledger. Errors are of the classes of this package.
func Open(ctx context.Context, file string, o Options) (*Ledger, error) {
	info, err := os.Lstat(file)
	switch {
	case err == nil && info.Mode()&fs.ModeSymlink != 0:
		return nil, fail(ErrSymlink, nil)
	case err == nil && !info.Mode().IsRegular():
		return nil, fail(ErrForeign, nil)
	case errors.Is(err, fs.ErrNotExist) && !o.Create:
		return nil, fail(ErrNoLedger, nil)
	case errors.Is(err, fs.ErrNotExist):
		if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
			return nil, fail(ErrReadOnly, err)
		}
	case err != nil:
		return nil, fail(ErrReadOnly, err)
	}
	l, err := connect(ctx, file, o)
	if o.ReadOnly && leftJournal(err) {
		// A process was stopped while it recorded. What it had begun is taken back
		// by whoever opens the file for writing.
		if err := playBack(ctx, file, o); err != nil {
			return nil, classify(err)
		}
		l, err = connect(ctx, file, o)
	}
	return l, classify(err)
}

func connect(ctx context.Context, file string, o Options) (*Ledger, error) {
	db, err := sql.Open("sqlite3", address(file, o))
	if err != nil {
		return nil, err
	}
	l := &Ledger{db: db}
	if l.conn, err = db.Conn(ctx); err == nil {
		err = l.prepare(ctx, o)
	}
	if err != nil {
		l.Close()
		return nil, err
	}
	return l, nil
}

// playBack lets SQLite take back what a journal says was not finished.
func playBack(ctx context.Context, file string, o Options) error {
	o.ReadOnly, o.Create = false, false
	db, err := sql.Open("sqlite3", address(file, o))
	if err != nil {
		return err
	}
	defer db.Close()
	var n int
	return db.QueryRowContext(ctx, "SELECT count(*) FROM sqlite_schema").Scan(&n)
}

// address writes the file as a URI, so that no character of its name can be
// taken for an option.
func address(file string, o Options) string {
	absolute, err := filepath.Abs(file)
	if err != nil {
		absolute = file
	}
	path := filepath.ToSlash(absolute)
	if !strings.HasPrefix(path, "/") {
		path = "/" + path // a drive letter
	}
	mode := "rw"
	switch {
	case o.ReadOnly:
		mode = "ro"
	case o.Create:
		mode = "rwc"
	}
	wait := o.Wait
	if wait == 0 {
		wait = 10 * time.Second
	}
	q := url.Values{"mode": {mode}, "_busy_timeout": {fmt.Sprint(wait.Milliseconds())}, "_txlock": {"immediate"}}
	if o.vfs != "" {
		q.Set("vfs", o.vfs)
	}
	return (&url.URL{Scheme: "file", Path: path, RawQuery: q.Encode()}).String()
}

// prepare checks the file before anything else is done with it, makes the
// ledger if it is to be made, and sets what every connection needs.
func (l *Ledger) prepare(ctx context.Context, o Options) error {
	if err := l.exec(ctx, "PRAGMA trusted_schema = OFF", "PRAGMA cell_size_check = ON"); err != nil {
		return err
	}
	// Read as of one instant: another process may be making the ledger now.
	if err := l.exec(ctx, "BEGIN"); err != nil {
		return err
	}
	empty, err := l.check(ctx)
	if ended := l.exec(ctx, "COMMIT"); err == nil {
		err = ended
	}
	if err != nil {
		return err
	}
	if empty {
		l.format = Format
		if !o.Create || o.ReadOnly {
			return fail(ErrNoLedger, nil)
		}
	}
	// A rollback journal: the ledger opens read-only, and no committed entry
	// stays behind in a second file.
	if err := l.exec(ctx, "PRAGMA foreign_keys = ON", "PRAGMA recursive_triggers = ON", "PRAGMA synchronous = EXTRA"); err != nil {
		return err
	}
	if !o.ReadOnly {
		if err := l.exec(ctx, "PRAGMA journal_mode = DELETE"); err != nil {
			return err
		}
	}
	if empty {
		if err := l.create(ctx, o.Now()); err != nil {
			return err
		}
	}
	if l.format < Format && !o.ReadOnly {
		if err := l.upgrade(ctx); err != nil {
			return err
		}
	}
	first, err := l.Entry(ctx, 1)
	if err != nil {
		return err
	}
	l.id, err = idOf(first)
	return err
}

func (l *Ledger) exec(ctx context.Context, statements ...string) error {
	for _, s := range statements {
		if _, err := l.conn.ExecContext(ctx, s); err != nil {
			return err
		}
	}
	return nil
}

// check tells an empty file from a ledger, and refuses everything else.
func (l *Ledger) check(ctx context.Context) (empty bool, err error) {
	have, err := objects(ctx, l.conn)
	if err != nil {
		return false, err
	}
	var application, format int64
	if err := l.conn.QueryRowContext(ctx, "PRAGMA application_id").Scan(&application); err != nil {
		return false, err
	}
	if err := l.conn.QueryRowContext(ctx, "PRAGMA user_version").Scan(&format); err != nil {
		return false, err
	}
	switch {
	case application == 0 && format == 0 && len(have) == 0:
		return true, nil
	case application != applicationID:
		return false, fail(ErrForeign, nil)
	case format > Format:
		return false, fail(ErrNewer, fmt.Errorf("format %d, this version knows %d", format, Format))
	}
	if format < 1 {
		return false, fail(ErrForeign, fmt.Errorf("format %d", format))
	}
	l.format = int(format)
	want, err := expected(ctx, l.format)
	if err != nil {
		return false, err
	}
	if !slices.Equal(have, want) {
		return false, fail(ErrForeign, errors.New(firstDifference(have, want)))
	}
	return false, nil
}

// objects lists the tables, indexes, triggers and views of a database with
// their text.
func objects(ctx context.Context, conn *sql.Conn) ([]string, error) {
	rows, err := conn.QueryContext(ctx, "SELECT type || ' ' || name || ': ' || coalesce(sql, '') FROM sqlite_schema ORDER BY type, name")
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	var list []string
	for rows.Next() {
		var s string
		if err := rows.Scan(&s); err != nil {
			return nil, err
		}
		list = append(list, s)
	}
	return list, rows.Err()
}

// expected lists the objects of a ledger of a format, by making one in memory.
func expected(ctx context.Context, format int) ([]string, error) {
	db, err := sql.Open("sqlite3", ":memory:")
	if err != nil {
		return nil, err
	}
	defer db.Close()
	conn, err := db.Conn(ctx)
	if err != nil {
		return nil, err
	}
	defer conn.Close()
	if err := migrate(ctx, conn, 0, format); err != nil {
		return nil, err
	}
	return objects(ctx, conn)
}

// firstDifference names an object that should not be there, or that is missing.
func firstDifference(have, want []string) string {
	name := func(s string) string { n, _, _ := strings.Cut(s, ":"); return n }
	for _, s := range have {
		if !slices.Contains(want, s) {
			return "unexpected " + name(s)
		}
	}
	for _, s := range want {
		if !slices.Contains(have, s) {
			return "missing " + name(s)
		}
	}
	return "its objects differ"
}

// migrate brings a database from a format to another.
func migrate(ctx context.Context, conn *sql.Conn, from, to int) error {
	files, err := fs.Glob(migrations, "migrations/*.sql")
	if err != nil {
		return err
	}
	for _, file := range files[from:to] {
		text, err := fs.ReadFile(migrations, file)
		if err != nil {
			return err
		}
		if _, err := conn.ExecContext(ctx, string(text)); err != nil {
			return err
		}
	}
	return nil
}

// create makes the tables and the first entry in one transaction: a kill leaves
// an empty file or a ledger. Of two processes that do it at once, the second
// finds the work done.
func (l *Ledger) create(ctx context.Context, now time.Time) error {
	return l.transaction(ctx, func() error {
		empty, err := l.check(ctx)
		if err != nil || !empty {
			return err
		}
		if err := migrate(ctx, l.conn, 0, Format); err != nil {
			return err
		}
		if err := l.exec(ctx, fmt.Sprintf("PRAGMA application_id = %d", applicationID), fmt.Sprintf("PRAGMA user_version = %d", Format)); err != nil {
			return err
		}
		id := make([]byte, 16)
		if _, err := rand.Read(id); err != nil {
			return err
		}
		body, err := canon.Marshal(firstBody{Format: firstFormat, ID: hex.EncodeToString(id)})
		if err != nil {
			return err
		}
		return l.insertEntry(ctx, chain.Next(chain.Head{}, now, chain.Ledger, body))
	})
}

// upgrade brings an older ledger to this format, in one transaction.
func (l *Ledger) upgrade(ctx context.Context) error {
	return l.transaction(ctx, func() error {
		// Another process may have done it meanwhile.
		if _, err := l.check(ctx); err != nil || l.format == Format {
			return err
		}
		if err := migrate(ctx, l.conn, l.format, Format); err != nil {
			return err
		}
		if err := l.exec(ctx, fmt.Sprintf("PRAGMA user_version = %d", Format)); err != nil {
			return err
		}
		l.format = Format
		return nil
	})
}

// transaction runs work with the ledger locked for writing: nobody else can add
// an entry between reading the head and writing the next one.
func (l *Ledger) transaction(ctx context.Context, work func() error) error {
	if err := l.exec(ctx, "BEGIN IMMEDIATE"); err != nil {
		return classify(err)
	}
	err := work()
	if err == nil {
		err = l.exec(ctx, "COMMIT")
	}
	if err != nil {
		// Even where the context has ended; SQLite may have rolled back itself.
		_, _ = l.conn.ExecContext(context.WithoutCancel(ctx), "ROLLBACK")
		return classify(err)
	}
	return nil
}

// ID is the random id of the ledger.
func (l *Ledger) ID() string { return l.id }

// Close closes the file.
func (l *Ledger) Close() error {
	var err error
	if l.conn != nil {
		err = l.conn.Close()
	}
	return errors.Join(err, l.db.Close())
}

// idOf gives the id of the ledger that a first entry begins.
func idOf(first chain.Entry) (string, error) {
	var body firstBody
	if err := canon.Unmarshal(first.Body, &body); err != nil || first.Kind != chain.Ledger {
		return "", fail(ErrForeign, errors.New("the first entry names no ledger"))
	}
	if body.Format != firstFormat {
		return "", fail(ErrNewer, fmt.Errorf("entries of form %d, this version knows %d", body.Format, firstFormat))
	}
	if id, err := hex.DecodeString(body.ID); err != nil || len(id) != 16 || hex.EncodeToString(id) != body.ID {
		return "", fail(ErrForeign, errors.New("the first entry has no id of 32 hexadecimal digits"))
	}
	return body.ID, nil
}
