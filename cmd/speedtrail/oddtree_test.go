package main

import (
	"bytes"
	"compress/zlib"
	"crypto/sha1"
	"encoding/hex"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/revision"
)

// object writes an object as it is into a repository: Git would not make some of them,
// and takes them over from whoever pushes them unless it is told to look.
func object(t *testing.T, repo, kind, content string) string {
	t.Helper()
	raw := fmt.Sprintf("%s %d\x00%s", kind, len(content), content)
	hash := fmt.Sprintf("%x", sha1.Sum([]byte(raw)))
	var b bytes.Buffer
	z := zlib.NewWriter(&b)
	if _, err := z.Write([]byte(raw)); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(repo, ".git", "objects", hash[:2], hash[2:])
	if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(file, b.Bytes(), 0o644); err != nil {
		t.Fatal(err)
	}
	return hash
}

func treeLine(mode, name, hash string) string {
	raw, _ := hex.DecodeString(hash)
	return mode + " " + name + "\x00" + string(raw)
}

// TestOddTrees: a commit with a tree that is none stays in the history for ever. It is
// a gap of a trace, and does not take traces from everybody.
func TestOddTrees(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	r, err := revision.Open(repo)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	c, err := r.Resolve("c1")
	if err != nil {
		t.Fatal(err)
	}
	blob := object(t, repo, "blob", "x\n")
	odd := object(t, repo, "tree", treeLine("100644", "b", blob)+treeLine("100644", "a", blob))
	files := plainFiles(t, t.TempDir(), 80)
	file := func(name string) string {
		return treeLine("100644", filepath.Base(name), object(t, repo, "blob", files[name]))
	}
	tree := func(lines ...string) string { return object(t, repo, "tree", strings.Join(lines, "")) }
	sound := treeLine("40000", "routes", tree(treeLine("40000", "r1", tree(file("routes/r1/route.toml"), file("routes/r1/speed.csv")))))
	whole := func(middle ...string) string {
		return tree(file("dataset.toml"), strings.Join(middle, ""), file("trains.toml"))
	}
	for name, root := range map[string]string{
		"the root":            odd,
		"the root is a file":  blob,
		"routes":              whole(treeLine("40000", "routes", odd)),
		"routes is a file":    whole(treeLine("40000", "routes", blob)),
		"a route":             whole(treeLine("40000", "routes", tree(treeLine("40000", "r1", odd)))),
		"a route is a file":   whole(treeLine("40000", "routes", tree(treeLine("40000", "r1", blob)))),
		"requests":            whole(treeLine("40000", "requests", odd), sound),
		"requests is a file":  whole(treeLine("40000", "requests", blob), sound),
		"a request is a tree": whole(treeLine("40000", "requests", tree(treeLine("100644", "q.toml", odd))), sound),
		"dataset.toml":        tree(treeLine("100644", "dataset.toml", odd), sound, file("trains.toml")),
		"speed.csv is a tree": whole(treeLine("40000", "routes", tree(treeLine("40000", "r1", tree(file("routes/r1/route.toml"), treeLine("100644", "speed.csv", odd)))))),
	} {
		t.Run(name, func(t *testing.T) {
			people := func(at int64) string {
				return fmt.Sprintf("author M <m@tarn.example> %d +0000\ncommitter M <m@tarn.example> %d +0000\n\nCommit\n", at, at)
			}
			bad := object(t, repo, "commit", "tree "+root+"\nparent "+c.Hash+"\n"+people(1790000000))
			back := object(t, repo, "commit", "tree "+c.Tree+"\nparent "+bad+"\n"+people(1790000100))
			for _, option := range []string{"--no-index", "--first-parent"} {
				got := call(t, "--repo", repo, "trace", "--route", "R1", "--at", "1", option, back).want(t, 0)
				if text := strings.Join(strings.Fields(got.out), " "); !strings.Contains(text, bad[:10]+" of 2026-09-21 does not load") || !strings.Contains(text, "malformed") && !strings.Contains(text, "is a tree") && !strings.Contains(text, "is a blob") {
					t.Errorf("%s\n%s", option, got.out)
				}
			}
			again, err := revision.Open(repo)
			if err != nil {
				t.Fatal(err)
			}
			defer again.Close()
			commit, err := again.Resolve(bad)
			if err != nil {
				t.Fatal(err)
			}
			if left, err := withoutCopies(again, []revision.Commit{commit}, c.Tree, "network"); err != nil || len(left) != 1 {
				t.Errorf("its people are not counted: %v %v", left, err)
			}
			// What is asked about the commit itself says that it is no fault of the clone.
			got := call(t, "--repo", repo, "assess", "--no-record", "c0", bad)
			if got.status == 0 || got.status == statusFinding {
				t.Errorf("assess: %d %s", got.status, got.out)
			}
		})
	}
}
