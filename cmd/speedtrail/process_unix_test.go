//go:build unix

package main

import (
	"bytes"
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

// process starts the program as a process of its own: this test binary, which
// TestMain turns into the command by its name.
func process(t *testing.T, args ...string) (c *exec.Cmd, out, errs *bytes.Buffer) {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	// A link by that name: what runs is told from it.
	name := filepath.Join(t.TempDir(), "speedtrail")
	if err := os.Symlink(self, name); err != nil {
		t.Fatal(err)
	}
	out, errs = &bytes.Buffer{}, &bytes.Buffer{}
	c = exec.Command(name, args...)
	c.Stdout, c.Stderr = out, errs
	return c, out, errs
}

// built builds the program without the race detector, which this binary may
// hold: with it everything takes several times as long and as much memory.
func built(t *testing.T) (program string) {
	t.Helper()
	program = filepath.Join(t.TempDir(), "speedtrail")
	if out, err := exec.Command("go", "build", "-race=false", "-o", program, ".").CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	return program
}

// ended waits for a process and gives how it ended and how long that took.
func ended(t *testing.T, c *exec.Cmd, within time.Duration) (status syscall.WaitStatus) {
	t.Helper()
	done := make(chan error, 1)
	go func() { done <- c.Wait() }()
	select {
	case err := <-done:
		var exit *exec.ExitError
		if err != nil && !errors.As(err, &exit) {
			t.Fatal(err)
		}
	case <-time.After(within):
		c.Process.Kill()
		<-done
		t.Fatalf("it did not end within %v", within)
	}
	return c.ProcessState.Sys().(syscall.WaitStatus)
}

// inOrder checks that a process ended as the first signal makes it end, whatever
// it remarked before.
func inOrder(t *testing.T, status syscall.WaitStatus, errs *bytes.Buffer) {
	t.Helper()
	if !status.Exited() || status.ExitStatus() != statusFailed ||
		!strings.HasSuffix("\n"+errs.String(), "\nspeedtrail: interrupted, nothing more was done\n") || strings.Count("\n"+errs.String(), "\nspeedtrail: ") != 1 {
		t.Errorf("exited %v, signal %v, status %d, %q", status.Exited(), status.Signal(), status.ExitStatus(), errs)
	}
}

// gitHistory writes a repository by git fast-import: n commits, each of which
// alters the speeds of one route of several.
func gitHistory(t *testing.T, commits, routes, rows int) (dir string) {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the git program is not installed")
	}
	dir = filepath.Join(t.TempDir(), "repo")
	var b bytes.Buffer
	file := func(name, content string) {
		fmt.Fprintf(&b, "M 100644 inline %s\ndata %d\n%s\n", name, len(content), content)
	}
	table := func(route, version int) string {
		var s strings.Builder
		s.WriteString("from_km,to_km,basic\n")
		for i := range rows {
			fmt.Fprintf(&s, "%d,%d,%d\n", i, i+1, 60+5*((i*7+route+version)%20))
		}
		return s.String()
	}
	for n := range commits {
		message := fmt.Sprintf("Commit %d", n)
		fmt.Fprintf(&b, "commit refs/heads/main\nmark :%d\ncommitter Rowan Teal <r.teal@network.example> %d +0000\ndata %d\n%s\n", n+1, 1767225600+n*3600, len(message), message)
		if n > 0 {
			fmt.Fprintf(&b, "from :%d\n", n)
		} else {
			file("dataset.toml", "format = 1\nname = \"Long\"\n")
			var trains strings.Builder
			for i := range 16 {
				fmt.Fprintf(&trains, "[[train]]\nid = \"T%d\"\nname = \"Train\"\ncant_deficiency_mm = 80\naxle_load = \"D4\"\nlength_m = %d\nmax_speed_kmh = 200\n\n", i, 100+i)
			}
			file("trains.toml", trains.String())
			for r := range routes {
				file(fmt.Sprintf("routes/r%d/route.toml", r), fmt.Sprintf("id = \"R%d\"\nname = \"Route\"\nstart_km = 0\nend_km = %d\n", r, rows))
				file(fmt.Sprintf("routes/r%d/speed.csv", r), table(r, 0))
			}
		}
		if n > 0 {
			file(fmt.Sprintf("routes/r%d/speed.csv", n%routes), table(n%routes, n))
		}
		b.WriteString("\n")
	}
	b.WriteString("done\n")
	for _, args := range [][]string{{"init", "-q", "-b", "main", dir}, {"-C", dir, "fast-import", "--quiet", "--done"}} {
		c := exec.Command("git", args...)
		c.Env = append(os.Environ(), "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_NOSYSTEM=1")
		c.Stdin = &b
		if args[0] == "init" {
			c.Stdin = nil
		}
		if out, err := c.CombinedOutput(); err != nil {
			t.Fatalf("git %v: %v\n%s", args, err, out)
		}
	}
	return dir
}

// filesBelow lists the files below a folder with their sizes.
func filesBelow(t *testing.T, dir string) string {
	t.Helper()
	var b strings.Builder
	err := filepath.WalkDir(dir, func(name string, e fs.DirEntry, err error) error {
		if err != nil || e.IsDir() {
			return err
		}
		info, err := e.Info()
		if err != nil {
			return err
		}
		fmt.Fprintln(&b, name, info.Size())
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return b.String()
}
