//go:build unix

package assessment_test

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"speedtrail/diff"
	"speedtrail/history/assessment"
	"speedtrail/history/internal/network"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema"
)

// The yardstick of an assessment is `git diff` of the same two revisions, run in
// turn with it. Metrics:
//
//	ns/op             median wall time of an assessment in this process
//	x-git-diff        the same over the median of `git diff` as a child process
//	x-git-diff-least  the least of one over the least of the other: what other
//	                  work on the machine disturbs least
//	x-git-diff-child  an assessment in a fresh child process over `git diff`
//	cpu-ms            processor time of an assessment, user and system
//	cores             processor time over wall time; 2 where two are always busy
//	MiB-peak          largest resident memory of the child process
//	changes           rows of the ledger's table of speed changes
//
// Other work on the machine makes cores too low and the ratios too high.

func BenchmarkAssess5of500(b *testing.B)   { benchmarkAssess(b, network.Five, false) }
func BenchmarkAssess500of500(b *testing.B) { benchmarkAssess(b, network.All, false) }

// The same without trains beyond the reference trains and without figures, as a
// measure of what those two cost.
func BenchmarkPlain5of500(b *testing.B)   { benchmarkAssess(b, network.Five, true) }
func BenchmarkPlain500of500(b *testing.B) { benchmarkAssess(b, network.All, true) }

func benchmarkAssess(b *testing.B, target string, plain bool) {
	dir := network.Repository(b, network.Full)
	scratch := b.TempDir()
	var ours, child, git []time.Duration
	var total phases
	var peak, changes int
	run := 0
	for b.Loop() {
		run++
		git = append(git, gitDiff(b, dir, target))
		p := assess(b, job{dir, target, filepath.Join(scratch, fmt.Sprint(run, ".db")), plain})
		ours = append(ours, p.wall())
		total.add(p)
		changes = p.changes
		wall, memory := assessInChild(b, job{dir, target, filepath.Join(scratch, fmt.Sprint(run, "-child.db")), plain})
		child = append(child, wall)
		peak = max(peak, memory)
	}
	b.Log(total.String(run))
	b.ReportMetric(float64(median(ours)), "ns/op")
	b.ReportMetric(float64(median(git))/1e6, "ms-git-diff")
	b.ReportMetric(float64(median(ours))/float64(median(git)), "x-git-diff")
	b.ReportMetric(float64(slices.Min(ours))/float64(slices.Min(git)), "x-git-diff-least")
	b.ReportMetric(float64(median(child))/float64(median(git)), "x-git-diff-child")
	b.ReportMetric(total.cores(), "cores")
	b.ReportMetric(float64(total.sum().cpu)/float64(run)/1e6, "cpu-ms")
	b.ReportMetric(float64(changes), "changes")
	if peak > 0 {
		b.ReportMetric(float64(peak)/1024, "MiB-peak")
	}
}

// What routes cost that no revision differs in: 5 routes of 500 in turn with 5
// of 1000.
func BenchmarkUnchanged(b *testing.B) {
	sizes := [2]network.Size{network.Full, network.Full}
	sizes[1].Routes *= 2
	dirs := [2]string{network.Repository(b, sizes[0]), network.Repository(b, sizes[1])}
	scratch := b.TempDir()
	var ours, git [2][]time.Duration
	run := 0
	for b.Loop() {
		run++
		for i, dir := range dirs {
			git[i] = append(git[i], gitDiff(b, dir, network.Five))
			p := assess(b, job{dir, network.Five, filepath.Join(scratch, fmt.Sprint(run, "-", i, ".db")), false})
			ours[i] = append(ours[i], p.wall())
		}
	}
	added := float64(sizes[1].Routes - sizes[0].Routes)
	b.ReportMetric(float64(median(ours[1])), "ns/op")
	b.ReportMetric(float64(median(ours[1]))/float64(median(ours[0])), "x-half-the-routes")
	b.ReportMetric(float64(slices.Min(ours[1])-slices.Min(ours[0]))/added, "ns/equal-route")
	b.ReportMetric(float64(slices.Min(git[1])-slices.Min(git[0]))/added, "git-ns/equal-route")
}

// job is one assessment of a revision against network.Base, recorded in a new
// ledger.
type job struct {
	dir, target, ledger string
	plain               bool // without fleet and figures
}

// assess does what the command assess does up to its output, in its order, and
// opens the repository twice as it does.
func assess(tb testing.TB, j job) phases {
	must := func(err error) {
		if err != nil {
			tb.Helper()
			tb.Fatal(err)
		}
	}
	ctx := context.Background()
	p := start()
	repo, err := revision.Open(j.dir)
	must(err)
	defer repo.Close()
	var sides [2]revision.Commit
	var names [2]string
	for i, rev := range [2]string{network.Base, j.target} {
		sides[i], err = repo.Resolve(rev)
		must(err)
		names[i] = repo.Describe(sides[i])
	}
	p.end("open")
	from, err := repo.Snapshot(sides[0].Hash, ".")
	must(err)
	to, err := repo.Snapshot(sides[1].Hash, ".")
	must(err)
	before, after, err := schema.LoadPair(ctx, from, to)
	must(err)
	p.end("load")
	account, err := diff.Compare(ctx, before, after, diff.Options{NoFleet: j.plain, NoFigures: j.plain})
	must(err)
	for _, r := range account.Routes {
		p.changes += len(r.Changes)
	}
	p.end("compare")
	in := assessment.Input{
		Base: before, Target: after, Account: account, Folder: ".",
		BaseRev: revisionOf(sides[0]), TargetRev: revisionOf(sides[1]),
		Named:     assessment.Named{Base: network.Base, BaseName: names[0], Target: j.target, TargetName: names[1]},
		Preparers: []assessment.Person{}, Options: assessment.Options{Requests: []string{}},
		At: sides[1].Committer.When,
	}
	in.BaseIsAncestor, err = repo.IsAncestor(ctx, sides[0].Hash, sides[1].Hash)
	must(err)
	commits, _, err := repo.Between(ctx, sides[0].Hash, sides[1].Hash)
	must(err)
	for _, person := range repo.Preparers(commits) {
		in.Preparers = append(in.Preparers, assessment.Person{Name: person.Name, Email: person.Email})
	}
	doc := assessment.Build(in)
	p.end("build")
	again, err := revision.Open(j.dir)
	must(err)
	_, err = again.Tracked(j.ledger)
	must(err)
	must(again.Close())
	l, err := ledger.Open(ctx, j.ledger, ledger.Options{Create: true, Now: time.Now})
	must(err)
	p.end("ledger")
	body, digest, err := doc.Encode()
	must(err)
	p.end("encode")
	recorded, err := l.RecordAssessment(ctx, time.Now(), assessment.LedgerRecord(doc, body, digest))
	must(err)
	must(l.Close())
	p.end("record")
	if !recorded.Added {
		tb.Fatal("nothing was recorded")
	}
	return p
}

func revisionOf(c revision.Commit) assessment.Revision {
	return assessment.Revision{
		Commit: c.Hash, Committed: c.Committer.When.UTC().Format(time.RFC3339), Subject: c.Subject,
		Author: assessment.Person{Name: c.Author.Name, Email: c.Author.Email},
	}
}

// gitDiff times the yardstick.
func gitDiff(tb testing.TB, dir, target string) time.Duration {
	c := network.Command(tb.Context(), dir, "diff", network.Base, target)
	begun := time.Now()
	if err := c.Run(); err != nil {
		tb.Fatal(err)
	}
	return time.Since(begun)
}

const childEnv = "SPEEDTRAIL_BENCHMARK_CHILD"

// A process with childEnv does one assessment, writes its peak memory in KiB,
// and ends. That takes no TestMain, which a package has one of only.
func init() {
	args := strings.Split(os.Getenv(childEnv), "\n")
	if len(args) != 4 {
		return
	}
	assess(exiting{}, job{args[0], args[1], args[2], args[3] == "true"})
	fmt.Println(peakKiB())
	os.Exit(0)
}

// exiting is a testing.TB for outside a test.
type exiting struct{ testing.TB }

func (exiting) Helper() {}
func (exiting) Fatal(args ...any) {
	fmt.Fprintln(os.Stderr, args...)
	os.Exit(1)
}

// assessInChild does an assessment in a process of its own: its wall time, with
// the start of the process, and its peak memory in KiB.
func assessInChild(tb testing.TB, j job) (time.Duration, int) {
	program, err := os.Executable()
	if err != nil {
		tb.Fatal(err)
	}
	c := exec.CommandContext(tb.Context(), program)
	c.Env = append(os.Environ(), childEnv+"="+strings.Join([]string{j.dir, j.target, j.ledger, strconv.FormatBool(j.plain)}, "\n"))
	c.Stderr = os.Stderr
	begun := time.Now()
	out, err := c.Output()
	wall := time.Since(begun)
	if err != nil {
		tb.Fatal(err)
	}
	memory, err := strconv.Atoi(strings.TrimSpace(string(out)))
	if err != nil {
		tb.Fatal(err)
	}
	return wall, memory
}

// peakKiB is the largest resident memory of this process since it began, 0 where
// the system does not tell. The figure of getrusage would not do: on Linux it
// begins with the size of the parent.
func peakKiB() int {
	text, err := os.ReadFile("/proc/self/status")
	if err != nil {
		return 0
	}
	_, rest, _ := strings.Cut(string(text), "VmHWM:")
	fields := strings.Fields(rest)
	if len(fields) == 0 {
		return 0
	}
	n, _ := strconv.Atoi(fields[0])
	return n
}

// phases are the steps of an assessment with their times.
type phases struct {
	steps   []phase
	changes int
	at      time.Time
	cpu     time.Duration
}

type phase struct {
	name      string
	wall, cpu time.Duration
}

func start() phases { return phases{at: time.Now(), cpu: processorTime()} }

func (p *phases) end(name string) {
	now, cpu := time.Now(), processorTime()
	p.steps = append(p.steps, phase{name, now.Sub(p.at), cpu - p.cpu})
	p.at, p.cpu = now, cpu
}

func (p *phases) add(q phases) {
	if p.steps == nil {
		p.steps = slices.Clone(q.steps)
		return
	}
	for i, s := range q.steps {
		p.steps[i].wall += s.wall
		p.steps[i].cpu += s.cpu
	}
}

func (p *phases) sum() (s phase) {
	for _, x := range p.steps {
		s.wall += x.wall
		s.cpu += x.cpu
	}
	return s
}

func (p *phases) wall() time.Duration { return p.sum().wall }
func (p *phases) cores() float64      { return float64(p.sum().cpu) / float64(p.sum().wall) }

// String lists the mean of each step over some runs.
func (p *phases) String(runs int) string {
	var b strings.Builder
	for _, s := range p.steps {
		fmt.Fprintf(&b, "%s %.2f ms (%.1f cores)  ", s.name, float64(s.wall)/float64(runs)/1e6, float64(s.cpu)/float64(s.wall))
	}
	return strings.TrimSpace(b.String())
}

// processorTime is what this process has used on all processors, user and system.
func processorTime() time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

func median(list []time.Duration) time.Duration {
	sorted := slices.Sorted(slices.Values(list))
	return sorted[len(sorted)/2]
}
