package revision

import (
	"fmt"
	"strings"
	"testing"
)

// TestDescribe: tags before branches before remote-tracking branches, each in
// byte order.
func TestDescribe(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("tag", "v1.5", "light")
	check := func(g *gitRepo) {
		t.Helper()
		r := g.open()
		for rev, want := range map[string]string{
			"v1": "v1", "v1~1": "", "v2": "v2", "light": "light", "side": "side", "side~1": "", "topic/deep": "topic/deep",
			"main~1": "origin/main", "apart": "apart",
		} {
			c, err := r.Resolve(rev)
			if err != nil {
				t.Fatal(err)
			}
			if got := r.Describe(c); got != want {
				t.Errorf("%s is described as %q, want %q", rev, got, want)
			}
		}
		if got := r.Describe(Commit{}); got != "" {
			t.Errorf("the working tree is described as %q", got)
		}
		tags := r.Tags()
		for rev, want := range map[string]string{"v1": "v1", "v1~1": "", "v2": "v2", "light": "light", "side": "", "apart": ""} {
			if got := tags[g.git("rev-parse", rev+"^{commit}")]; got != want {
				t.Errorf("the tag of %s is %q, want %q", rev, got, want)
			}
		}
	}
	check(g)
	g.git("pack-refs", "--all")
	check(g)
	g.git("branch", "a-branch", "v1") // a tag goes before it
	g.git("tag", "a-tag", "v2")
	g.git("branch", "moved", "main")
	g.git("branch", "--force", "moved", "side") // newer than in packed-refs
	r := g.open()
	c, err := r.Resolve("v2")
	if got := r.Describe(c); got != "a-tag" || err != nil {
		t.Errorf("v2 is described as %q (%v)", got, err)
	}
	// A broken reference hides no others.
	g.write(".git/refs/heads/broken", "not a hash\n")
	r = g.open()
	if got := r.Describe(c); got != "a-tag" {
		t.Errorf("beside a broken reference v2 is described as %q", got)
	}
}

// TestPackedRefs reads what git-pack-refs(1) writes and what it does not.
func TestPackedRefs(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("pack-refs", "--all", "--prune")
	hash := g.git("rev-parse", "main")
	head := readFile(t, g.path(".git/packed-refs"))
	if !strings.Contains(head, "\n^") {
		t.Fatal("no peeled tag in packed-refs:\n" + head)
	}
	for _, bad := range []string{
		hash + "\n", hash[:39] + " refs/heads/bad\n", strings.Repeat("g", 40) + " refs/heads/bad\n", "x\n", hash + "\trefs/heads/bad\n",
	} {
		g.write(".git/packed-refs", head+bad)
		_, err := g.open().Resolve("topic/deep")
		wantClass(t, err, ErrCorrupt, "packed references", strings.TrimSpace(bad)[:1])
	}
	// Without the comment at the top and with Windows line ends.
	_, body, _ := strings.Cut(head, "\n")
	g.write(".git/packed-refs", strings.ReplaceAll(body, "\n", "\r\n"))
	c, err := g.open().Resolve("main")
	if c.Hash != hash || err != nil {
		t.Errorf("main is %q (%v)", c.Hash, err)
	}
}

// TestBrokenRefs: a reference that is there and cannot be read is not the same as
// one that is not there.
func TestBrokenRefs(t *testing.T) {
	t.Parallel()
	g := sample(t)
	hash := g.git("rev-parse", "main")
	for i, content := range []string{"", "\n", "x\n", hash[:39] + "\n", hash + "x\n", "ref: refs/heads/bad-%d\n", "ref: ../../HEAD\n"} {
		name := fmt.Sprintf("bad-%d", i)
		g.write(".git/refs/heads/"+name, strings.ReplaceAll(content, "%d", fmt.Sprint(i)))
		_, err := g.open().Resolve(name)
		if content == "ref: ../../HEAD\n" {
			wantClass(t, err, ErrUnknown)
			continue
		}
		wantClass(t, err, ErrCorrupt, "refs/heads/bad-")
	}
	// One that points to no object.
	g.write(".git/refs/heads/dangling", strings.Repeat("ab", 20)+"\n")
	_, err := g.open().Resolve("dangling")
	wantClass(t, err, ErrMissingObject, strings.Repeat("ab", 20), `"dangling"`)
}

// TestSymbolicRefs: git reads at most five references one after the other.
func TestSymbolicRefs(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("symbolic-ref", "refs/heads/s1", "refs/heads/main")
	for i := 2; i <= 5; i++ {
		g.git("symbolic-ref", fmt.Sprintf("refs/heads/s%d", i), fmt.Sprintf("refs/heads/s%d", i-1))
	}
	checkResolve(t, g, g.open(), []string{"s1", "s2", "s3", "s4", "s4~1", "s5"})
	g.git("symbolic-ref", "refs/heads/round", "refs/heads/round")
	_, err := g.open().Resolve("round")
	wantClass(t, err, ErrCorrupt, "too many references")
}

// TestUnborn: a repository without a commit, and a branch without one.
func TestUnborn(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	r := g.open()
	_, err := r.Resolve("HEAD")
	wantClass(t, err, ErrUnknown, `branch "main" has no commit yet`)
	_, err = r.Resolve("main")
	wantClass(t, err, ErrUnknown)
	_, err = r.Resolve("@{0}")
	wantClass(t, err, ErrUnknown)
	_, err = r.Resolve("abcd")
	wantClass(t, err, ErrUnknown)
	if fsys, err := r.Working("."); err != nil {
		t.Error(err)
	} else if names := walkNames(t, fsys); len(names) != 0 {
		t.Errorf("an empty repository has files %v", names)
	}
	g.write("new.csv", "1\n")
	checkWorking(t, g, ".")

	s := sample(t)
	s.git("checkout", "--quiet", "--orphan", "fresh")
	r = s.open()
	for _, rev := range []string{"HEAD", "@", "HEAD~1"} {
		_, err = r.Resolve(rev)
		wantClass(t, err, ErrUnknown, `branch "fresh" has no commit yet`)
	}
	checkResolve(t, s, r, []string{"main", "HEAD", "fresh", "v1"})
}
