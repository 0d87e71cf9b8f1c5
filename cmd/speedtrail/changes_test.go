package main

import (
	"bytes"
	"context"
	"errors"
	"flag"
	"io/fs"
	"os"
	"path/filepath"
	"testing"
	"time"

	"speedtrail/history/compose"
)

var update = flag.Bool("update", false, "write what comes out into testdata/changes")

// The pairs of testdata/changes, each with what must come out in every format.
func TestChanges(t *testing.T) {
	pairs, err := filepath.Glob("../../testdata/changes/*/base")
	if err != nil || len(pairs) == 0 {
		t.Fatal("no pairs", err)
	}
	for _, base := range pairs {
		dir, err := filepath.Abs(filepath.Dir(base))
		if err != nil {
			t.Fatal(err)
		}
		t.Run(filepath.Base(dir), func(t *testing.T) {
			t.Chdir(commitPair(t, dir)) // the text repeats a --repo
			for _, format := range []string{"text", "csv", "json", "markdown", "html"} {
				var out, remarks bytes.Buffer
				status := run(context.Background(), []string{"assess", "HEAD~1", "HEAD", "--no-record", "--format", format}, nil, &out, &remarks)
				if status != statusDone && status != statusFinding {
					t.Fatalf("status %d: %s", status, &remarks)
				}
				compareGolden(t, filepath.Join(dir, "want."+format), out.Bytes())
			}
		})
	}
}

// The profiles of the realigned route, in every form.
func TestProfileForms(t *testing.T) {
	dir := filepath.Join("..", "..", "testdata", "changes", "realigned")
	repo := commitPair(t, dir)
	for _, format := range []string{"text", "chart", "csv", "json", "svg"} {
		var out, remarks bytes.Buffer
		status := run(context.Background(), []string{"--repo", repo, "profile", "HEAD~1", "--route", "C1", "--train", "ORE", "--format", format}, nil, &out, &remarks)
		if status != statusDone {
			t.Fatalf("status %d: %s", status, &remarks)
		}
		compareGolden(t, filepath.Join(dir, "profile."+format), out.Bytes())
	}
}

func compareGolden(t *testing.T, file string, got []byte) {
	t.Helper()
	if *update {
		if err := os.WriteFile(file, got, 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(file)
	if errors.Is(err, fs.ErrNotExist) {
		t.Fatalf("%s is missing; go test ./cmd/speedtrail -run TestChanges -update writes it", file)
	}
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Equal(got, want) {
		return
	}
	a, b := bytes.Split(got, []byte("\n")), bytes.Split(want, []byte("\n"))
	for i := range min(len(a), len(b)) {
		if !bytes.Equal(a[i], b[i]) {
			t.Errorf("%s:%d:\n got %.300s\nwant %.300s", file, i+1, a[i], b[i])
			return
		}
	}
	t.Errorf("%s: %d lines, want %d", file, len(a), len(b))
}

// commitPair writes the folders base and target as two commits.
func commitPair(t *testing.T, dir string) string {
	t.Helper()
	repo := filepath.Join(t.TempDir(), "repo")
	who := compose.Person{Name: "Bo Tarn", Email: "bo@tarn.example"}
	when := time.Date(2026, 3, 2, 10, 0, 0, 0, time.UTC)
	history := []compose.Commit{
		{Files: filesOf(t, filepath.Join(dir, "base")), Author: who, When: when, Message: "Base\n"},
		{Parents: []int{0}, Files: filesOf(t, filepath.Join(dir, "target")), Author: who, When: when.Add(time.Hour), Message: "Target\n"},
	}
	if err := compose.Write(t.Context(), repo, history); err != nil {
		t.Fatal(err)
	}
	return repo
}

func filesOf(t *testing.T, dir string) map[string]string {
	t.Helper()
	files := map[string]string{}
	root := os.DirFS(dir)
	err := fs.WalkDir(root, ".", func(path string, e fs.DirEntry, err error) error {
		if err != nil || e.IsDir() {
			return err
		}
		content, err := fs.ReadFile(root, path)
		files[path] = string(content)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}
