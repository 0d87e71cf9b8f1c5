package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// workingTree is the name that stands for the files on disk.
const workingTree = "."

// openRepo opens the repository of --repo.
func (a *app) openRepo() (*revision.Repo, error) { return revision.Open(a.repo) }

// folder gives --data as a clean slash-separated path, "." for the root.
func (a *app) folder() (string, error) {
	f := path.Clean(strings.ReplaceAll(a.data, `\`, "/"))
	if path.IsAbs(f) || filepath.VolumeName(a.data) != "" || f == ".." || strings.HasPrefix(f, "../") {
		return "", badCall("--data is a path from the repository's root, for example --data network", "the data set's folder %q is not inside the repository", a.data)
	}
	return f, nil
}

// side is one revision of the data set.
type side struct {
	typed  string          // as it was named
	name   string          // a tag or branch that points at it
	commit revision.Commit // zero for the working tree
	files  fs.FS
}

// isWorkingTree tells whether the side is the files on disk.
func (s side) isWorkingTree() bool { return s.commit.Hash == "" }

// time gives what the terms of restrictions and acceptances are compared with: the
// committer date, for the working tree the clock.
func (s side) time() (time.Time, error) {
	if s.isWorkingTree() {
		return time.Now(), nil
	}
	if at := s.commit.Committer.When; !at.IsZero() {
		return at, nil
	}
	return time.Time{}, badCall("make a new commit of the same content", "the commit %s has no time that can be read, and the terms of restrictions and acceptances are compared with it", s.commit.Hash)
}

// load reads the data set of the side. What is wrong with it is said to be of the side.
func (s side) load(ctx context.Context) (*schema.Dataset, error) {
	data, err := schema.Load(ctx, s.files)
	if err != nil {
		return nil, &sideError{s.label(), err}
	}
	return data, nil
}

// label names the side for a reader.
func (s side) label() string {
	if s.isWorkingTree() {
		return "the working tree"
	}
	return s.typed
}

// openSide resolves a revision and finds the data set's folder in it.
func (a *app) openSide(repo *revision.Repo, rev string) (side, error) {
	folder, err := a.folder()
	if err != nil {
		return side{}, err
	}
	s := side{typed: rev}
	if rev == workingTree {
		if s.files, err = repo.Working(folder); err != nil {
			return s, err
		}
		return s, elsewhere(s, folder)
	}
	if s.commit, err = resolve(repo, rev); err != nil {
		return side{}, err
	}
	s.name = repo.Describe(s.commit)
	if s.files, err = repo.Snapshot(s.commit.Hash, folder); err != nil {
		return s, err
	}
	return s, elsewhere(s, folder)
}

// elsewhere refuses a folder without anything of a data set where there is one below
// it: the call lacks --data, and a list of faults would not say so.
func elsewhere(s side, folder string) error {
	for _, name := range []string{"dataset.toml", "trains.toml", "routes"} {
		if _, err := fs.Stat(s.files, name); err == nil {
			return nil
		}
	}
	found := dataSets(s.files, ".", 0, nil)
	if len(found) == 0 {
		return nil
	}
	for i := range found {
		found[i] = "--data " + path.Join(folder, found[i])
	}
	return badCall("there is one below: "+joined(found), "%s has no data set in the folder %s", s.label(), source.Visible(folder))
}

// dataSets looks for folders with a dataset.toml: not deep, and for a few.
func dataSets(files fs.FS, dir string, depth int, found []string) []string {
	entries, err := fs.ReadDir(files, dir)
	if err != nil || depth > 3 {
		return found
	}
	for _, e := range entries {
		if len(found) == 3 {
			break
		}
		name := path.Join(dir, e.Name())
		switch {
		case !e.IsDir():
			if e.Name() == "dataset.toml" {
				found = append(found, dir)
			}
		case e.Name() != "routes" && e.Name() != "requests":
			found = dataSets(files, name, depth+1, found)
		}
	}
	return found
}

// revisionOf writes the side for a document.
func (s side) revisionOf() assessment.Revision {
	if s.isWorkingTree() {
		return assessment.Revision{}
	}
	return assessment.Revision{
		Commit:    s.commit.Hash,
		Committed: instant(s.commit.Committer.When),
		Subject:   validText(s.commit.Subject),
		Author:    person(s.commit.Author),
		Tree:      content(s.files),
	}
}

// instant writes a time of a commit, empty where it has none.
func instant(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return t.UTC().Format(time.RFC3339)
}

// content gives the hash of a folder's Git tree.
func content(files fs.FS) string {
	info, err := fs.Stat(files, ".")
	if err != nil {
		return ""
	}
	if id, ok := info.(schema.Identified); ok {
		return id.Identity()
	}
	return ""
}

func person(p revision.Person) assessment.Person {
	return assessment.Person{Name: validText(p.Name), Email: validText(p.Email)}
}

// validText replaces what is not UTF-8, which commits may hold and JSON cannot.
func validText(s string) string { return strings.ToValidUTF8(s, "\uFFFD") }

// ledgerPath gives --ledger, or the ledger's place in the repository.
func (a *app) ledgerPath(repo *revision.Repo) string {
	if a.ledger != "" {
		return a.ledger
	}
	return filepath.Join(repo.CommonDir(), "speedtrail", "ledger.db")
}

// openLedger opens the ledger for writing, made if need be, or for reading.
// That a new one was made is said: its name can be a mistyped one.
func (a *app) openLedger(ctx context.Context, write bool) (*ledger.Ledger, error) {
	l, err := a.openLedgerFor(ctx, write)
	if !write || !errors.Is(err, ledger.ErrNoLedger) {
		return l, err
	}
	if l, err = a.openLedgerWith(ctx, ledger.Options{Create: true, Now: time.Now}); err != nil {
		return nil, err
	}
	if file, err := a.ledgerFile(); err == nil {
		a.remark("a new ledger was made: %s", source.Visible(file))
	}
	return l, nil
}

// openLedgerFor opens a ledger that must be there, for writing or for reading: a
// call that is refused, or a mistyped name, makes no new one.
func (a *app) openLedgerFor(ctx context.Context, write bool) (*ledger.Ledger, error) {
	return a.openLedgerWith(ctx, ledger.Options{ReadOnly: !write, Now: time.Now})
}

// openLedgerAt opens the ledger for writing, made at a given time if need be.
func (a *app) openLedgerAt(ctx context.Context, at time.Time) (*ledger.Ledger, error) {
	return a.openLedgerWith(ctx, ledger.Options{Create: true, Now: func() time.Time { return at }})
}

func (a *app) openLedgerWith(ctx context.Context, o ledger.Options) (*ledger.Ledger, error) {
	file, err := a.ledgerFile()
	if err != nil {
		return nil, err
	}
	if o.Create && a.ledger != "" {
		if _, err := os.Stat(filepath.Dir(file)); errors.Is(err, fs.ErrNotExist) {
			return nil, badCall("correct --ledger, or make the folder first", "the ledger %s is not there, nor is its folder", file)
		}
	}
	l, err := ledger.Open(ctx, file, o)
	if err != nil {
		return nil, fmt.Errorf("ledger %s: %w", file, err)
	}
	return l, nil
}

// readLine follows the line of approval, and says which entries do not count: what
// is shown without one of them could be the opposite of what somebody signed.
func (a *app) readLine(ctx context.Context, l *ledger.Ledger) (*approval.Line, error) {
	line, problems, err := history.ReadLine(ctx, l)
	for i, p := range problems {
		if i == mostNotCounting {
			a.remark("! and %d more entries that do not count", len(problems)-i)
			break
		}
		a.remark("! it does not count, %s says more: %v", a.advise("speedtrail verify"), p)
	}
	return line, err
}

// mostNotCounting is how many entries that do not count are named.
const mostNotCounting = 5

// ledgerFile gives the ledger's file as an absolute path. One that Git tracks is
// refused, and one of which Git tracks a file that SQLite puts beside it: a checkout
// would replace it, and SQLite would play back what a commit brings as a transaction
// that was stopped.
func (a *app) ledgerFile() (string, error) {
	file := a.ledger
	repo, err := a.openRepo()
	switch {
	case err == nil:
		defer repo.Close()
		file = a.ledgerPath(repo)
	case file == "":
		// With --ledger, a ledger can be read where there is no repository.
		return "", err
	}
	if file, err = filepath.Abs(file); err != nil {
		return "", err
	}
	tracked, err := a.tracked(repo, file)
	switch {
	case err != nil:
		return "", err
	case tracked == file:
		return "", badCall("choose another place with --ledger", "the ledger %s is a file that Git tracks; a checkout would replace it", file)
	case tracked != "":
		return "", badCall("take that file out of the repository; if a command has used the ledger since it came, restore a backup", "%s is a file that Git tracks, and SQLite would change the ledger by it", tracked)
	}
	return file, nil
}

// besideIt tells whether there is a file that SQLite looks for beside a database.
func besideIt(file string) bool {
	return slices.ContainsFunc(sqliteFiles[1:], func(ending string) bool {
		_, err := os.Lstat(file + ending)
		return err == nil
	})
}

// sqliteFiles are the endings of a database and of what SQLite puts beside it.
var sqliteFiles = []string{"", "-journal", "-wal", "-shm"}

// tracked gives the first file that Git tracks of a database and of what SQLite looks
// for beside it; empty where it tracks none. repo may be nil.
func (a *app) tracked(repo *revision.Repo, file string) (string, error) {
	repos := []*revision.Repo{repo}
	if a.ledger != "" {
		// It may lie in another repository than the one that is asked about.
		around, err := revision.Open(filepath.Dir(file))
		if err == nil {
			defer around.Close()
			repos = append(repos, around)
		} else if !errors.Is(err, revision.ErrNoRepository) && besideIt(file) {
			return "", err // whether a commit brought that cannot be seen
		}
	}
	for _, r := range repos {
		if r == nil {
			continue
		}
		for _, ending := range sqliteFiles {
			if tracked, err := r.Tracked(file + ending); err != nil || tracked {
				return file + ending, err
			}
		}
	}
	return "", nil
}
