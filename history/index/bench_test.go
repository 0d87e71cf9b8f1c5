package index_test

import (
	"context"
	"flag"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history/internal/network"
)

// The size of the history; small unless asked for. The figures of DEVELOPERS.md
// are those of
//
//	go test ./history/index -run '^$' -bench Trace -benchtime 5x -args -past-routes 500 -past-commits 5000
var (
	pastRoutes  = flag.Int("past-routes", 40, "routes of the history that traces are measured on")
	pastCommits = flag.Int("past-commits", 300, "its commits")
	pastTrains  = flag.Int("past-trains", 10, "its reference trains")
)

// cost is what a process took.
type cost struct {
	wall, cpu time.Duration
	peak      int64 // KiB
}

func (c cost) plus(d cost) cost { return cost{c.wall + d.wall, c.cpu + d.cpu, max(c.peak, d.peak)} }

// costOf runs a process.
func costOf(b *testing.B, c *exec.Cmd) cost {
	b.Helper()
	var stderr strings.Builder
	c.Stderr = &stderr
	begun := time.Now()
	if err := c.Run(); err != nil {
		b.Fatalf("%v: %v: %s", c.Args, err, stderr.String())
	}
	return cost{time.Since(begun), c.ProcessState.UserTime() + c.ProcessState.SystemTime(), peakOf(c.ProcessState)}
}

// BenchmarkTrace measures whole processes, each in turn with the git program on
// the same repository:
//
//	build      a trace that makes the index first, over G: `git log --raw
//	           --first-parent` and `git cat-file --batch` of the blobs it names
//	add        a trace that adds ten commits, over build
//	query      a trace of a point from the index, over `git log -L` of a row
//	no-index   the same without an index, over `git log -L`
//
// x- is the ratio of the least wall times, which other work on the machine
// disturbs least, cpu-x- that of the least processor times.
func BenchmarkTrace(b *testing.B) {
	size := network.Decade
	size.Routes, size.Commits, size.Trains = *pastRoutes, *pastCommits, *pastTrains
	dir := network.RepositoryWithPast(b, size)
	program := buildProgram(b)
	index := filepath.Join(dir, ".git", "speedtrail", "index.db")
	trace := func(args ...string) cost {
		return costOf(b, exec.Command(program, append([]string{"--repo", dir, "trace", "--route", "R0012", "--at", "12.4", "--train", "T003", "--direction", "nominal"}, args...)...))
	}
	blobs := blobsOf(b, dir)
	logL := func() cost {
		return costOf(b, network.Command(context.Background(), dir, "log", "-L", "12,12:routes/r0012/speed.csv"))
	}
	var build []cost
	b.Run("build", func(b *testing.B) {
		var g []cost
		for b.Loop() {
			os.Remove(index)
			build = append(build, trace())
			g = append(g, costOfG(b, dir, blobs))
		}
		reportCosts(b, "G", build, g)
	})
	b.Run("add", func(b *testing.B) {
		os.Remove(index)
		trace("HEAD~10")
		old, err := os.ReadFile(index)
		if err != nil {
			b.Fatal(err)
		}
		var add, plain []cost
		for b.Loop() {
			if err := os.WriteFile(index, old, 0o644); err != nil {
				b.Fatal(err)
			}
			add = append(add, trace())
			plain = append(plain, trace())
		}
		reportCosts(b, "build", add, build)
		reportCosts(b, "query", add, plain)
	})
	b.Run("query", func(b *testing.B) {
		var ours, theirs []cost
		for b.Loop() {
			ours, theirs = append(ours, trace()), append(theirs, logL())
		}
		reportCosts(b, "log-L", ours, theirs)
	})
	b.Run("no-index", func(b *testing.B) {
		var ours, theirs []cost
		for b.Loop() {
			ours, theirs = append(ours, trace("--no-index")), append(theirs, logL())
		}
		reportCosts(b, "log-L", ours, theirs)
	})
}

// reportCosts reports what ours took, and over theirs.
func reportCosts(b *testing.B, name string, ours, theirs []cost) {
	least := func(list []cost, f func(cost) time.Duration) float64 {
		var values []time.Duration
		for _, c := range list {
			values = append(values, f(c))
		}
		return float64(max(slices.Min(values), time.Microsecond))
	}
	peak := func(list []cost) float64 {
		return float64(slices.MaxFunc(list, func(a, b cost) int { return int(a.peak - b.peak) }).peak) / 1024
	}
	wall, cpu := func(c cost) time.Duration { return c.wall }, func(c cost) time.Duration { return c.cpu }
	b.ReportMetric(least(ours, wall), "ns/op")
	b.ReportMetric(least(ours, cpu)/1e6, "cpu-ms")
	b.ReportMetric(least(theirs, wall)/1e6, "ms-"+name)
	b.ReportMetric(least(ours, wall)/least(theirs, wall), "x-"+name)
	b.ReportMetric(least(ours, cpu)/least(theirs, cpu), "cpu-x-"+name)
	b.ReportMetric(peak(ours), "MiB-peak")
	b.ReportMetric(peak(theirs), "MiB-peak-"+name)
}

// blobsOf lists the blobs that the history brings, one a line.
func blobsOf(b *testing.B, dir string) string {
	out, err := network.Command(context.Background(), dir, "log", "--raw", "--first-parent", "--no-abbrev", "--format=%H").Output()
	if err != nil {
		b.Fatal(err)
	}
	seen := map[string]bool{}
	var list strings.Builder
	for line := range strings.Lines(string(out)) {
		fields := strings.Fields(line)
		if len(fields) > 4 && strings.HasPrefix(line, ":") && !seen[fields[3]] && strings.Trim(fields[3], "0") != "" {
			seen[fields[3]] = true
			list.WriteString(fields[3] + "\n")
		}
	}
	return list.String()
}
