package index_test

import (
	"context"
	"fmt"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"

	"golang.org/x/sync/errgroup"

	"speedtrail/history/internal/network"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
)

// BenchmarkWalk measures a process that goes through the history along first
// parents and reads every file of a route that a commit brings, each once, over
// G (BenchmarkTrace): what an index costs before anything is parsed.
func BenchmarkWalk(b *testing.B) {
	size := network.Decade
	size.Routes, size.Commits, size.Trains = *pastRoutes, *pastCommits, *pastTrains
	dir := network.RepositoryWithPast(b, size)
	blobs := blobsOf(b, dir)
	var ours, g []cost
	for b.Loop() {
		c := exec.Command(os.Args[0], "-test.run=^TestWalk$", "-test.v")
		c.Env = append(os.Environ(), "WALK_TEST_REPO="+dir)
		ours, g = append(ours, costOf(b, c)), append(g, costOfG(b, dir, blobs))
	}
	reportCosts(b, "G", ours, g)
}

// BenchmarkStorage measures BenchmarkWalk and the first part of BenchmarkTrace for
// each way in which objects can lie on disk.
//
//	go test ./history/index -run '^$' -bench Storage -benchtime 3x -args -past-routes 500 -past-commits 5000
func BenchmarkStorage(b *testing.B) {
	program := buildProgram(b)
	for _, storage := range network.Storages {
		size := network.Decade
		size.Routes, size.Commits, size.Trains, size.Storage = *pastRoutes, *pastCommits, *pastTrains, storage
		dir := network.RepositoryWithPast(b, size)
		blobs := blobsOf(b, dir)
		index := filepath.Join(dir, ".git", "speedtrail", "index.db")
		for name, command := range map[string]func() *exec.Cmd{
			"walk": func() *exec.Cmd {
				c := exec.Command(os.Args[0], "-test.run=^TestWalk$", "-test.v")
				c.Env = append(os.Environ(), "WALK_TEST_REPO="+dir)
				return c
			},
			"build": func() *exec.Cmd {
				os.Remove(index)
				return exec.Command(program, "--repo", dir, "trace", "--route", "R0012", "--at", "12.4", "--train", "T003", "--direction", "nominal")
			},
		} {
			b.Run(fmt.Sprintf("%s/%s", storage, name), func(b *testing.B) {
				var ours, g []cost
				for b.Loop() {
					ours, g = append(ours, costOf(b, command())), append(g, costOfG(b, dir, blobs))
				}
				reportCosts(b, "G", ours, g)
			})
		}
	}
}

// costOfG runs the git commands that ours is measured against, one after the
// other.
func costOfG(b *testing.B, dir, blobs string) cost {
	git := func(stdin io.Reader, args ...string) cost {
		c := network.Command(context.Background(), dir, args...)
		c.Stdin = stdin
		return costOf(b, c)
	}
	return git(nil, "log", "--raw", "--first-parent", "--no-abbrev", "--format=%H").plus(git(strings.NewReader(blobs), "cat-file", "--batch"))
}

// What the walk reads is what git says that the commits bring, however the
// objects lie on disk.
func TestWalk(t *testing.T) {
	if dir := os.Getenv("WALK_TEST_REPO"); dir != "" { // to be measured
		walked(t, dir)
		return
	}
	packs := map[network.Storage]int{network.OnePack: 1, network.Imported: 1, network.TwelvePacks: 12, network.Loose: 0}
	for _, storage := range network.Storages {
		size := network.Decade
		size.Routes, size.Commits, size.Storage = 12, 120, storage
		dir := network.RepositoryWithPast(t, size)
		list, err := filepath.Glob(filepath.Join(dir, ".git", "objects", "pack", "*.pack"))
		if err != nil || len(list) != packs[storage] {
			t.Fatalf("%s: %d packs, %v", storage, len(list), err)
		}
		files, length := walked(t, dir)
		wantFiles, wantSize := brought(t, dir)
		if files != wantFiles || length != wantSize {
			t.Errorf("%s: %d files of %d bytes were read, git names %d of %d", storage, files, length, wantFiles, wantSize)
		}
	}
}

func walked(t *testing.T, dir string) (files, size int) {
	t.Helper()
	repo, err := revision.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	files, size, err = readAll(repo)
	if err != nil {
		t.Fatal(err)
	}
	return files, size
}

// brought asks git for the number and the length of the files.
func brought(t *testing.T, dir string) (files, size int) {
	t.Helper()
	out, err := network.Command(t.Context(), dir, "log", "--raw", "--first-parent", "--no-abbrev", "--format=%H").Output()
	if err != nil {
		t.Fatal(err)
	}
	blobs := map[string]bool{}
	for line := range strings.Lines(string(out)) {
		if f := strings.Fields(line); strings.HasPrefix(line, ":") && strings.HasPrefix(f[5], "routes/") {
			blobs[f[3]] = true
		}
	}
	for blob := range blobs {
		data, err := network.Command(t.Context(), dir, "cat-file", "blob", blob).Output()
		if err != nil {
			t.Fatal(err)
		}
		size += len(data)
	}
	return len(blobs), size
}

// readAll reads every file of a route that a commit on the line of first parents
// brings, and gives their number and length.
func readAll(repo *revision.Repo) (files, size int, err error) {
	head, err := repo.Resolve("HEAD")
	if err != nil {
		return 0, 0, err
	}
	at, err := trace.ParseHash(head.Hash)
	if err != nil {
		return 0, 0, err
	}
	var trees [][20]byte // of the commits, the newest first
	for more := true; more; {
		l, err := repo.Link(at)
		if err != nil {
			return 0, 0, err
		}
		trees = append(trees, l.Tree)
		if more = len(l.Parents) > 0; more {
			at = l.Parents[0]
		}
	}
	r := &everything{repo: repo, seen: map[string]bool{}}
	var work errgroup.Group
	work.SetLimit(runtime.GOMAXPROCS(0))
	share := len(trees)/(4*runtime.GOMAXPROCS(0)) + 1
	for from := 0; from < len(trees); from += share {
		work.Go(func() error { return r.row(trees, from, min(from+share, len(trees))) })
	}
	err = work.Wait()
	return r.files, r.size, err
}

type everything struct {
	repo        *revision.Repo
	mu          sync.Mutex
	seen        map[string]bool
	files, size int
}

// row reads what each of some commits has otherwise than the one after it in the
// list; the last of all commits has everything.
func (r *everything) row(trees [][20]byte, from, to int) error {
	var before revision.Tree
	for i := min(to, len(trees)-1); i >= from; i-- {
		root, _, err := r.repo.Tree(trees[i], revision.Tree{}, "a commit")
		if err != nil {
			return err
		}
		routes, _ := root.Find("routes")
		now, changes, err := r.repo.Tree(routes.Hash, before, "a commit")
		if err != nil {
			return err
		}
		before = now
		if i == to {
			continue // another row's
		}
		for _, c := range changes {
			if c.Now.Name != "" {
				if err := r.route(c.Now.Hash); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

func (r *everything) route(tree [20]byte) error {
	folder, err := r.repo.Folder(tree, "a commit")
	if err != nil {
		return err
	}
	list, err := fs.ReadDir(folder, ".")
	if err != nil {
		return err
	}
	for _, e := range list {
		id := e.(schema.Identified).Identity()
		r.mu.Lock()
		known := r.seen[id]
		r.seen[id] = true
		r.mu.Unlock()
		if known {
			continue
		}
		content, _, err := folder.(schema.Bounded).ReadAtMost(e.Name(), 1<<20)
		if err != nil {
			return err
		}
		r.mu.Lock()
		r.files++
		r.size += len(content)
		r.mu.Unlock()
	}
	return nil
}

// BenchmarkGrowth measures the whole process of a first trace, which makes the
// index, for histories of once, four and sixteen times the routes, the commits
// and the trains of a small one. No peak is below that of this process itself, as
// the system counts.
//
//	go test ./history/index -run '^$' -bench Growth -benchtime 1x -args -past-routes 125 -past-commits 1250
func BenchmarkGrowth(b *testing.B) {
	program := buildProgram(b)
	for _, what := range []string{"routes", "commits", "trains"} {
		for _, times := range []int{1, 4, 16} {
			b.Run(fmt.Sprintf("%s-x%d", what, times), func(b *testing.B) {
				size := network.Decade
				size.Routes, size.Commits, size.Trains = *pastRoutes, *pastCommits, *pastTrains
				*map[string]*int{"routes": &size.Routes, "commits": &size.Commits, "trains": &size.Trains}[what] *= times
				dir := network.RepositoryWithPast(b, size)
				blobs := blobsOf(b, dir)
				index := filepath.Join(dir, ".git", "speedtrail", "index.db")
				var ours, g []cost
				for b.Loop() {
					for range 3 {
						os.Remove(index)
						ours = append(ours, costOf(b, exec.Command(program, "--repo", dir, "trace", "--route", "R0012", "--at", "12.4", "--train", "T003", "--direction", "nominal")))
						g = append(g, costOfG(b, dir, blobs))
					}
				}
				reportCosts(b, "G", ours, g)
				if info, err := os.Stat(index); err == nil {
					b.ReportMetric(float64(info.Size())/(1<<20), "MiB-index")
				}
			})
		}
	}
}

// buildProgram builds the program that is measured.
func buildProgram(b *testing.B) string {
	program := filepath.Join(b.TempDir(), "speedtrail")
	if out, err := exec.Command("go", "build", "-o", program, "speedtrail/cmd/speedtrail").CombinedOutput(); err != nil {
		b.Fatalf("%v: %s", err, out)
	}
	return program
}
