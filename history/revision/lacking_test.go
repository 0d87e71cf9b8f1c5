package revision

import (
	"errors"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// clone clones a repository over its transport, so that filters and depths count.
func (g *gitRepo) clone(options ...string) *gitRepo {
	g.t.Helper()
	g.git("config", "uploadpack.allowFilter", "true")
	g.git("config", "uploadpack.allowAnySHA1InWant", "true")
	c := g.at(filepath.Join(tempDir(g.t), "clone"))
	g.git(append(append([]string{"clone", "--quiet"}, options...), "file://"+g.dir, c.dir)...)
	return c
}

// follow runs the commands that a hint names in backquotes, until one works.
func (g *gitRepo) follow(err error) {
	g.t.Helper()
	parts := strings.Split(err.Error(), "`")
	var last error
	for i := 1; i < len(parts); i += 2 {
		args := strings.Fields(parts[i])
		c := exec.Command(args[0], args[1:]...)
		c.Dir = g.dir
		out, err := c.CombinedOutput()
		if err == nil {
			return
		}
		last = errors.New(string(out))
	}
	g.t.Errorf("no command of the hint works: %v\n%v", err, last)
}

// TestShallow reads a clone of depth 2 (git-clone(1), --depth): what is there is
// as in a whole clone, what lies behind the end is an error of its own.
func TestShallow(t *testing.T) {
	t.Parallel()
	whole := sample(t)
	g := whole.clone("--depth=2", "--no-single-branch")
	r := g.open()
	tip, before, first := whole.git("rev-parse", "main"), whole.git("rev-parse", "main~1"), whole.git("rev-parse", "v1^{commit}")
	third := whole.git("rev-parse", "main~2")
	checkTree(t, g, r, tip, ".")
	checkTree(t, g, r, before, "network")
	checkResolve(t, g, r, []string{"HEAD", "HEAD~1", "main", "origin/main", "v2", "origin/side", before[:10]})
	for hash, boundary := range map[string]bool{tip: false, before: true} {
		c, err := r.Resolve(hash)
		if err != nil || c.Boundary != boundary || len(c.Parents) == 0 {
			t.Errorf("%s: boundary %v, parents %v (%v)", hash, c.Boundary, c.Parents, err)
		}
	}
	for _, rev := range []string{"HEAD~2", "main~3", "HEAD~1^", "HEAD~1^2", tip + "~2"} {
		_, err := r.Resolve(rev)
		wantClass(t, err, ErrShallow, rev, before, "git fetch --unshallow")
	}
	if c, err := r.Resolve("HEAD~1^0"); err != nil || c.Hash != before {
		t.Errorf("HEAD~1^0: %v", err)
	}

	// A base that is inside the clone, with history that is whole between.
	ok, err := r.IsAncestor(t.Context(), before, tip)
	if !ok || err != nil {
		t.Errorf("an ancestor inside the clone: %v, %v", ok, err)
	}
	commits, complete, err := r.Between(t.Context(), before, tip)
	if len(commits) != 1 || !complete || err != nil {
		t.Errorf("between inside the clone: %d, %v, %v", len(commits), complete, err)
	}
	// The other way round the end is met before the answer is known.
	_, err = r.IsAncestor(t.Context(), tip, before)
	wantClass(t, err, ErrShallow, "whether commit "+tip, before, "--unshallow")
	apart := whole.git("rev-parse", "apart")
	commits, complete, err = r.Between(t.Context(), apart, tip)
	if len(commits) != 2 || complete || err != nil {
		t.Errorf("between over the end: %d, %v, %v", len(commits), complete, err)
	}
	// A root that is a root is no boundary.
	commits, complete, err = r.Between(t.Context(), tip, apart)
	if len(commits) != 1 || complete || err != nil {
		t.Errorf("a root against a shallow base: %d, %v, %v", len(commits), complete, err)
	}
	if c, err := r.Resolve(apart); err != nil || c.Boundary {
		t.Errorf("the root of its own: %+v, %v", c, err)
	}

	// What is not here at all.
	_, err = r.Resolve(third)
	wantClass(t, err, ErrUnknown, third)
	_, err = r.IsAncestor(t.Context(), third, tip)
	wantClass(t, err, ErrMissingObject, third)
	_, _, err = r.Between(t.Context(), third, tip)
	wantClass(t, err, ErrMissingObject, third)

	_, err = r.Resolve("HEAD~2")
	g.follow(err)
	r = g.open()
	checkResolve(t, whole, r, []string{"HEAD~2", "HEAD~1^2", third})
	checkBetween(t, whole, r, first, tip)
}

// TestShallowDates: a base in a shallow clone, dated after its child. What lies
// before the base does not matter, so nothing is lacking.
func TestShallowDates(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	var s stream
	first := s.commit("refs/heads/first", 1767000000, "", "first\n", nil)
	end := s.commit("refs/heads/end", 1767008000, "", "where the clone ends\n", []int{first})
	old := s.commit("refs/heads/old", 1766000000, "", "a root of its own\n", nil)
	base := s.commit("refs/heads/base", 1767009000, "", "base\n", []int{end, old})
	s.commit("refs/heads/target", 1767001000, "", "dated before its parent\n", []int{base})
	s.commit("refs/heads/alone", 1767001000, "", "dated before the end\n", []int{end})
	s.load(g)
	h := g.gitResolve([]string{"base", "target", "end", "alone"})
	g.write(".git/shallow", h[2]+"\n")
	for name, pair := range map[string][2]string{"behind": {h[0], h[1]}, "at the end": {h[2], h[3]}} {
		t.Run(name, func(t *testing.T) {
			commits, complete, err := g.open().Between(t.Context(), pair[0], pair[1])
			if len(commits) != 1 || !complete || err != nil {
				t.Errorf("%d commits, complete %v, %v", len(commits), complete, err)
			}
		})
	}
}

// TestShallowMissingCommit: the hint should name the way that brings the commit.
func TestShallowMissingCommit(t *testing.T) {
	t.Parallel()
	whole := sample(t)
	g := whole.clone("--depth=1")
	old := whole.git("rev-parse", "v1^{commit}")
	_, err := g.open().Resolve(old)
	wantClass(t, err, ErrUnknown, old, "git fetch --unshallow")
	_, err = g.open().Resolve(old[:12])
	wantClass(t, err, ErrUnknown, old[:12], "git fetch --unshallow")
	_, err = g.open().Resolve("nothing")
	wantClass(t, err, ErrUnknown, "name a branch")
	_, err = g.open().Snapshot(old, ".")
	wantClass(t, err, ErrMissingObject, "git fetch --unshallow")
	g.follow(err)
	if _, err := g.open().Snapshot(old, "."); err != nil {
		t.Errorf("after what the hint says: %v", err)
	}
}

// TestShallowFile: a list of ends that cannot be read is not an empty one.
func TestShallowFile(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.write(".git/shallow", g.git("rev-parse", "main~1")+"\n")
	_, err := g.open().Resolve("main~2")
	wantClass(t, err, ErrShallow)
	for _, bad := range []string{"x\n", "\n", strings.Repeat("a", 39) + "\n"} {
		g.write(".git/shallow", bad)
		_, err := Open(g.dir)
		wantClass(t, err, ErrCorrupt, "shallow")
	}
	g.write(".git/shallow", "")
	checkResolve(t, sample(t), g.open(), []string{"main~2"})
}

// TestPartial reads a clone without blobs (git-clone(1), --filter=blob:none): a
// file whose content is missing is told from one that is not there, and the hint
// says how to fetch it.
func TestPartial(t *testing.T) {
	t.Parallel()
	whole := sample(t)
	whole.git("tag", "--delete", "light-blob", "a-blob") // git itself stumbles over them
	g := whole.clone("--filter=blob:none", "--no-checkout")
	r := g.open()
	tip := whole.git("rev-parse", "main")
	blob := whole.git("rev-parse", "main:network/speed.csv")
	checkResolve(t, g, r, []string{"HEAD", "HEAD~3", "v1", "main~2^3"})
	checkBetween(t, g, r, whole.git("rev-parse", "v1^{commit}"), tip)
	fsys, err := r.Snapshot(tip, "network")
	if err != nil {
		t.Fatal(err)
	}
	entries, err := fs.ReadDir(fsys, ".")
	if err != nil || len(entries) < 10 {
		t.Fatal(len(entries), err)
	}
	for _, e := range entries {
		if e.Name() == "speed.csv" {
			if e.(Entry).Identity() != blob {
				t.Error("identity", e.(Entry).Identity())
			}
			_, err := e.Info()
			wantClass(t, err, ErrMissingObject, blob)
		}
	}
	for name, call := range map[string]func() error{
		"open": func() error { _, err := fsys.Open("speed.csv"); return err },
		"read": func() error { _, err := fs.ReadFile(fsys, "speed.csv"); return err },
		"stat": func() error { _, err := fs.Stat(fsys, "speed.csv"); return err },
	} {
		t.Run(name, func(t *testing.T) {
			err := call()
			wantClass(t, err, ErrMissingObject, blob, tip, "partial clone", "speed.csv")
			if errors.Is(err, fs.ErrNotExist) {
				t.Errorf("missing content looks like an absent path: %v", err)
			}
		})
	}
	_, err = fs.Stat(fsys, "absent.csv")
	if !errors.Is(err, fs.ErrNotExist) || errors.Is(err, ErrMissingObject) {
		t.Errorf("an absent path: %v", err)
	}

	// One object fetched is seen by the repository that is open, the rest after
	// what the hint says.
	g.git("cat-file", "-e", blob)
	checkContent(t, fsys, "speed.csv", whole.git("cat-file", "blob", blob)+"\n")
	_, err = fs.ReadFile(fsys, "bytes.bin")
	wantClass(t, err, ErrMissingObject)
	g.follow(err)
	checkTree(t, whole, r, tip, ".")
}

// TestPartialTrees: with tree:0 not even the trees are here.
func TestPartialTrees(t *testing.T) {
	t.Parallel()
	whole := sample(t)
	whole.git("tag", "--delete", "light-blob", "a-blob", "a-tree")
	g := whole.clone("--filter=tree:0", "--no-checkout")
	r := g.open()
	checkResolve(t, g, r, []string{"HEAD", "HEAD~3", "v1"})
	_, err := r.Snapshot(whole.git("rev-parse", "main"), "network")
	wantClass(t, err, ErrMissingObject, whole.git("rev-parse", "main^{tree}"), "partial clone")
}

// TestMissing: an object that is gone from a whole clone.
func TestMissing(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	tip, root := g.git("rev-parse", "main"), g.git("rev-parse", "main~4~1")
	for _, what := range []string{"main^{tree}", "main:network", "main:network/routes", "main:network/speed.csv", "main~1", "main~4"} {
		t.Run(what, func(t *testing.T) {
			hash := g.git("rev-parse", what)
			whole := readFile(t, g.loose(hash))
			defer writeFile(t, g.loose(hash), whole)
			if err := os.Remove(g.loose(hash)); err != nil {
				t.Fatal(err)
			}
			r := g.open()
			var err error
			if strings.Contains(what, "~") {
				_, _, err = r.Between(t.Context(), root, tip)
			} else {
				var fsys fs.FS
				if fsys, err = r.Snapshot(tip, "."); err == nil {
					err = fs.WalkDir(fsys, ".", func(name string, e fs.DirEntry, err error) error {
						if err == nil && e.Type().IsRegular() {
							_, err = fs.ReadFile(fsys, name)
						}
						return err
					})
				}
			}
			wantClass(t, err, ErrMissingObject, hash, "git fetch --refetch")
			if errors.Is(err, fs.ErrNotExist) {
				t.Errorf("a missing object looks like an absent path: %v", err)
			}
		})
	}
}

// TestAlternatesBroken: a folder that is not there is of no concern, to git
// neither, until something is missing; one that borrows from itself is read once.
func TestAlternatesBroken(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	away := g.path("away/objects")
	g.write("file", "x\n")
	g.write(".git/objects/info/alternates", "/nowhere/objects\n../../away/objects\n"+g.path("file")+"\n")
	r := g.open()
	checkAll(t, g, r)
	tip, none := g.git("rev-parse", "main"), strings.Repeat("12", 20)
	_, err := r.Resolve(none)
	wantClass(t, err, ErrUnknown, none, "borrows", `"/nowhere/objects"`, away, g.path("file"))
	_, err = r.Snapshot(none, ".")
	wantClass(t, err, ErrMissingObject, none, "borrows", `"/nowhere/objects"`, away, g.path("file"))
	_, err = r.Resolve("nothing")
	wantClass(t, err, ErrUnknown, "name a branch")
	// Once the folder is there again, what it has is read.
	hash := g.git("rev-parse", "main:network/speed.csv")
	writeFile(t, filepath.Join(away, hash[:2], hash[2:]), readFile(t, g.loose(hash)))
	if err := os.Remove(g.loose(hash)); err != nil {
		t.Fatal(err)
	}
	checkTree(t, g, g.open(), tip, ".")
	os.RemoveAll(away)
	wantClass(t, readAll(g.open(), tip), ErrMissingObject, hash, away)

	s := sample(t)
	s.write(".git/objects/info/alternates", s.path(".git/objects")+"\n../objects\n")
	checkResolve(t, s, s.open(), []string{"main", "main~3"})
}

// TestAlternatesChain: how many folders may borrow from one another in a row.
func TestAlternatesChain(t *testing.T) {
	t.Parallel()
	g := sample(t)
	at := g
	for i := range 7 {
		next := g.at(filepath.Join(tempDir(t), "next"))
		g.git("init", "--quiet", "--bare", next.dir)
		objects := at.path("objects")
		if i == 0 {
			objects = at.path(".git/objects")
		}
		next.write("objects/info/alternates", objects+"\n")
		at = next
		r, err := Open(at.dir)
		_, gitErr := at.try("cat-file", "-e", g.git("rev-parse", "main"))
		if err == nil {
			_, err = r.Resolve(g.git("rev-parse", "main"))
			r.Close()
		}
		if (err == nil) != (gitErr == nil) {
			t.Errorf("a chain of %d: %v, git %v", i+1, err, gitErr)
		}
		if err != nil {
			wantClass(t, err, ErrCorrupt, "too many alternate")
		}
	}
}
