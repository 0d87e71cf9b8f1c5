package revision

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"testing"
)

// forced is a repository whose branch can be moved to another history, as a
// force-push does, so that the old tip is pruned.
type forced struct {
	g        *gitRepo
	old, now string
}

func newForced(t *testing.T, packed bool) *forced {
	t.Helper()
	g := newGit(t)
	g.write("network/a.csv", "a\n")
	g.write("network/b.csv", "b\n")
	g.write("network/routes/r1.csv", "one\n")
	g.commit("kept")
	g.git("tag", "kept")
	g.write("network/a.csv", "a that goes\n")
	g.write("network/b.csv", "b that goes\n")
	g.write("network/routes/r1.csv", "one that goes\n")
	f := &forced{g: g, old: g.commit("old")}
	if packed {
		g.git("repack", "-adq")
	}
	return f
}

// push moves the branch and prunes what only the old one had.
func (f *forced) push() {
	g := f.g
	g.git("reset", "--quiet", "--hard", "HEAD~1")
	g.write("network/a.csv", "a of the new history\n")
	f.now = g.commit("new")
	g.git("reflog", "expire", "--expire=now", "--expire-unreachable=now", "--all")
	g.git("gc", "--quiet", "--prune=now")
}

// After a force-push and a prune, what a reader holds of the old history is
// either whole or missing by name; the new history is all there for it.
func TestForcePush(t *testing.T) {
	t.Parallel()
	for name, packed := range map[string]bool{"loose objects": false, "a pack": true} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			f := newForced(t, packed)
			r := f.g.open()
			before, err := r.Resolve("main")
			if err != nil || before.Hash != f.old {
				t.Fatal(before.Hash, err)
			}
			fsys, err := r.Snapshot(f.old, "network")
			if err != nil {
				t.Fatal(err)
			}
			if data, err := fs.ReadFile(fsys, "a.csv"); string(data) != "a that goes\n" || err != nil {
				t.Fatalf("%q, %v", data, err)
			}
			b := f.g.git("rev-parse", f.old+":network/b.csv")
			f.push()

			data, err := fs.ReadFile(fsys, "b.csv")
			if packed {
				// The pack stays open, as the file system keeps a file that is open.
				if string(data) != "b that goes\n" || err != nil {
					t.Errorf("from a pack that is open: %q, %v", data, err)
				}
				if err := readAll(r, f.old); err != nil {
					t.Errorf("from a pack that is open: %v", err)
				}
			} else {
				wantClass(t, err, ErrMissingObject, b, "git fetch")
				if len(data) > 0 {
					t.Errorf("%q beside an error", data)
				}
			}
			if after, err := r.Resolve("main"); err != nil || after.Hash != f.now {
				t.Errorf("the branch is at %s, %v; want %s", after.Hash, err, f.now)
			}
			checkNew(t, f, r)
			if ok, err := r.IsAncestor(t.Context(), f.g.git("rev-parse", "kept"), f.now); !ok || err != nil {
				t.Error(ok, err)
			}

			// Whoever opens the repository now finds no trace of it.
			fresh := openDir(t, f.g.dir)
			_, err = fresh.Resolve(f.old)
			wantClass(t, err, ErrUnknown, f.old[:7])
			_, err = fresh.Snapshot(f.old, "network")
			wantClass(t, err, ErrMissingObject, f.old, "git fetch")
			_, _, err = fresh.Between(t.Context(), f.old, f.now)
			wantClass(t, err, ErrMissingObject, f.old)
			checkNew(t, f, fresh)
		})
	}
}

// checkNew compares the new history with what git says of it.
func checkNew(t *testing.T, f *forced, r *Repo) {
	t.Helper()
	checkTree(t, f.g, r, f.now, ".")
	checkResolve(t, f.g, r, []string{"HEAD", "main", "main~1", "kept", f.now[:12]})
}

// A file that was opened before the prune is read to its end, or is missing by
// name; never half.
func TestForcePushWithAFileOpen(t *testing.T) {
	t.Parallel()
	for name, packed := range map[string]bool{"loose objects": false, "a pack": true} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			f := newForced(t, packed)
			r := f.g.open()
			fsys, err := r.Snapshot(f.old, "network")
			if err != nil {
				t.Fatal(err)
			}
			begun, err := fsys.Open("a.csv")
			if err != nil {
				t.Fatal(err)
			}
			defer begun.Close()
			var first [1]byte
			if _, err := begun.Read(first[:]); err != nil || first[0] != 'a' {
				t.Fatal(first, err)
			}
			waiting, err := fsys.Open("b.csv")
			if err != nil {
				t.Fatal(err)
			}
			defer waiting.Close()
			f.push()
			rest := make([]byte, 100)
			n, err := readFull(begun, rest)
			if string(rest[:n]) != " that goes\n" || err != nil {
				t.Errorf("the rest of a file that was begun: %q, %v", rest[:n], err)
			}
			n, err = readFull(waiting, rest)
			if packed && (string(rest[:n]) != "b that goes\n" || err != nil) {
				t.Errorf("a file that was open: %q, %v", rest[:n], err)
			}
			if !packed {
				// It is opened on the disk when it is read first.
				wantClass(t, err, ErrMissingObject, "is not in the repository")
				if n > 0 {
					t.Errorf("%q beside an error", rest[:n])
				}
			}
		})
	}
}

func readFull(f fs.File, to []byte) (n int, err error) {
	for n < len(to) {
		k, err := f.Read(to[n:])
		n += k
		if err != nil {
			if err.Error() == "EOF" {
				err = nil
			}
			return n, err
		}
	}
	return n, nil
}

// `git gc --prune=now` takes away what nothing names, and nothing else: a reader
// that was at work before sees every commit of every branch.
func TestPrune(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	loose := g.object("blob", "named by nothing\n")
	r := g.open()
	tip := g.git("rev-parse", "main")
	if err := readAll(r, tip); err != nil {
		t.Fatal(err)
	}
	g.git("gc", "--quiet", "--prune=now")
	if _, err := os.Stat(g.loose(loose)); !errors.Is(err, fs.ErrNotExist) {
		t.Fatalf("gc has pruned nothing: %v", err)
	}
	left, err := filepath.Glob(g.path(".git/objects/??/*"))
	if err != nil || len(left) > 0 {
		t.Fatalf("gc has left loose objects: %v, %v", left, err)
	}
	checkAll(t, g, r)
	checkAll(t, g, openDir(t, g.dir))
	// References are in one file now; a new one stands beside it.
	g.write("network/later.csv", "later\n")
	later := g.commit("later")
	for _, r := range []*Repo{r, openDir(t, g.dir)} {
		if c, err := r.Resolve("main"); err != nil || c.Hash != later {
			t.Errorf("the branch is at %s, %v; want %s", c.Hash, err, later)
		}
		if list, complete, err := r.Between(t.Context(), tip, later); err != nil || !complete || len(list) != 1 || list[0].Hash != later {
			t.Errorf("%v, %v, %v", list, complete, err)
		}
	}
}
