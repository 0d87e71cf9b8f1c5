package revision

import (
	"os"
	"path/filepath"
	"testing"
)

// Outside the working tree and inside .git nothing is tracked, whatever state the
// index is in: it is not looked at.
func TestTrackedWithoutIndex(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	g.write("data/one.csv", "1\n")
	g.commit("One file")
	if err := os.WriteFile(g.path(".git/index"), []byte("no index"), 0o644); err != nil {
		t.Fatal(err)
	}
	r := g.open()
	for _, name := range []string{filepath.Join(tempDir(t), "ledger.db"), g.path(".git/ledger.db"), g.path(".git/deep/ledger.db"), g.path("../beside.db")} {
		if got, err := r.Tracked(name); got || err != nil {
			t.Errorf("%s: %v, %v", name, got, err)
		}
	}
	if _, err := r.Tracked(g.path("data/one.csv")); err == nil {
		t.Error("an index that is none was read")
	}
}
