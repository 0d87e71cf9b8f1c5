package history_test

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/internal/network"
)

// How many assessments the ledger holds that is verified; few unless asked for.
// The figures of DEVELOPERS.md are those of
//
//	go test ./history -run '^$' -bench Verify -benchtime 3x -args -assessments 1000
var assessments = flag.Int("assessments", 30, "assessments of the ledger that verify is measured on")

// BenchmarkVerify measures whole processes on a ledger of many assessments:
//
//	ledger     verify --ledger-only: the file, the chain, every body and every row
//	recompute  verify: the same, and each assessment computed anew from Git
//
// MB/s is the size of the ledger's file by the time. x-read is the time over that
// of reading the file once, x-check over that of the sqlite3 program's own check of
// it, cores the processor time by the time.
func BenchmarkVerify(b *testing.B) {
	size := network.Decade
	size.Routes, size.Commits, size.Trains, size.Branch = 40, *assessments, 20, 0
	dir := network.RepositoryWithPast(b, size)
	program := filepath.Join(b.TempDir(), "speedtrail")
	if out, err := exec.Command("go", "build", "-o", program, "speedtrail/cmd/speedtrail").CombinedOutput(); err != nil {
		b.Fatalf("%v: %s", err, out)
	}
	out, err := network.Command(context.Background(), dir, "rev-list", "--reverse", "HEAD").Output()
	if err != nil {
		b.Fatal(err)
	}
	commits := strings.Fields(string(out))
	for i := range *assessments {
		out, err := exec.Command(program, "--repo", dir, "assess", commits[i], commits[i+1]).CombinedOutput()
		if err != nil && !errors.As(err, new(*exec.ExitError)) {
			b.Fatalf("%v: %s", err, out)
		}
	}
	file := filepath.Join(dir, ".git", "speedtrail", "ledger.db")
	info, err := os.Stat(file)
	if err != nil {
		b.Fatal(err)
	}
	for name, args := range map[string][]string{"ledger": {"--repo", dir, "verify", "--ledger-only"}, "recompute": {"--repo", dir, "verify"}} {
		b.Run(fmt.Sprintf("%s-%d", name, *assessments), func(b *testing.B) {
			least, cpu, read, check, dump := time.Hour, time.Hour, time.Hour, time.Hour, time.Hour
			for b.Loop() {
				c := exec.Command(program, args...)
				begun := time.Now()
				if out, err := c.CombinedOutput(); err != nil {
					b.Fatalf("%v: %s", err, out)
				}
				least, cpu = min(least, time.Since(begun)), min(cpu, c.ProcessState.UserTime()+c.ProcessState.SystemTime())
				begun = time.Now()
				if _, err := os.ReadFile(file); err != nil {
					b.Fatal(err)
				}
				read = min(read, time.Since(begun))
				if _, err := exec.LookPath("sqlite3"); err == nil {
					begun = time.Now()
					if out, err := exec.Command("sqlite3", "-readonly", file, "PRAGMA integrity_check").CombinedOutput(); err != nil {
						b.Fatalf("%v: %s", err, out)
					}
					check = min(check, time.Since(begun))
					begun = time.Now()
					if err := exec.Command("sqlite3", "-readonly", file, ".dump").Run(); err != nil {
						b.Fatal(err)
					}
					dump = min(dump, time.Since(begun))
				}
			}
			b.ReportMetric(float64(least), "ns/op")
			b.ReportMetric(float64(info.Size())/1e6/least.Seconds(), "MB/s")
			b.ReportMetric(float64(info.Size())/1e6, "MB-file")
			b.ReportMetric(least.Seconds()/read.Seconds(), "x-read")
			b.ReportMetric(least.Seconds()/check.Seconds(), "x-check")
			b.ReportMetric(least.Seconds()/dump.Seconds(), "x-dump")
			b.ReportMetric(cpu.Seconds()/least.Seconds(), "cores")
		})
	}
}
