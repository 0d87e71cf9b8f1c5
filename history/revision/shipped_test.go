package revision

import (
	"os"
	"path/filepath"
	"testing"
)

// TestShippedRepository opens a bare repository that a commit brought: it would hide
// the one around it.
func TestShippedRepository(t *testing.T) {
	g := newGit(t)
	g.commit("outer")
	inner := g.at(g.path("network"))
	g.git("init", "--quiet", "--bare", "network")
	if r, err := Open(inner.dir); err != nil {
		t.Fatalf("not tracked so far: %v", err)
	} else {
		r.Close()
	}
	for _, dir := range []string{"objects/info", "refs/heads"} {
		if err := os.WriteFile(filepath.Join(inner.dir, dir, "keep"), nil, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	g.git("add", "--force", ".")
	g.git("commit", "--quiet", "-m", "a repository as files")
	clone := g.at(filepath.Join(tempDir(t), "clone"))
	g.git("clone", "--quiet", g.dir, clone.dir)
	for _, name := range []string{"network", "network/objects", "network/refs/heads"} {
		_, err := Open(clone.path(name))
		wantClass(t, err, ErrUnsupported, "tracks", "--repo")
	}
	if r, err := Open(clone.dir); err != nil {
		t.Fatal(err)
	} else {
		r.Close()
	}
	// One within the other: the inner one is not told apart by the outer, which is no
	// repository to go by.
	nested := clone.at(clone.path("network/objects/info"))
	nested.git("init", "--quiet", "--bare", ".")
	_, err := Open(nested.dir)
	wantClass(t, err, ErrUnsupported, "tracks", "--repo")
}
