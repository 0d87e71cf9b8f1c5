//go:build unix

package assessment_test

import (
	"fmt"
	"path/filepath"
	"testing"
	"time"

	"speedtrail/history/internal/network"
)

// A release that changes 50 routes of 500, each time with and without the trains
// beyond the reference trains and the figures, in turn. Metrics beside those of
// BenchmarkAssess5of500:
//
//	x-plain       processor time of the whole over that of the plain assessment;
//	              below 2 the fleet and the figures cost less than all the rest
//	x-plain-wall  the same by wall time, of the medians
func BenchmarkFleet50of500(b *testing.B) {
	dir := network.Repository(b, network.Full)
	const target = "fifty"
	release(b, dir, target, 50)
	scratch := b.TempDir()
	var wall [2][]time.Duration
	var total [2]phases
	var git []time.Duration
	run := 0
	for b.Loop() {
		run++
		git = append(git, gitDiff(b, dir, target))
		for i, plain := range [...]bool{false, true} {
			p := assess(b, job{dir, target, filepath.Join(scratch, fmt.Sprint(run, "-", i, ".db")), plain})
			wall[i] = append(wall[i], p.wall())
			total[i].add(p)
		}
	}
	b.Log(total[0].String(run))
	cpu := [2]float64{float64(total[0].sum().cpu), float64(total[1].sum().cpu)}
	b.ReportMetric(float64(median(wall[0])), "ns/op")
	b.ReportMetric(cpu[0]/float64(run)/1e6, "cpu-ms")
	b.ReportMetric(cpu[0]/cpu[1], "x-plain")
	b.ReportMetric(float64(median(wall[0]))/float64(median(wall[1])), "x-plain-wall")
	b.ReportMetric(float64(median(wall[0]))/float64(median(git)), "x-git-diff")
}

// release tags a commit that follows network.Base and has n routes, evenly
// spread, as network.All has them.
func release(tb testing.TB, dir, tag string, n int) {
	routes := make([]string, n)
	for i := range routes {
		routes[i] = fmt.Sprintf("routes/r%04d", 1+i*network.Full.Routes/n)
	}
	for _, args := range [][]string{
		{"checkout", "-q", "--detach", network.Base},
		append([]string{"checkout", "-q", network.All, "--"}, routes...),
		{"-c", "user.name=Rowan Teal", "-c", "user.email=r.teal@network.example", "commit", "-q", "-m", tag},
		{"tag", tag},
	} {
		if err := network.Git(tb.Context(), dir, nil, args...); err != nil {
			tb.Fatal(err)
		}
	}
}
