//go:build unix

package main

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// large writes a repository whose two revisions take seconds to compare.
func large(t *testing.T) string {
	t.Helper()
	files := map[string]string{"dataset.toml": "format = 1\nname = \"Large\"\n"}
	var trains strings.Builder
	for i := range 400 {
		fmt.Fprintf(&trains, "[[train]]\nid = \"T%d\"\nname = \"Train\"\ncant_deficiency_mm = %d\naxle_load = \"D4\"\nlength_m = %d\nmax_speed_kmh = 200\nacceleration_ms2 = 0.3\nbraking_ms2 = 0.5\n\n", i, []int{80, 130, 150, 275}[i%4], 100+i)
	}
	files["trains.toml"] = trains.String()
	second := map[string]string{}
	for r := range 200 {
		folder := fmt.Sprintf("routes/r%d/", r)
		files[folder+"route.toml"] = fmt.Sprintf("id = \"R%d\"\nname = \"Route\"\nstart_km = 0\nend_km = 80\n", r)
		rows := [2]strings.Builder{}
		for k := range rows {
			rows[k].WriteString("from_km,to_km,basic,cd150\n")
			for i := range 80 {
				v := 60 + 5*((i*7+r)%20)
				fmt.Fprintf(&rows[k], "%d,%d,%d,%d\n", i, i+1, v+5*k, v+10)
			}
		}
		files[folder+"speed.csv"] = rows[0].String()
		second[folder+"speed.csv"] = rows[1].String()
	}
	target := map[string]string{}
	for name, content := range files {
		target[name] = content
		if now, ok := second[name]; ok {
			target[name] = now
		}
	}
	dir := filepath.Join(t.TempDir(), "large")
	who := compose.Person{Name: "Bo Tarn", Email: "bo@tarn.example"}
	when := time.Date(2026, 3, 2, 10, 0, 0, 0, time.UTC)
	err := compose.Write(t.Context(), dir, []compose.Commit{
		{Files: files, Author: who, When: when, Message: "Base\n"},
		{Parents: []int{0}, Files: target, Author: who, When: when.Add(time.Hour), Message: "Target\n"},
	})
	if err != nil {
		t.Fatal(err)
	}
	return dir
}

// Ctrl-C ends a long command in good order: nothing is recorded, no file is left
// half-written. A second one, and SIGKILL-like ends, need no good order.
func TestInterrupt(t *testing.T) {
	if testing.Short() {
		t.Skip("builds the program and compares a large network")
	}
	program := filepath.Join(t.TempDir(), "speedtrail")
	if out, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	repo := large(t)
	for _, test := range []struct {
		name    string
		signals []os.Signal
	}{
		{"Ctrl-C", []os.Signal{os.Interrupt}},
		{"SIGTERM", []os.Signal{syscall.SIGTERM}},
		{"a second Ctrl-C", []os.Signal{os.Interrupt, os.Interrupt}},
	} {
		t.Run(test.name, func(t *testing.T) {
			report := filepath.Join(t.TempDir(), "report.html")
			c := exec.Command(program, "--repo", repo, "assess", "HEAD~1", "HEAD", "--out", report)
			var remarks bytes.Buffer
			c.Stderr = &remarks
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(400 * time.Millisecond)
			for _, s := range test.signals {
				if err := c.Process.Signal(s); err != nil {
					t.Skipf("the command was done before it could be interrupted: %v", err)
				}
				time.Sleep(20 * time.Millisecond)
			}
			sent := time.Now()
			err := c.Wait()
			if waited := time.Since(sent); waited > 20*time.Second {
				t.Errorf("it took %v to end", waited)
			}
			var exit *exec.ExitError
			if !errors.As(err, &exit) {
				t.Fatalf("it ended with %v", err)
			}
			status := exit.Sys().(syscall.WaitStatus)
			if len(test.signals) == 1 && (exit.ExitCode() != statusFailed || !strings.Contains(remarks.String(), "interrupted, nothing more was done")) {
				t.Errorf("status %v, %q", exit, &remarks)
			}
			if len(test.signals) == 2 && !status.Signaled() && exit.ExitCode() != statusFailed {
				t.Errorf("status %v", exit)
			}
			left, err := filepath.Glob(filepath.Join(filepath.Dir(report), "*"))
			if err != nil || len(left) > 0 {
				t.Errorf("files are left: %v %v", left, err)
			}
			if _, err := os.Stat(filepath.Join(repo, ".git", "speedtrail", "ledger.db")); err == nil {
				t.Error("the interrupted assessment has made a ledger")
			}
		})
	}
}
