package ledger_test

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// exported makes a ledger of an id of its own and gives its export.
func exported(t testing.TB, changes int) (text []byte, head chain.Head) {
	t.Helper()
	l := opened(t, filepath.Join(quickDir(t), "from.db"), ledger.Options{Create: true})
	head, err := assess(t.Context(), l, when, "one", changes)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := history.Export(t.Context(), l, &b); err != nil {
		t.Fatal(err)
	}
	return b.Bytes(), head
}

// meanwhile is an export between whose first line and the rest something happens.
func meanwhile(text []byte, happens func()) io.Reader {
	first := bytes.IndexByte(text, '\n') + 1
	return io.MultiReader(bytes.NewReader(text[:first]), happening(happens), bytes.NewReader(text[first:]))
}

type happening func()

func (h happening) Read([]byte) (int, error) { h(); return 0, io.EOF }

// holds checks that a ledger is whole and has entries.
func holds(t *testing.T, file string, want ...chain.Head) {
	t.Helper()
	if _, err := verified(t.Context(), opened(t, file, ledger.Options{ReadOnly: true}), want...); err != nil {
		t.Error(err)
	}
}

func names(t *testing.T, dir string) (list []string) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		list = append(list, e.Name())
	}
	return list
}

// Two imports and a recording begin at once where there is no ledger: whoever was
// told that it is done finds its entries there.
func TestImportRivals(t *testing.T) {
	texts, heads := [2][]byte{}, [2]chain.Head{}
	for i := range texts {
		texts[i], heads[i] = exported(t, 30)
	}
	for _, links := range []bool{true, false} {
		t.Run(fmt.Sprint("links ", links), func(t *testing.T) {
			if !links {
				t.Cleanup(ledger.WithoutLinks())
			}
			dir := quickDir(t)
			for round := range 40 {
				file := filepath.Join(dir, fmt.Sprint(round, ".db"))
				var group sync.WaitGroup
				var errs [2]error
				for i := range texts {
					group.Go(func() { _, errs[i] = history.Import(t.Context(), file, bytes.NewReader(texts[i])) })
				}
				var recorded chain.Head
				if round%2 == 1 {
					group.Go(func() {
						l, err := ledger.Open(t.Context(), file, ledger.Options{Create: true, Now: clock, Wait: time.Minute})
						if err == nil {
							defer l.Close()
							recorded, err = assess(t.Context(), l, when, "two", 5)
						}
						if err != nil {
							t.Errorf("round %d, recording: %v", round, err)
						}
					})
				}
				group.Wait()
				done := 0
				for i, err := range errs {
					switch {
					case err == nil:
						done++
						holds(t, file, heads[i])
					case !errors.Is(err, ledger.ErrExists):
						t.Errorf("round %d: %v", round, err)
					}
				}
				if recorded.Seq > 0 {
					holds(t, file, recorded)
				} else if done != 1 {
					t.Errorf("round %d: %d imports were done, %v", round, done, errs)
				}
			}
			if list := names(t, dir); len(list) != 40 {
				t.Errorf("there are %q", list)
			}
		})
	}
}

// A ledger that somebody makes while an import is at work stays; the import says
// that it is there.
func TestImportBesideNewLedger(t *testing.T) {
	text, _ := exported(t, 3)
	dir := quickDir(t)
	file := filepath.Join(dir, "ledger.db")
	var head chain.Head
	_, err := history.Import(t.Context(), file, meanwhile(text, func() {
		l, err := ledger.Open(t.Context(), file, ledger.Options{Create: true, Now: clock, Wait: time.Millisecond})
		if err != nil {
			t.Error(err)
			return
		}
		defer l.Close()
		if head, err = assess(t.Context(), l, when, "two", 3); err != nil {
			t.Error(err)
		}
	}))
	if !errors.Is(err, ledger.ErrExists) {
		t.Error(err)
	}
	holds(t, file, head)
	if list := names(t, dir); len(list) != 1 {
		t.Errorf("there are %q", list)
	}
}

// Without links an import that fails leaves an empty file, since others may wait
// for it: they make their ledger there, or the next import does.
func TestFailedImportInPlace(t *testing.T) {
	t.Cleanup(ledger.WithoutLinks())
	text, imported := exported(t, 3)
	file := filepath.Join(quickDir(t), "ledger.db")
	faulty := bytes.Replace(text, []byte(`"kind":"assessment"`), []byte(`"kind":"sign-off"`), 1)
	var at *history.ImportError
	if _, err := history.Import(t.Context(), file, bytes.NewReader(faulty)); !errors.As(err, &at) {
		t.Fatal(err)
	}
	if head, err := history.Import(t.Context(), file, bytes.NewReader(text)); err != nil || head != imported {
		t.Fatal(head, err)
	}
	holds(t, file, imported)

	file = filepath.Join(quickDir(t), "ledger.db")
	var head chain.Head
	waits := make(chan error)
	_, err := history.Import(t.Context(), file, meanwhile(faulty, func() {
		go func() {
			l, err := ledger.Open(t.Context(), file, ledger.Options{Create: true, Now: clock, Wait: time.Minute})
			if err == nil {
				defer l.Close()
				head, err = assess(t.Context(), l, when, "two", 3)
			}
			waits <- err
		}()
		time.Sleep(50 * time.Millisecond) // by then it has the file open
	}))
	if !errors.As(err, &at) {
		t.Error(err)
	}
	if err := <-waits; err != nil {
		t.Fatal(err)
	}
	holds(t, file, head)
}

// An import that was killed bars nothing, and nothing has to be removed by hand.
func TestKillImport(t *testing.T) {
	text, imported := exported(t, 30_000)
	for _, work := range []string{"import", "import in place"} {
		t.Run(work, func(t *testing.T) {
			dir := quickDir(t)
			file := filepath.Join(dir, "ledger.db")
			cmd := process(t, work, file, "k", 1)
			in, err := cmd.StdinPipe()
			if err == nil {
				err = cmd.Start()
			}
			if err != nil {
				t.Fatal(err)
			}
			// All lines, but not the end: SQLite has written pages, and committed none.
			if _, err := in.Write(text); err != nil {
				t.Error(err)
			}
			for began := time.Now(); size(t, dir) < 1<<20 && time.Since(began) < time.Minute; {
				time.Sleep(time.Millisecond)
			}
			_ = cmd.Process.Kill()
			_ = cmd.Wait()
			if !strings.Contains(fmt.Sprint(names(t, dir)), "-journal") {
				t.Fatalf("it was killed before it wrote, or after: %q", names(t, dir))
			}
			if _, err := ledger.Open(t.Context(), file, ledger.Options{ReadOnly: true}); !errors.Is(err, ledger.ErrNoLedger) {
				t.Error(err)
			}
			if head, err := history.Import(t.Context(), file, bytes.NewReader(text)); err != nil || head != imported {
				t.Fatal(head, err)
			}
			holds(t, file, imported)
		})
	}
}

// size gives the bytes of all files of a folder.
func size(t *testing.T, dir string) (n int64) {
	t.Helper()
	for _, name := range names(t, dir) {
		if info, err := os.Stat(filepath.Join(dir, name)); err == nil {
			n += info.Size()
		}
	}
	return n
}

// The journal of a ledger that was removed is not played back into an import.
func TestImportBesideStrayJournal(t *testing.T) {
	text, imported := exported(t, 60)
	file := filepath.Join(quickDir(t), "ledger.db")
	hotJournal(t, file)
	if err := os.Remove(file); err != nil {
		t.Fatal(err)
	}
	if head, err := history.Import(t.Context(), file, bytes.NewReader(text)); err != nil || head != imported {
		t.Fatal(head, err)
	}
	holds(t, file, imported)
	if _, err := os.Stat(file + "-journal"); err == nil {
		t.Error("the journal is still there")
	}
}

// What stands in the place and is no remains of a ledger is left as it is.
func TestImportOverSomething(t *testing.T) {
	text, _ := exported(t, 3)
	for name, put := range map[string]func(file string) error{
		"text":   func(file string) error { return os.WriteFile(file, []byte("something\n"), 0o600) },
		"folder": func(file string) error { return os.Mkdir(file, 0o700) },
		"link":   func(file string) error { return os.Symlink("nowhere", file) },
		"ledger": func(file string) error { anchored(t, file); return nil },
		"ledger that a process left in the middle of work": func(file string) error { hotJournal(t, file); return nil },
	} {
		t.Run(name, func(t *testing.T) {
			dir := quickDir(t)
			file := filepath.Join(dir, "ledger.db")
			if err := put(file); err != nil {
				t.Skip(err) // Windows makes links for some people only
			}
			before, _ := os.ReadFile(file)
			if _, err := history.Import(t.Context(), file, bytes.NewReader(text)); !errors.Is(err, ledger.ErrExists) {
				t.Error(err)
			}
			after, _ := os.ReadFile(file)
			if strings.Contains(name, "middle") {
				holds(t, file)
			} else if !bytes.Equal(before, after) {
				t.Error("it was altered")
			}
			if list := names(t, dir); len(list) != 1 {
				t.Errorf("there are %q", list)
			}
		})
	}
}
