//go:build unix

package assessment_test

import (
	"flag"
	"fmt"
	"path/filepath"
	"testing"
	"time"

	"speedtrail/history/internal/network"
)

// The size of which BenchmarkGrowth takes once, four and sixteen times; small
// unless asked for.
var (
	growRoutes = flag.Int("grow-routes", 20, "routes of the network that growth is measured on")
	growTrains = flag.Int("grow-trains", 10, "its reference trains")
)

// BenchmarkGrowth measures processes that assess a change of every route, for once,
// four and sixteen times the routes and the trains of a network. us/change is the
// time for each row of the ledger's table of speed changes.
//
//	go test ./history/assessment -run '^$' -bench Growth -benchtime 2x -args -grow-routes 125 -grow-trains 25
func BenchmarkGrowth(b *testing.B) {
	for _, what := range []string{"routes", "trains"} {
		for _, times := range []int{1, 4, 16} {
			b.Run(fmt.Sprintf("%s-x%d", what, times), func(b *testing.B) {
				size := network.Full
				size.Routes, size.Trains = *growRoutes, *growTrains
				*map[string]*int{"routes": &size.Routes, "trains": &size.Trains}[what] *= times
				dir := network.Repository(b, size)
				scratch := b.TempDir()
				least, peak, changes := time.Hour, 0, 0
				run := 0
				for b.Loop() {
					run++
					p := assess(b, job{dir, network.All, filepath.Join(scratch, fmt.Sprint(run, ".db")), false})
					least, changes = min(least, p.wall()), p.changes
					_, memory := assessInChild(b, job{dir, network.All, filepath.Join(scratch, fmt.Sprint(run, "-child.db")), false})
					peak = max(peak, memory)
				}
				b.ReportMetric(float64(least), "ns/op")
				b.ReportMetric(float64(changes), "changes")
				b.ReportMetric(float64(least)/1e3/float64(max(changes, 1)), "us/change")
				b.ReportMetric(float64(peak)/1024, "MiB-peak")
			})
		}
	}
}
