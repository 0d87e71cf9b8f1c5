// Package index keeps what a trace needs of a repository's history in a SQLite
// file of its own, "index.db" beside the ledger, so that a trace over thousands
// of commits answers in the time of a query.
//
// It holds nothing that the repository does not hold: it may be deleted at any
// time and is made again, and nothing that is to be proved rests on it. The
// package imports the driver github.com/mattn/go-sqlite3, as package ledger
// does; the two files have nothing else in common.
//
//	x, err := index.Open(ctx, "index.db")
//	name, err := index.Name(repo, ".")
//	h, err := x.Past(ctx, trace.NewReader(repo, "."), name, tip, "SM1", progress, healing)
//
// # What it holds
//
// For each data set folder its commits, parents before children: hash, parents,
// time, and the first fault where the data set does not load. For each folder of
// a route that was met, by the hash of its tree, the route's rows as far as
// profiles are compiled from them (encode.go), or what they have otherwise than
// those of another version (differ.go). For each
// commit the routes that it has otherwise than the nearest commit before it,
// along first parents, that loads.
//
// Profiles are compiled when they are asked for: a change of the reference
// trains leaves the index as it is. A new version of the rules, of the data set
// format or of the index's own form empties it.
//
// Commits are added in batches, one transaction each: an interrupted build goes
// on where it ended, and two processes that build at once do no harm to each
// other. An index of which a row turns out to be damaged is emptied, too.
package index

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"strings"

	"github.com/mattn/go-sqlite3"

	"speedtrail/diff"
	"speedtrail/schema"
)

// format is raised whenever the form of the file changes.
const format = 2

// applicationID marks the file's header as an index of speedtrail ("spix").
const applicationID = 0x73706978

// version is what the file's user_version has to be.
const version = format*1_000_000 + schema.Format*1_000 + diff.RulesVersion

// Errors of Open. Whoever gets one can do without an index.
var (
	ErrForeign = errors.New("the file is not an index of speedtrail")
	ErrFailed  = errors.New("the index cannot be used")
)

const tables = `
CREATE TABLE folder (id INTEGER PRIMARY KEY, path TEXT NOT NULL UNIQUE);
CREATE TABLE chunk (folder INTEGER NOT NULL, first INTEGER NOT NULL, commits INTEGER NOT NULL, data BLOB NOT NULL, UNIQUE (folder, first));
CREATE TABLE gap (folder INTEGER NOT NULL, number INTEGER NOT NULL, fault TEXT NOT NULL, PRIMARY KEY (folder, number)) WITHOUT ROWID;
CREATE TABLE version (id INTEGER PRIMARY KEY, tree BLOB NOT NULL, zone TEXT NOT NULL, place TEXT NOT NULL, route TEXT NOT NULL, fault TEXT NOT NULL, base INTEGER, data BLOB, UNIQUE (tree, zone));
CREATE TABLE change (folder INTEGER NOT NULL, route TEXT NOT NULL, number INTEGER NOT NULL, version INTEGER, place TEXT NOT NULL, PRIMARY KEY (folder, route, number)) WITHOUT ROWID;
`

// Index is an open index. It holds one connection and is not safe for concurrent
// use.
type Index struct {
	db      *sql.DB
	conn    *sql.Conn
	graphs  map[string]*graph // that were read, by the names of their histories
	edition int64             // that they are of (heal.go)
}

// Open opens an index, making it where there is none. The error is of class
// ErrForeign or ErrFailed.
func Open(ctx context.Context, file string) (*Index, error) {
	info, err := os.Lstat(file)
	switch {
	case err == nil && !info.Mode().IsRegular():
		return nil, ErrForeign
	case errors.Is(err, fs.ErrNotExist):
		err = os.MkdirAll(filepath.Dir(file), 0o755)
	}
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrFailed, err)
	}
	db, err := sql.Open("sqlite3", address(file))
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrFailed, err)
	}
	x := &Index{db: db}
	if x.conn, err = db.Conn(ctx); err == nil {
		err = x.prepare(ctx)
	}
	if err != nil {
		x.Close()
		return nil, classify(err)
	}
	return x, nil
}

// address writes the file as a URI, so that no character of its name can be
// taken for an option.
func address(file string) string {
	absolute, err := filepath.Abs(file)
	if err != nil {
		absolute = file
	}
	path := filepath.ToSlash(absolute)
	if !strings.HasPrefix(path, "/") {
		path = "/" + path // a drive letter
	}
	q := url.Values{"mode": {"rwc"}, "_busy_timeout": {"10000"}, "_txlock": {"immediate"}}
	return (&url.URL{Scheme: "file", Path: path, RawQuery: q.Encode()}).String()
}

// classify sorts an error of the driver.
func classify(err error) error {
	var s sqlite3.Error
	switch {
	case err == nil || errors.Is(err, ErrForeign) || errors.Is(err, ErrFailed):
		return err
	case errors.Is(err, errDamaged) || errors.Is(err, errEmptied):
		return fmt.Errorf("%w: %w", ErrFailed, err)
	case errors.Is(err, context.Canceled):
		return err
	case errors.As(err, &s) && s.Code == sqlite3.ErrNotADB:
		return fmt.Errorf("%w: %w", ErrForeign, err)
	case errors.As(err, &s):
		return fmt.Errorf("%w: %w", ErrFailed, err)
	}
	return err
}

// prepare checks whose file it is and empties an index of another version.
func (x *Index) prepare(ctx context.Context) error {
	current, err := x.check(ctx)
	if err != nil || current {
		return err
	}
	// The pages are written in place of a copy of their old content; a kill
	// leaves the last whole batch.
	return x.transaction(ctx, "BEGIN IMMEDIATE", func() error {
		// Another process may have done it meanwhile.
		if current, err := x.check(ctx); err != nil || current {
			return err
		}
		return x.create(ctx)
	})
}

// create makes the tables anew.
func (x *Index) create(ctx context.Context) error {
	for _, name := range []string{"folder", "chunk", "gap", "version", "change"} {
		if err := x.exec(ctx, "DROP TABLE IF EXISTS "+name); err != nil {
			return err
		}
	}
	return x.exec(ctx, tables, fmt.Sprintf("PRAGMA application_id = %d", applicationID), fmt.Sprintf("PRAGMA user_version = %d", version))
}

// check tells whether the file is an index of this version; it refuses what is
// none at all.
func (x *Index) check(ctx context.Context) (current bool, err error) {
	var application, user, objects int64
	err = x.conn.QueryRowContext(ctx, "SELECT (SELECT application_id FROM pragma_application_id), (SELECT user_version FROM pragma_user_version), (SELECT count(*) FROM sqlite_schema)").
		Scan(&application, &user, &objects)
	switch {
	case err != nil:
		return false, err
	case application == applicationID:
		return user == version, nil
	case application == 0 && user == 0 && objects == 0:
		return false, nil
	}
	return false, ErrForeign
}

func (x *Index) exec(ctx context.Context, statements ...string) error {
	for _, s := range statements {
		if _, err := x.conn.ExecContext(ctx, s); err != nil {
			return err
		}
	}
	return nil
}

// transaction runs work between a statement that begins a transaction and its end.
func (x *Index) transaction(ctx context.Context, begin string, work func() error) error {
	if err := x.exec(ctx, begin); err != nil {
		return err
	}
	err := work()
	if err == nil {
		err = x.exec(ctx, "COMMIT")
	}
	if err != nil {
		// Even where the context has ended.
		_, _ = x.conn.ExecContext(context.WithoutCancel(ctx), "ROLLBACK")
	}
	return err
}

// Close closes the file.
func (x *Index) Close() error {
	var err error
	if x.conn != nil {
		err = x.conn.Close()
	}
	return errors.Join(err, x.db.Close())
}
