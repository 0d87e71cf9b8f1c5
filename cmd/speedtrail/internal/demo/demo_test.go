package demo

import (
	"errors"
	"io/fs"
	"maps"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"speedtrail/history/compose"
	"speedtrail/history/revision"
	"speedtrail/schema"
)

// lastRelease is the commit of release-2026.1. A change of the network, of its
// history or of the people in it changes this hash; then the expected outputs
// that name it must be looked at as well.
const lastRelease = "8de4c203eb990fb779ffae4556404524bb90502e"

var releases = []string{"release-2025.1", "release-2025.2", "release-2025.3", "release-2025.4", "release-2026.1"}

func git(t testing.TB, dir string, args ...string) string {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("the git program is needed here")
		}
		t.Skip("no git program on this machine")
	}
	c := exec.Command("git", args...)
	c.Dir = dir
	c.Env = []string{"PATH=" + os.Getenv("PATH"), "HOME=" + dir, "GIT_CONFIG_NOSYSTEM=1", "GIT_CONFIG_GLOBAL=" + os.DevNull, "LC_ALL=C"}
	out, err := c.CombinedOutput()
	if err != nil {
		t.Fatalf("git %s: %v\n%s", strings.Join(args, " "), err, out)
	}
	return strings.TrimSuffix(string(out), "\n")
}

func write(t testing.TB) (string, Repository) {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "demo")
	network, err := Write(t.Context(), dir)
	if err != nil {
		t.Fatal(err)
	}
	return dir, network
}

func open(t testing.TB, dir string) *revision.Repo {
	t.Helper()
	repo, err := revision.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { repo.Close() })
	return repo
}

// TestPinned needs no git program: the hash says that every byte of the history
// is the same here as anywhere.
func TestPinned(t *testing.T) {
	dir, network := write(t)
	c, err := open(t, dir).Resolve(network.Target)
	if err != nil {
		t.Fatal(err)
	}
	if c.Hash != lastRelease {
		t.Errorf("%s is %s, pinned is %s", network.Target, c.Hash, lastRelease)
	}
	head, err := open(t, dir).Resolve("HEAD")
	if err != nil || head.Hash != c.Hash {
		t.Errorf("HEAD is %s (%v)", head.Hash, err)
	}
}

// TestLoads loads the data set of every commit on every branch: none has a fault,
// each has the routes and the trains of the network.
func TestLoads(t *testing.T) {
	dir, _ := write(t)
	repo := open(t, dir)
	history, err := History()
	if err != nil {
		t.Fatal(err)
	}
	head, err := repo.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	at := []string{head.Hash}
	seen := map[string]bool{}
	for len(at) > 0 {
		hash := at[0]
		at = at[1:]
		if seen[hash] {
			continue
		}
		seen[hash] = true
		c, err := repo.Resolve(hash)
		if err != nil {
			t.Fatal(err)
		}
		at = append(at, c.Parents...)
		files, err := repo.Snapshot(hash, ".")
		if err != nil {
			t.Fatal(err)
		}
		data, err := schema.Load(t.Context(), files)
		if err != nil {
			t.Errorf("commit %s, %q: %v", hash, c.Subject, err)
			continue
		}
		if len(data.Routes) != 5 || len(data.Trains) < 5 {
			t.Errorf("commit %s, %q: %d routes, %d trains", hash, c.Subject, len(data.Routes), len(data.Trains))
		}
	}
	// No commit stands outside: each branch was merged.
	if len(seen) != len(history) {
		t.Errorf("%d commits lead to HEAD, the history has %d", len(seen), len(history))
	}
}

// TestWorkingTree: the checkout is what the last release holds.
func TestWorkingTree(t *testing.T) {
	dir, _ := write(t)
	repo := open(t, dir)
	disk, err := repo.Working(".")
	if err != nil {
		t.Fatal(err)
	}
	data, err := schema.Load(t.Context(), disk)
	if err != nil {
		t.Fatal(err)
	}
	c, err := repo.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	committed, err := repo.Snapshot(c.Hash, ".")
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range data.Files {
		content, err := fs.ReadFile(committed, f.Path)
		if err != nil {
			t.Error(err)
		}
		onDisk, err := fs.ReadFile(disk, f.Path)
		if err != nil || string(content) != string(onDisk) {
			t.Errorf("%s differs from the commit (%v)", f.Path, err)
		}
	}
}

func TestGit(t *testing.T) {
	dir, network := write(t)
	if out := git(t, dir, "fsck", "--strict", "--full"); out != "" {
		t.Errorf("fsck: %s", out)
	}
	if out := git(t, dir, "status", "--porcelain"); out != "" {
		t.Errorf("status: %s", out)
	}
	tags := strings.Split(git(t, dir, "for-each-ref", "--sort=creatordate", "--format=%(refname:short)", "refs/tags/"), "\n")
	if !slices.Equal(tags, releases) {
		t.Errorf("tags %q, want %q", tags, releases)
	}
	for i, tag := range releases {
		if git(t, dir, "cat-file", "-t", tag) != "tag" {
			t.Errorf("%s is not annotated", tag)
		}
		if i > 0 {
			git(t, dir, "merge-base", "--is-ancestor", releases[i-1], tag)
		}
	}
	if network.Base != releases[3] || network.Target != releases[4] {
		t.Errorf("the last two releases are %s and %s", network.Base, network.Target)
	}
	// What happened later has a later date, so that a log reads in order.
	log := strings.Split(git(t, dir, "log", "--topo-order", "--first-parent", "--format=%ct"), "\n")
	if !slices.IsSortedFunc(log, func(a, b string) int { return strings.Compare(b, a) }) {
		t.Errorf("the dates along main are not in order: %v", log)
	}
	// Nothing but invented people.
	for _, line := range strings.Split(git(t, dir, "log", "--format=%ae%n%ce"), "\n") {
		if !strings.HasSuffix(line, ".example") {
			t.Errorf("the address %s could be somebody's", line)
		}
	}
}

// TestBranches: every commit and every merge changes something against its first
// parent, and is later than all its parents.
func TestBranches(t *testing.T) {
	history, err := History()
	if err != nil {
		t.Fatal(err)
	}
	merges := 0
	for i, c := range history {
		for n, p := range c.Parents {
			if p >= i {
				t.Errorf("%q: parent %d is not earlier", c.Message, p)
			}
			if n == 0 && maps.Equal(c.Files, history[p].Files) {
				t.Errorf("%q changes nothing against %q", c.Message, history[p].Message)
			}
			if !c.When.After(history[p].When) {
				t.Errorf("%q is not later than %q", c.Message, history[p].Message)
			}
		}
		if len(c.Parents) == 0 && i > 0 {
			t.Errorf("%q is a second root", c.Message)
		}
		if len(c.Parents) == 2 {
			merges++
		}
		if !strings.HasSuffix(c.Message, "\n") || strings.TrimSpace(c.Message) == "" {
			t.Errorf("message %q", c.Message)
		}
	}
	if merges < 3 {
		t.Errorf("only %d merges", merges)
	}
}

// TestRefused: a folder that is not empty is refused and stays as it was.
func TestRefused(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "mine.txt")
	if err := os.WriteFile(file, []byte("mine\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	before, err := os.Stat(file)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Write(t.Context(), dir); !errors.Is(err, compose.ErrNotEmpty) {
		t.Errorf("error %v", err)
	}
	entries, err := os.ReadDir(dir)
	if err != nil || len(entries) != 1 || entries[0].Name() != "mine.txt" {
		t.Errorf("the folder holds %v (%v)", entries, err)
	}
	after, err := os.Stat(file)
	if err != nil || !after.ModTime().Equal(before.ModTime()) || after.Mode() != before.Mode() {
		t.Errorf("the file was touched: %v (%v)", after, err)
	}
	if data, err := os.ReadFile(file); string(data) != "mine\n" || err != nil {
		t.Errorf("the file holds %q (%v)", data, err)
	}
}
