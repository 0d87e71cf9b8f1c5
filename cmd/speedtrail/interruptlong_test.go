//go:build unix

package main

import (
	"bytes"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// signals are the two that end a command in good order.
var signals = map[string]os.Signal{"Ctrl-C": os.Interrupt, "SIGTERM": syscall.SIGTERM}

// validate of tables that take seconds to read.
func TestInterruptValidate(t *testing.T) {
	if testing.Short() {
		t.Skip("reads large tables")
	}
	repo := gitHistory(t, 1, 1, 3)
	var rows strings.Builder
	rows.WriteString("from_km,to_km,basic\n")
	for i := range 150_000 {
		fmt.Fprintf(&rows, "%d.%03d,%d.%03d,%d\n", i/1000, i%1000, (i+1)/1000, (i+1)%1000, 60+5*(i%2))
	}
	large := filepath.Join(repo, "large")
	if err := os.MkdirAll(large, 0o755); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"dataset.toml", "trains.toml"} {
		out, err := exec.Command("git", "-C", repo, "cat-file", "blob", "main:"+name).Output()
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(large, name), out, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	for r := range 16 {
		folder := filepath.Join(large, "routes", fmt.Sprint("r", r))
		if err := os.MkdirAll(folder, 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(folder, "route.toml"), fmt.Appendf(nil, "id = \"R%d\"\nname = \"Route\"\nstart_km = 0\nend_km = 150\n", r), 0o644); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(folder, "speed.csv"), []byte(rows.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	for name, signal := range signals {
		t.Run(name, func(t *testing.T) {
			result := filepath.Join(t.TempDir(), "result.json")
			c, out, errs := process(t, "--repo", repo, "--data", "large", "validate", "--out", result)
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(300 * time.Millisecond)
			if err := c.Process.Signal(signal); err != nil {
				t.Fatal("it was done before it could be interrupted: ", err)
			}
			inOrder(t, ended(t, c, 10*time.Second), errs)
			if list, err := filepath.Glob(filepath.Join(filepath.Dir(result), "*.json*")); err != nil || len(list) > 0 || out.Len() > 0 {
				t.Errorf("left: %v, %v, %d bytes", list, err, out.Len())
			}
		})
	}
}

// A trace builds its index first. What the interrupted one has done is kept, and
// the next one begins there.
func TestInterruptTrace(t *testing.T) {
	if testing.Short() {
		t.Skip("builds an index of a long history")
	}
	repo := gitHistory(t, 3000, 10, 60)
	file := filepath.Join(repo, ".git", "speedtrail", "index.db")
	done := func() (n int) {
		db, err := sql.Open("sqlite3", "file:"+file+"?mode=ro&_busy_timeout=5000")
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		if err := db.QueryRow("SELECT coalesce(sum(commits), 0) FROM chunk").Scan(&n); err != nil {
			return 0 // it is not there yet
		}
		return n
	}
	args := []string{"--repo", repo, "trace", "--route", "R3", "--at", "30.5", "--train", "T1", "--direction", "nominal"}
	last := 0
	for name, signal := range signals {
		c, out, errs := process(t, args...)
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		for begun := time.Now(); done() <= last && time.Since(begun) < 10*time.Second; {
			time.Sleep(2 * time.Millisecond)
		}
		if err := c.Process.Signal(signal); err != nil {
			t.Fatal("it was done before it could be interrupted: ", err)
		}
		status := ended(t, c, 10*time.Second)
		now := done()
		if now == 3000 {
			t.Skipf("the index was complete before %s reached it", name)
		}
		inOrder(t, status, errs)
		if out.Len() > 0 {
			t.Errorf("%s: a result was written: %s", name, out)
		}
		if now <= last {
			t.Errorf("%s: %d commits are in the index, there were %d", name, now, last)
		}
		t.Logf("%s: %d of 3000 commits are in the index", name, now)
		last = now
	}
	with := call(t, args...).want(t, 0)
	if n := done(); n != 3000 {
		t.Errorf("%d of 3000 commits are in the index", n)
	}
	if without := call(t, append(args, "--no-index")...).want(t, 0); without.out != with.out {
		t.Error("the trace from the index that was interrupted is another one")
	}
}

// verify and export over a ledger of some size; the ledger is as it was.
func TestInterruptLedger(t *testing.T) {
	if testing.Short() {
		t.Skip("records assessments")
	}
	repo := gitHistory(t, 40, 12, 40)
	program := built(t)
	start := func(t *testing.T, args ...string) (c *exec.Cmd, out, errs *bytes.Buffer) {
		c, out, errs = process(t, append([]string{"--repo", repo}, args...)...)
		c.Path = program
		return c, out, errs
	}
	for i := range 3 {
		c, _, errs := start(t, "assess", fmt.Sprintf("HEAD~%d", 30+i), fmt.Sprintf("HEAD~%d", i))
		if err := c.Run(); c.ProcessState.ExitCode() != statusFinding {
			t.Fatal(err, errs)
		}
	}
	// How long verify takes when nobody stops it says when it is in its midst.
	begun := time.Now()
	if c, _, errs := start(t, "verify"); c.Run() != nil {
		t.Fatal(errs)
	}
	midst := min(time.Since(begun)/3, 300*time.Millisecond)
	file := filepath.Join(repo, ".git", "speedtrail", "ledger.db")
	before := readFileOf(t, file)
	folder := filesBelow(t, filepath.Dir(file))
	same := func(t *testing.T) {
		t.Helper()
		if !bytes.Equal(readFileOf(t, file), before) || filesBelow(t, filepath.Dir(file)) != folder {
			t.Errorf("the ledger's folder has changed: %s", filesBelow(t, filepath.Dir(file)))
		}
	}
	for name, signal := range signals {
		t.Run("verify, "+name, func(t *testing.T) {
			result := filepath.Join(t.TempDir(), "result.json")
			c, out, errs := start(t, "verify", "--out", result)
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(midst)
			if err := c.Process.Signal(signal); err != nil {
				t.Fatal("it was done before it could be interrupted: ", err)
			}
			inOrder(t, ended(t, c, 10*time.Second), errs)
			if list, err := filepath.Glob(filepath.Join(filepath.Dir(result), "*.json*")); err != nil || len(list) > 0 || out.Len() > 0 {
				t.Errorf("left: %v, %v, %d bytes", list, err, out.Len())
			}
			same(t)
		})
		t.Run("export to a reader that waits, "+name, func(t *testing.T) {
			r, w, err := os.Pipe()
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			c, _, errs := start(t, "export")
			c.Stdout = w
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			w.Close()
			fills(t, r)
			if err := c.Process.Signal(signal); err != nil {
				t.Fatal("it was done before it could be interrupted: ", err)
			}
			time.Sleep(100 * time.Millisecond)
			var text bytes.Buffer
			go text.ReadFrom(r)
			inOrder(t, ended(t, c, 10*time.Second), errs)
			same(t)
		})
		t.Run("a second signal while it waits, "+name, func(t *testing.T) {
			r, w, err := os.Pipe()
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			c, _, _ := start(t, "export")
			c.Stdout = w
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			w.Close()
			fills(t, r)
			if err := c.Process.Signal(signal); err != nil {
				t.Fatal("it was done before it could be interrupted: ", err)
			}
			time.Sleep(100 * time.Millisecond)
			if err := c.Process.Signal(signal); err != nil {
				t.Fatal("the first signal has ended it, though nobody reads what it writes: ", err)
			}
			status := ended(t, c, 10*time.Second)
			if !status.Signaled() || status.Signal() != signal {
				t.Errorf("exited %v, status %d, signal %v", status.Exited(), status.ExitStatus(), status.Signal())
			}
			same(t)
		})
	}
	t.Run("export to a file", func(t *testing.T) {
		// It is done in a moment: either it was in time, or nothing is there.
		for _, after := range []time.Duration{0, 10, 20, 40, 80} {
			result := filepath.Join(t.TempDir(), "ledger.jsonl")
			c, _, errs := start(t, "-q", "export", "--out", result)
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(after * time.Millisecond)
			c.Process.Signal(os.Interrupt)
			status := ended(t, c, 10*time.Second)
			list, err := filepath.Glob(filepath.Join(filepath.Dir(result), "*jsonl*"))
			hidden, err2 := filepath.Glob(filepath.Join(filepath.Dir(result), ".*jsonl*"))
			if err != nil || err2 != nil || len(hidden) > 0 {
				t.Errorf("left: %v, %v, %v", hidden, err, err2)
			}
			switch {
			case status.Signaled(): // before the program was there to hear it
			case status.ExitStatus() == 0 && len(list) == 1:
				if n := bytes.Count(readFileOf(t, result), []byte("\n")); n != 4 {
					t.Errorf("%d lines for 4 entries", n)
				}
			default:
				inOrder(t, status, errs)
				if len(list) > 0 {
					t.Errorf("left: %v", list)
				}
			}
		}
		same(t)
	})
}

// The demonstration is there whole, or not at all.
func TestInterruptDemo(t *testing.T) {
	if testing.Short() {
		t.Skip("writes the demonstration")
	}
	for _, after := range []time.Duration{30, 60, 100, 150, 250, 400, 0} {
		name := fmt.Sprint(after * time.Millisecond)
		if after == 0 {
			name = "when there is a ledger"
		}
		t.Run(name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "above", "net")
			c, _, errs := process(t, "demo", dir)
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(after * time.Millisecond)
			for begun := time.Now(); after == 0 && time.Since(begun) < 10*time.Second; time.Sleep(time.Millisecond) {
				if _, err := os.Stat(filepath.Join(dir, ".git", "speedtrail", "ledger.db")); err == nil {
					break
				}
			}
			c.Process.Signal(os.Interrupt)
			status := ended(t, c, 10*time.Second)
			if status.Exited() && status.ExitStatus() == 0 {
				t.Log("it was in time")
				return
			}
			if !status.Signaled() { // else before the program was there to hear it
				inOrder(t, status, errs)
			}
			if _, err := os.Lstat(filepath.Dir(dir)); errors.Is(err, fs.ErrNotExist) {
				t.Log("nothing is left")
				return
			}
			left := strings.Split(strings.TrimSpace(filesBelow(t, filepath.Dir(dir))), "\n")
			t.Errorf("an interrupted demo leaves a folder, which a second demo refuses: %d files, the last %s", len(left), left[len(left)-1])
		})
	}
}

// fills waits until a process has begun to write into a pipe and has had time to
// fill it: what it writes is more than the pipe holds, so that it waits there.
func fills(t *testing.T, r *os.File) {
	t.Helper()
	if _, err := r.Read(make([]byte, 1)); err != nil {
		t.Fatal(err)
	}
	time.Sleep(300 * time.Millisecond)
}
