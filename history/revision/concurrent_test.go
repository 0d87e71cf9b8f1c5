package revision

import (
	"io"
	"io/fs"
	"strings"
	"sync"
	"testing"
)

// TestRepack repacks between opening a repository and reading from it, with files
// that were opened before, and again with the packs that this made.
func TestRepack(t *testing.T) {
	t.Parallel()
	for name, first := range map[string]string{"loose before": "", "packs before": "repack"} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			g := looseSample(t)
			if first != "" {
				severalPacks(t, g)
			}
			r := g.open()
			tip := g.git("rev-parse", "main")
			fsys, err := r.Snapshot(tip, "network")
			if err != nil {
				t.Fatal(err)
			}
			open, err := fsys.Open("speed.csv")
			if err != nil {
				t.Fatal(err)
			}
			defer open.Close()
			hash, _ := parseHash(g.git("rev-parse", "main:network/routes/r1.csv"))
			found, err := r.find(hash, "the test")
			if err != nil {
				t.Fatal(err)
			}
			g.git("repack", "-adf", "--quiet")
			if data, err := r.content(found, "the test"); string(data) != "before the folder in Git's order\n" || err != nil {
				t.Errorf("an object that was found before: %q, %v", data, err)
			}
			want := g.git("cat-file", "blob", "main:network/speed.csv") + "\n"
			if data, err := io.ReadAll(open); string(data) != want || err != nil {
				t.Errorf("a file that was opened before: %d bytes, %v", len(data), err)
			}
			checkAll(t, g, r)
			g.git("repack", "-adf", "--quiet", "--depth=1")
			checkAll(t, g, r)

			// A commit made since is found, in a pack of its own as well.
			g.write("network/new.csv", "new\n")
			newer := g.commit("newer")
			checkTree(t, g, r, newer, "network")
			g.git("repack", "-ad", "--quiet")
			g.write("network/newest.csv", "newest\n")
			newest := g.commit("newest")
			g.git("repack", "-d", "--quiet")
			checkTree(t, g, r, newest, "network")
			checkResolve(t, g, r, []string{"HEAD", "HEAD~1", newest[:10]})
		})
	}
}

// TestConcurrent reads from several goroutines while another process writes and
// repacks. It is of use under the race detector.
func TestConcurrent(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	severalPacks(t, g)
	r := g.open()
	var commits []string
	want := map[string]string{}
	for _, hash := range lines(g.git("rev-list", "main")) {
		commits = append(commits, hash)
		want[hash] = contents(t, openDir(t, g.dir), hash)
	}
	stop := make(chan struct{})
	var readers sync.WaitGroup
	for range 4 {
		readers.Go(func() {
			for i := 0; ; i++ {
				select {
				case <-stop:
					return
				default:
				}
				hash := commits[i%len(commits)]
				fsys, err := r.Snapshot(hash, ".")
				if err != nil {
					t.Error(err)
					return
				}
				var b strings.Builder
				err = fs.WalkDir(fsys, ".", func(name string, e fs.DirEntry, err error) error {
					if err == nil && e.Type().IsRegular() && e.Name() == "speed.csv" {
						var data []byte
						if data, err = fs.ReadFile(fsys, name); err == nil {
							b.Write(data)
						}
					}
					return err
				})
				if err != nil || !strings.Contains(b.String(), "from_km") {
					t.Error(hash, err)
					return
				}
				if _, err := r.Resolve(hash[:8]); err != nil {
					t.Error(err)
					return
				}
				if ok, err := r.IsAncestor(t.Context(), commits[len(commits)-1], hash); !ok || err != nil {
					t.Error(ok, err)
					return
				}
				if _, err := r.Working("network"); err != nil {
					t.Error(err)
					return
				}
			}
		})
	}
	for _, depth := range []string{"--depth=1", "--depth=50", "--depth=0"} {
		g.git("repack", "-adf", "--quiet", depth)
	}
	close(stop)
	readers.Wait()
	for hash, text := range want {
		if got := contents(t, r, hash); got != text {
			t.Errorf("%s has other content after the repacks", hash)
		}
	}
}

// TestNothingWritten: reading leaves no trace in the repository.
func TestNothingWritten(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	severalPacks(t, g)
	list := func() string {
		list, err := state(g.dir)
		if err != nil {
			t.Fatal(err)
		}
		return list
	}
	tip, first := g.git("rev-parse", "main"), g.git("rev-parse", "v1^{commit}")
	before := list()
	r := g.open()
	if err := readAll(r, tip); err != nil {
		t.Fatal(err)
	}
	for _, rev := range []string{"HEAD~2", "v1", "nothing", tip[:6], "@{1}"} {
		if c, err := r.Resolve(rev); err == nil {
			r.Describe(c)
		}
	}
	if _, _, err := r.Between(t.Context(), first, tip); err != nil {
		t.Fatal(err)
	}
	fsys, err := r.Working(".")
	if err != nil {
		t.Fatal(err)
	}
	walkNames(t, fsys)
	if _, err := r.Tracked(g.path("network/speed.csv")); err != nil {
		t.Fatal(err)
	}
	if err := r.Close(); err != nil {
		t.Fatal(err)
	}
	if after := list(); after != before {
		t.Errorf("the repository was changed:\n%s\nbefore:\n%s", after, before)
	}
}
