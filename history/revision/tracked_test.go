package revision

import (
	"os"
	"path/filepath"
	"testing"
)

// TestTracked compares with git ls-files --error-unmatch.
func TestTracked(t *testing.T) {
	t.Parallel()
	g := dirty(t)
	r := g.open()
	for _, name := range []string{
		"data/kept.csv", "data/modified.csv", "data/deleted.csv", "data/staged.csv", "data/tracked-ignored.log", "data/ignored/tracked.csv", "data/Vägar/ö 1.csv",
		"data/renamed-to.csv", "data/renamed-from.csv", "data/untracked.csv", "data/some.log", "data/absent/deeper.csv", "data/gone/only.csv", "data/becomes-file/in.csv",
		"data/file-to-link", "outside.csv", "data/other/file.csv", "data/KEPT.CSV", ".git/config", "data/dangling",
	} {
		got, err := r.Tracked(g.path(name))
		want := g.code("ls-files", "--error-unmatch", "--", name) == 0
		if got != want || err != nil {
			t.Errorf("%q: %v (%v), git says %v", name, got, err, want)
		}
	}
	g.write("data/staged-new.csv", "x\n")
	g.git("add", "data/staged-new.csv")
	if got, err := r.Tracked(g.path("data/staged-new.csv")); !got || err != nil {
		t.Errorf("a file that was added just now: %v, %v", got, err)
	}
	for _, folder := range []string{"data", ".", "data/ignored"} {
		if got, err := r.Tracked(g.path(folder)); got || err != nil {
			t.Errorf("folder %q: %v, %v", folder, got, err)
		}
	}
	if _, err := r.Tracked("data/kept.csv"); err == nil {
		t.Error("a relative path was taken")
	}
	if got, err := r.Tracked(filepath.Join(tempDir(t), "kept.csv")); got || err != nil {
		t.Errorf("outside: %v, %v", got, err)
	}
	if got, err := r.Tracked(g.dir + "-beside/data/kept.csv"); got || err != nil {
		t.Errorf("beside: %v, %v", got, err)
	}
}

// TestTrackedLinks: a path may lead to a tracked file by way of links, which git
// does not follow. A ledger there would still be replaced by a checkout.
func TestTrackedLinks(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	g.write("data/ledger.db", "x\n")
	g.symlink("ledger.db", "data/tracked-link")
	g.commit("both")
	g.symlink("data/ledger.db", "untracked-link")
	away := tempDir(t)
	for name, target := range map[string]string{"folder": g.path("data"), "file": g.path("data/ledger.db"), "root": g.dir} {
		if err := os.Symlink(target, filepath.Join(away, name)); err != nil {
			t.Fatal(err)
		}
	}
	r := g.open()
	for name, want := range map[string]bool{
		g.path("data/ledger.db"): true, g.path("data/tracked-link"): true, g.path("untracked-link"): true, g.path("data/absent"): false,
		filepath.Join(away, "folder/ledger.db"): true, filepath.Join(away, "file"): true, filepath.Join(away, "root/data/ledger.db"): true,
		filepath.Join(away, "root/data/absent/ledger.db"): false, filepath.Join(away, "absent"): false,
		g.dir + "/data/../data//ledger.db": true,
	} {
		if got, err := r.Tracked(name); got != want || err != nil {
			t.Errorf("%q: %v (%v), want %v", name, got, err, want)
		}
	}
	os.Remove(g.path("data/ledger.db"))
	if got, err := r.Tracked(filepath.Join(away, "folder/ledger.db")); !got || err != nil {
		t.Errorf("deleted, by way of a link: %v, %v", got, err)
	}
}

func TestTrackedKinds(t *testing.T) {
	t.Parallel()
	g := sample(t)
	linked := g.at(filepath.Join(tempDir(t), "linked"))
	g.git("worktree", "add", "--quiet", "--detach", linked.dir, "main")
	if got, err := linked.open().Tracked(linked.path("network/speed.csv")); !got || err != nil {
		t.Errorf("in a linked worktree: %v, %v", got, err)
	}
	bare := g.at(filepath.Join(tempDir(t), "bare.git"))
	g.git("clone", "--quiet", "--bare", g.dir, bare.dir)
	if got, err := bare.open().Tracked(bare.path("network/speed.csv")); got || err != nil {
		t.Errorf("in a bare repository: %v, %v", got, err)
	}
	g.git("config", "core.ignoreCase", "true")
	if got, err := g.open().Tracked(g.path("network/SPEED.csv")); !got || err != nil {
		t.Errorf("in other letter case: %v, %v", got, err)
	}
}
