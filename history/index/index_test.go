package index_test

import (
	"context"
	"database/sql"
	"errors"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"speedtrail/diff/profile"
	"speedtrail/history/index"
	"speedtrail/history/internal/past"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

const commits = 30

// drawn is a random history in a repository.
type drawn struct {
	dir    string
	repo   *revision.Repo
	tip    trace.Hash
	trains []schema.Train
}

func draw(t *testing.T, seed uint64) *drawn {
	t.Helper()
	history := past.History(rand.New(rand.NewPCG(seed, 7)), commits)
	d := &drawn{dir: past.Write(t, history), trains: past.Load(history[commits-1:]).Data[0].Trains}
	d.open(t)
	return d
}

func (d *drawn) open(t *testing.T) {
	t.Helper()
	var err error
	if d.repo, err = revision.Open(d.dir); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { d.repo.Close() })
	d.tip = d.hash(t, "HEAD")
}

func (d *drawn) hash(t *testing.T, rev string) trace.Hash {
	t.Helper()
	c, err := d.repo.Resolve(rev)
	if err != nil {
		t.Fatal(err)
	}
	h, err := trace.ParseHash(c.Hash)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

// answer is what a history says, without the numbers that its commits have.
type answer struct {
	State  map[trace.Hash]string
	Trails []any
}

func (d *drawn) answer(t *testing.T, h *trace.History) answer {
	t.Helper()
	a := answer{State: map[trace.Hash]string{}}
	hash := func(c int32) trace.Hash { return h.Commits[c].Hash }
	for i, c := range h.Commits {
		word := c.Gap
		if s := h.State[i]; s >= 0 {
			word = h.Versions[s].Folder + " " + h.Versions[s].Tree.String()
		}
		a.State[c.Hash] = word
	}
	if h.Newest() == nil {
		return a
	}
	length := h.Newest().Track.Length()
	for _, first := range []bool{false, true} {
		for _, direction := range codes.AllDirections {
			v := h.View(direction, first)
			for _, train := range d.trains {
				for _, at := range []unit.Distance{0, length / 3, length / 2, length} {
					trail := v.Point(train, at)
					for _, s := range trail.Steps {
						a.Trails = append(a.Trails, hash(s.After.Commit), s.After.Speed, s.After.Sources, s.Across, s.Aside)
						for _, b := range s.Before {
							a.Trails = append(a.Trails, hash(b.Commit), b.Speed, b.Sources)
						}
					}
					for _, r := range trail.Line {
						a.Trails = append(a.Trails, hash(r.From), r.Speed, r.Gap)
					}
				}
				for _, p := range v.Stretch(train, length/4, length) {
					a.Trails = append(a.Trails, p.Piece, hash(p.Origin), p.Sources, p.Before)
				}
			}
		}
	}
	return a
}

func mustOpen(t *testing.T, file string) *index.Index {
	t.Helper()
	x, err := index.Open(context.Background(), file)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { x.Close() })
	return x
}

// check compares the answer of an index with that without one.
func (d *drawn) check(t *testing.T, x *index.Index, tip trace.Hash, route string) {
	t.Helper()
	got, found, err := x.History(context.Background(), ".", tip, route)
	if err != nil || !found {
		t.Fatal(found, err)
	}
	want, err := trace.NewReader(d.repo, ".").History(context.Background(), tip, route, trace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	a, b := d.answer(t, got), d.answer(t, want)
	// The index holds what other tips reach, too.
	for h := range a.State {
		if _, ok := b.State[h]; !ok {
			delete(a.State, h)
		}
	}
	if !reflect.DeepEqual(a.State, b.State) {
		t.Fatalf("states differ:\nindex    %v\nno index %v", a.State, b.State)
	}
	if !reflect.DeepEqual(plain(a.Trails), plain(b.Trails)) {
		t.Fatalf("trails differ:\nindex    %v\nno index %v", a.Trails, b.Trails)
	}
}

// plain takes from the sources what is not printed of them: the column.
func plain(list []any) []any {
	out := make([]any, len(list))
	for i, x := range list {
		out[i] = x
		if sources, ok := x.([]profile.Source); ok {
			texts := make([]string, len(sources))
			for k, s := range sources {
				texts[k] = s.String()
			}
			out[i] = texts
		}
	}
	return out
}

// An index gives the same as reading the repository, built at once, or step by
// step from older tips, in batches of any size.
func TestIndexEqualsNoIndex(t *testing.T) {
	ctx := context.Background()
	for seed := range uint64(8) {
		d := draw(t, seed)
		x := mustOpen(t, filepath.Join(t.TempDir(), "index.db"))
		size := 1 + int(seed)*3
		if seed%2 == 0 {
			for _, rev := range []string{"HEAD~6", "HEAD^2~1", "HEAD~3", "HEAD^2", "HEAD~1"} {
				if c, err := d.repo.Resolve(rev); err == nil {
					tip, _ := trace.ParseHash(c.Hash)
					if err := x.Update(ctx, trace.NewReader(d.repo, ".").InBatches(size), ".", tip, nil); err != nil {
						t.Fatal(err)
					}
					d.check(t, x, tip, "R1")
				}
			}
		}
		if err := x.Update(ctx, trace.NewReader(d.repo, ".").InBatches(size), ".", d.tip, nil); err != nil {
			t.Fatal(err)
		}
		for _, route := range []string{"R1", "R2", "R3", "R9", "none"} {
			d.check(t, x, d.tip, route)
		}
		// Nothing is read twice.
		if err := x.Update(ctx, trace.NewReader(d.repo, "."), ".", d.tip, func(int, int) { t.Fatal("read again") }); err != nil {
			t.Fatal(err)
		}
		// Another folder of the same repository has a history of its own.
		if err := x.Update(ctx, trace.NewReader(d.repo, "routes"), "routes", d.tip, nil); err != nil {
			t.Fatal(err)
		}
		d.check(t, x, d.tip, "R1")
	}
}

// A build that is interrupted at any batch goes on where it ended.
func TestInterruptedBuild(t *testing.T) {
	d := draw(t, 3)
	for stop := range 6 {
		file := filepath.Join(t.TempDir(), "index.db")
		x := mustOpen(t, file)
		ctx, cancel := context.WithCancel(context.Background())
		done := 0
		err := x.Update(ctx, trace.NewReader(d.repo, ".").InBatches(4), ".", d.tip, func(int, int) {
			if done == stop {
				cancel()
			}
			done++
		})
		if !errors.Is(err, context.Canceled) {
			t.Fatal(stop, err)
		}
		x.Close()
		x = mustOpen(t, file)
		if _, found, err := x.History(context.Background(), ".", d.tip, "R1"); found || err != nil {
			t.Fatal(found, err)
		}
		left := -1
		if err := x.Update(context.Background(), trace.NewReader(d.repo, ".").InBatches(4), ".", d.tip, func(_, total int) { left = total }); err != nil {
			t.Fatal(err)
		}
		// HEAD does not reach every commit that was drawn.
		if all := reachable(t, d); left != all-4*(stop+1) {
			t.Fatalf("%d commits were left of %d after %d batches of 4", left, all, stop+1)
		}
		d.check(t, x, d.tip, "R1")
	}
}

func reachable(t *testing.T, d *drawn) int {
	t.Helper()
	w, err := trace.NewReader(d.repo, ".").Commits(context.Background(), d.tip, false, nil)
	if err != nil {
		t.Fatal(err)
	}
	return w.Len()
}

// Two processes that build the same index at once end with one that is right.
func TestTwoProcesses(t *testing.T) {
	if dir, file := os.Getenv("INDEX_TEST_REPO"), os.Getenv("INDEX_TEST_FILE"); dir != "" {
		d := &drawn{dir: dir}
		d.open(t)
		x := mustOpen(t, file)
		if err := x.Update(context.Background(), trace.NewReader(d.repo, ".").InBatches(2), ".", d.tip, nil); err != nil {
			t.Fatal(err)
		}
		return
	}
	for seed := range uint64(3) {
		d := draw(t, seed)
		file := filepath.Join(t.TempDir(), "index.db")
		var running []*exec.Cmd
		for range 3 {
			c := exec.Command(os.Args[0], "-test.run=^TestTwoProcesses$")
			c.Env = append(os.Environ(), "INDEX_TEST_REPO="+d.dir, "INDEX_TEST_FILE="+file)
			c.Stdout, c.Stderr = os.Stderr, os.Stderr
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			running = append(running, c)
		}
		for _, c := range running {
			if err := c.Wait(); err != nil {
				t.Fatal(err)
			}
		}
		x := mustOpen(t, file)
		for _, route := range []string{"R1", "R2", "R3"} {
			d.check(t, x, d.tip, route)
		}
		if n := count(t, file, "SELECT sum(commits) FROM chunk"); n != reachable(t, d) {
			t.Fatalf("%d commits in the index, %d in the repository", n, reachable(t, d))
		}
	}
}

func count(t *testing.T, file, query string) (n int) {
	t.Helper()
	db, err := sql.Open("sqlite3", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	if err := db.QueryRow(query).Scan(&n); err != nil {
		t.Fatal(err)
	}
	return n
}

func alter(t *testing.T, file string, statements ...string) {
	t.Helper()
	db, err := sql.Open("sqlite3", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	for _, s := range statements {
		if _, err := db.Exec(s); err != nil {
			t.Fatal(s, err)
		}
	}
}

// An index of another version is emptied; a file that is no index is left as it
// is; a damaged one is an error of a class that the caller can do without.
func TestOtherFiles(t *testing.T) {
	ctx := context.Background()
	d := draw(t, 1)
	dir := t.TempDir()
	file := filepath.Join(dir, "index.db")
	build := func() {
		t.Helper()
		x := mustOpen(t, file)
		if err := x.Update(ctx, trace.NewReader(d.repo, "."), ".", d.tip, nil); err != nil {
			t.Fatal(err)
		}
		d.check(t, x, d.tip, "R1")
		x.Close()
	}
	build()
	alter(t, file, "PRAGMA user_version = 7", "CREATE TABLE extra (x)")
	x := mustOpen(t, file)
	if _, found, err := x.History(ctx, ".", d.tip, "R1"); found || err != nil {
		t.Fatal(found, err)
	}
	x.Close()
	build()
	for _, damage := range []string{
		"UPDATE chunk SET data = substr(data, 2)", "UPDATE chunk SET commits = commits + 1", "UPDATE chunk SET commits = -1", "UPDATE chunk SET first = 5",
		"UPDATE version SET data = substr(data, 3)", "UPDATE version SET data = x''", "UPDATE change SET number = number + 99999", "UPDATE gap SET number = -1 - number",
		"DROP TABLE version",
	} {
		alter(t, file, damage)
		x := mustOpen(t, file)
		if h, _, err := x.History(ctx, ".", d.tip, "R1"); !errors.Is(err, index.ErrFailed) && h != nil {
			t.Errorf("%s: %v", damage, err)
		}
		x.Close()
		if err := os.Remove(file); err != nil {
			t.Fatal(err)
		}
		build()
	}
	for name, content := range map[string]string{"text": strings.Repeat("not a database ", 99), "empty folder": ""} {
		file := filepath.Join(dir, name)
		if content == "" {
			if err := os.Mkdir(file, 0o755); err != nil {
				t.Fatal(err)
			}
		} else if err := os.WriteFile(file, []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
		if _, err := index.Open(ctx, file); !errors.Is(err, index.ErrForeign) {
			t.Errorf("%s: %v", name, err)
		}
	}
	other := filepath.Join(dir, "other.db")
	alter(t, other, "CREATE TABLE mine (x)")
	if _, err := index.Open(ctx, other); !errors.Is(err, index.ErrForeign) {
		t.Error(err)
	}
	if n := count(t, other, "SELECT count(*) FROM sqlite_schema"); n != 1 {
		t.Errorf("%d objects in a file of somebody else", n)
	}
	if _, err := index.Open(ctx, filepath.Join(dir, "text", "index.db")); !errors.Is(err, index.ErrFailed) {
		t.Error(err)
	}
}

// What another process adds while a question is answered does not mix with the
// answer.
func TestHistoryWhileAnotherAdds(t *testing.T) {
	d := draw(t, 3)
	file := filepath.Join(t.TempDir(), "index.db")
	old, ok := ancestor(t, d, "HEAD~6")
	if !ok {
		t.Skip("the history is too short")
	}
	x, y := mustOpen(t, file), mustOpen(t, file)
	if err := x.Update(context.Background(), trace.NewReader(d.repo, "."), ".", old, nil); err != nil {
		t.Fatal(err)
	}
	done := make(chan error)
	go func() {
		done <- y.Update(context.Background(), trace.NewReader(d.repo, ".").InBatches(1), ".", d.tip, nil)
	}()
	for adding := true; adding; {
		select {
		case err := <-done:
			if err != nil {
				t.Fatal(err)
			}
			adding = false
		default:
		}
		d.check(t, x, old, "R1")
	}
}

func ancestor(t *testing.T, d *drawn, rev string) (trace.Hash, bool) {
	t.Helper()
	c, err := d.repo.Resolve(rev)
	if err != nil {
		return trace.Hash{}, false
	}
	h, err := trace.ParseHash(c.Hash)
	if err != nil {
		t.Fatal(err)
	}
	return h, true
}
