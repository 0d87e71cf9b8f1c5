package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"
)

// peak runs the command with a limit for Go's memory and gives its status, what
// it wrote and its largest resident memory in MiB (VmHWM, proc_pid_status(5)), 0 where it was
// over before it could be looked at.
func peak(t *testing.T, program, limit string, args ...string) (status int, out, errs string, most int64) {
	t.Helper()
	c := exec.Command(program, args...)
	var o, e bytes.Buffer
	c.Stdout, c.Stderr = &o, &e
	c.Env = append(os.Environ(), "GOMEMLIMIT="+limit)
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	name := fmt.Sprintf("/proc/%d/status", c.Process.Pid)
	stop, stopped := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(stopped)
		for {
			// The high-water mark only grows: the last look is the one that counts.
			if text, err := os.ReadFile(name); err == nil {
				if _, rest, ok := strings.Cut(string(text), "VmHWM:"); ok {
					fields := strings.Fields(rest)
					if kib, err := strconv.ParseInt(fields[0], 10, 64); err == nil {
						most = max(most, kib)
					}
				}
			}
			select {
			case <-stop:
				return
			case <-time.After(2 * time.Millisecond):
			}
		}
	}()
	begun := time.Now()
	err := c.Wait()
	close(stop)
	<-stopped
	if _, ok := err.(*exec.ExitError); err != nil && !ok {
		t.Fatal(err)
	}
	if most == 0 {
		t.Log("gone before the first look, too soon to have read anything large")
	}
	t.Logf("%q: status %d, %d MiB, %v", args[2:], c.ProcessState.ExitCode(), most>>10, time.Since(begun).Round(time.Millisecond))
	return c.ProcessState.ExitCode(), o.String(), e.String(), most >> 10
}

// sparse makes a file of a size that takes no room on the disk.
func sparse(t *testing.T, name string, size int64) {
	t.Helper()
	f, err := os.Create(name)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.Truncate(size); err != nil {
		t.Skip("no sparse files here: ", err)
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}
}

// What is too large is refused by its size, without being read; what is no part
// of the data set is not held in memory; and what is as large as is allowed
// takes a known amount.
func TestMemory(t *testing.T) {
	if testing.Short() {
		t.Skip("reads large files")
	}
	gitIn(t, t.TempDir(), "--version")
	program := built(t)
	keys := t.TempDir()
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	fresh := func(t *testing.T) string {
		return composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	}
	const table = "routes/r1/speed.csv"
	check := func(t *testing.T, limit string, most int64, status int, want string, args ...string) {
		t.Helper()
		got, out, errs, used := peak(t, program, limit, args...)
		for again := 0; used == 0 && again < 20; again++ {
			got, out, errs, used = peak(t, program, limit, args...) // over before it was looked at
		}
		if used == 0 {
			t.Fatalf("%q: the memory of the process was not seen", args[2:])
		}
		if got != status || !strings.Contains(out+errs, want) {
			t.Errorf("%q: status %d, want %d and %q\n%.1000s%.1000s", args[2:], got, status, want, errs, out)
		}
		if used > most {
			t.Errorf("%q: %d MiB, at most %d are expected", args[2:], used, most)
		}
	}
	t.Run("a table of 1 GB in the working tree", func(t *testing.T) {
		dir := fresh(t)
		sparse(t, filepath.Join(dir, table), 1<<30)
		check(t, "100MiB", 150, statusInput, table+": 1073741824 bytes, at most 16777216 are allowed", "--repo", dir, "validate")
		check(t, "100MiB", 150, statusInput, table+": 1073741824 bytes, at most 16777216 are allowed", "--repo", dir, "assess", "HEAD")
	})
	t.Run("a TOML file of 1 GB", func(t *testing.T) {
		dir := fresh(t)
		sparse(t, filepath.Join(dir, "trains.toml"), 1<<30)
		check(t, "100MiB", 150, statusInput, "trains.toml: 1073741824 bytes, at most 1048576 are allowed", "--repo", dir, "validate")
	})
	t.Run("a file of 1 GB beside the tables", func(t *testing.T) {
		dir := fresh(t)
		sparse(t, filepath.Join(dir, "routes", "r1", "survey.bin"), 1<<30)
		check(t, "100MiB", 150, statusDone, "no fault", "--repo", dir, "validate")
		check(t, "100MiB", 150, statusDone, "", "--repo", dir, "assess", "HEAD", "--format", "json")
	})
	t.Run("an object of 200 MB in Git", func(t *testing.T) {
		dir := fresh(t)
		for _, packed := range []bool{false, true} {
			sparse(t, filepath.Join(dir, "routes", "r1", "survey.bin"), 200_000_000)
			gitIn(t, dir, "add", ".")
			gitIn(t, dir, "commit", "-q", "--allow-empty", "-m", "beside the tables")
			gitIn(t, dir, "tag", "-f", "beside")
			sparse(t, filepath.Join(dir, table), 200_000_000)
			gitIn(t, dir, "commit", "-q", "-a", "-m", "in the place of a table")
			gitIn(t, dir, "tag", "-f", "instead")
			gitIn(t, dir, "checkout", "-q", "beside")
			if packed {
				gitIn(t, dir, "repack", "-adq")
			}
			check(t, "100MiB", 150, statusDone, "no fault", "--repo", dir, "validate", "beside")
			check(t, "100MiB", 150, statusFinding, "", "--repo", dir, "assess", "c0", "beside", "--no-record")
			check(t, "100MiB", 150, statusInput, table+": 200000000 bytes, at most 16777216 are allowed", "--repo", dir, "validate", "instead")
			check(t, "100MiB", 150, statusInput, table+": 200000000 bytes, at most 16777216 are allowed", "--repo", dir, "assess", "c0", "instead")
			check(t, "100MiB", 150, statusDone, "", "--repo", dir, "trace", "beside", "--route", "R1", "--at", "1.5", "--no-index")
		}
	})
	t.Run("a row of 100,000 columns", func(t *testing.T) {
		dir := fresh(t)
		wide := strings.Repeat(",x", 100_000)
		for content, want := range map[string]string{
			"from_km,to_km,basic\n0,5,100" + wide + "\n":                                  "2:1: 100003 cells in a row, at most 64 are allowed",
			"from_km,to_km,basic" + wide + "\n0,5,100\n":                                  "1:1: 100003 columns, at most 64 are allowed",
			"from_km,to_km,basic\n0,5,\"100" + strings.Repeat(`,""`, 100_000) + "\n":      "2:5: a quoted cell does not end",
			"from_km,to_km,basic\n0,5,100" + strings.Repeat(",", 100_000) + "\n0,5,100\n": "2:1: 100003 cells in a row, at most 64 are allowed",
		} {
			if err := os.WriteFile(filepath.Join(dir, table), []byte(content), 0o644); err != nil {
				t.Fatal(err)
			}
			check(t, "100MiB", 150, statusInput, table+":"+want, "--repo", dir, "validate")
		}
	})
	t.Run("a table of as many rows as are allowed", func(t *testing.T) {
		dir := fresh(t)
		var b bytes.Buffer
		rows := func(n int) {
			b.Reset()
			b.WriteString("from_km,to_km,basic\n")
			for i := range n {
				fmt.Fprintf(&b, "%d.%03d,%d.%03d,%d\n", i/1000, i%1000, (i+1)/1000, (i+1)%1000, 60+5*(i%2))
			}
		}
		rows(200_000)
		write := func(name string, content []byte) {
			if err := os.WriteFile(filepath.Join(dir, name), content, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		write(table, b.Bytes())
		write("routes/r1/route.toml", []byte("id = \"R1\"\nname = \"Route\"\nstart_km = 0\nend_km = 200\n"))
		gitIn(t, dir, "commit", "-q", "-a", "-m", "as many rows as are allowed")
		check(t, "300MiB", 400, statusDone, "no fault", "--repo", dir, "validate", "HEAD")
		b.WriteString("200,200.001,60\n")
		write(table, b.Bytes())
		check(t, "300MiB", 400, statusInput, table+":200002: more than 200000 rows", "--repo", dir, "validate")
		// Assessed is one of a quarter of that: time grows faster than rows.
		rows(50_000)
		write(table, b.Bytes())
		write("routes/r1/route.toml", []byte("id = \"R1\"\nname = \"Route\"\nstart_km = 0\nend_km = 50\n"))
		gitIn(t, dir, "commit", "-q", "-a", "-m", "a quarter")
		write(table, bytes.Replace(b.Bytes(), []byte("5.100,5.101,60"), []byte("5.100,5.101,55"), 1))
		check(t, "200MiB", 300, statusFinding, "55", "--repo", dir, "assess", "HEAD")
	})
	t.Run("an export of a line without an end", func(t *testing.T) {
		dir := fresh(t)
		file := filepath.Join(t.TempDir(), "ledger.jsonl")
		sparse(t, file, 1<<30)
		check(t, "1200MiB", 1700, statusInput, "ledger.jsonl:1:", "--repo", dir, "import", file)
	})
}
