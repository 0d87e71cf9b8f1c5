package assessment_test

import (
	"fmt"
	"strings"
	"testing"
)

// windows writes axle-load.csv with n windows of 10 m, which only trains longer than
// least(i) and not longer than most(i), in metres, see change: the row that goes is
// behind the shorter ones' rear, and a lower one hides it from longer ones.
func windows(n int, goes bool, least, most func(i int) int) string {
	var b strings.Builder
	b.WriteString("from_km,to_km,C2,train_length_delay,direction\n")
	row := func(from, to, speed int, delay string) {
		fmt.Fprintf(&b, "%d.%03d,%d.%03d,%d,%s,nominal\n", from/1000, from%1000, to/1000, to%1000, speed, delay)
	}
	last := 0
	for i := range n {
		at := 1800 * (i + 1)
		row(last, at, 60, "no")
		if !goes {
			row(at-least(i)-10, at-least(i), 80, "yes")
		}
		row(at-most(i)-10, at-most(i), 60, "yes")
		last = at + 10
	}
	row(last, 20_000, 60, "no")
	return b.String()
}

// A length that shows one change shows each other one that trains of it see, and what
// takes more lengths than are looked at is said to be left out.
func TestLengthsBetween(t *testing.T) {
	trains := trainText("S", 80, "", "C2", 50, 200) + trainText("L", 80, "", "C2", 400, 200)
	for _, x := range []struct {
		name        string
		n           int
		least, most func(i int) int
		want        string // windows that are listed, lengths left out
		finding     string
	}{
		{"one length shows all", 9, func(int) int { return 60 }, func(i int) int { return 200 + 3*i }, "9 at 200 m, left out []", ""},
		{"in another order", 9, func(int) int { return 60 }, func(i int) int { return 230 - 3*i }, "9 at 206 m, left out []", ""},
		{"eight lengths", 8, func(i int) int { return 60 + 20*i }, func(i int) int { return 75 + 20*i }, "8 at 75 m, 95 m, 115 m, 135 m, 155 m, 175 m, 195 m, 215 m, left out []", ""},
		{"nine lengths", 9, func(i int) int { return 60 + 20*i }, func(i int) int { return 75 + 20*i }, "8 at 75 m, 95 m, 115 m, 135 m, 155 m, 175 m, 195 m, 215 m, left out [235000]",
			"not-represented nominal 16.200-16.210 changes that only trains of 235 m see are not listed, and no reference train was held against them"},
		{"what most are seen at is kept", 10, func(i int) int { return 60 + 20*min(i, 8) }, func(i int) int { return 75 + 20*min(i, 8) }, "9 at 75 m, 95 m, 115 m, 135 m, 155 m, 175 m, 195 m, 235 m, left out [215000]",
			"not-represented nominal 14.400-14.410 changes that only trains of 215 m see are not listed, and no reference train was held against them"},
	} {
		t.Run(x.name, func(t *testing.T) {
			base := texts{"trains.toml": trains, "axle-load.csv": windows(x.n, false, x.least, x.most)}
			c := compute(t, over(oneWay, base), texts{"axle-load.csv": windows(x.n, true, x.least, x.most)}, nil)
			var lengths []string
			f := &c.Fleet[0]
			for _, k := range f.Changes {
				for _, l := range k.Lengths {
					if text := fmt.Sprint(l/1000) + " m"; len(lengths) == 0 || lengths[len(lengths)-1] != text {
						lengths = append(lengths, text)
					}
				}
			}
			if got := fmt.Sprintf("%d at %s, left out %v", len(f.Changes), strings.Join(lengths, ", "), f.LeftOut); got != x.want {
				t.Errorf("got  %s\nwant %s", got, x.want)
			}
			finding := ""
			for _, f := range unrepresented(c) {
				if strings.Contains(f.Text, " are not listed") {
					finding += place(f) + " " + f.Text
				}
			}
			if finding != x.finding {
				t.Errorf("got  %s\nwant %s", finding, x.finding)
			}
			if f.LeftOut == nil {
				t.Error("no list of lengths")
			}
		})
	}
}
