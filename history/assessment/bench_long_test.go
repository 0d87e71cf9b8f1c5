//go:build unix

package assessment_test

import (
	"fmt"
	"strings"
	"testing"
)

// BenchmarkLongRoute compares two revisions of one route and makes the document, for
// once, four and sixteen times 500 rows of 200 m that all differ, so that their
// changes touch, or of which every tenth does, so that they lie apart; each row with
// a curve. cpu-us/row, processor time, must not grow with the rows: each change has
// its own place, and is not to be held against all others. (The search for the
// smallest account of rows grows to a bound, with tenths of a second.)
func BenchmarkLongRoute(b *testing.B) {
	for _, every := range []int{1, 10} {
		for _, n := range []int{500, 2000, 8000} {
			b.Run(fmt.Sprintf("every-%d-of-%d", every, n), func(b *testing.B) {
				table := func(row func(i int) string) string {
					var t strings.Builder
					for i := range n {
						fmt.Fprintf(&t, "%d.%d,%d.%d,%s\n", i/5, i%5*2, (i+1)/5, (i+1)%5*2, row(i))
					}
					return t.String()
				}
				speeds := func(more int) string {
					return "from_km,to_km,basic\n" + table(func(i int) string {
						v := 100 + 5*(i%3)
						if i%every == every/2 {
							v += more
						}
						return fmt.Sprint(v)
					})
				}
				trains := ""
				for i := range 5 {
					trains += trainText(fmt.Sprintf("T%d", i), 150, "", "C2", 100+50*i, 300)
				}
				base := over(ground, texts{
					"route.toml":  fmt.Sprintf("id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = %d.%d\n", n/5, n%5*2),
					"trains.toml": trains, "speed.csv": speeds(0), "curves.csv": "from_km,to_km,radius_m,cant_mm\n" + table(func(int) string { return "900,100" }),
				})
				target := over(base, texts{"speed.csv": speeds(10)})
				begun := processorTime()
				for b.Loop() {
					if _, err := assessed(base, target, nil); err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric(float64((processorTime()-begun).Microseconds())/float64(b.N)/float64(n), "cpu-us/row")
			})
		}
	}
}
