package render

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// The lines of a hatch lie in their box, have the slant that was asked for, are
// at least three where the box is seen at all, and are bounded in number.
func TestHatch(t *testing.T) {
	for _, box := range [][4]float64{{52, 62, 892, 190}, {52, 62, 892, 0.5}, {100, 80, 2, 40}, {100, 80, 7.3, 6.2}, {300, 90, 22, 11}, {300.1, 90.7, 0.4, 100}} {
		left, top, width, height := box[0], box[1], box[2], box[3]
		for _, rising := range []bool{true, false} {
			path := hatch(left, top, width, height, rising)
			lines := strings.Split(path, "M")[1:]
			if len(lines) < leastLines && width >= 2 && height >= 2 {
				t.Errorf("%v: only %d lines", box, len(lines))
			}
			if most := (width + height) / 1.5; len(lines) > int(most)+1 {
				t.Errorf("%v: %d lines", box, len(lines))
			}
			for _, line := range lines {
				var x, y, dx, dy float64
				if _, err := fmt.Sscanf(strings.Replace(line, "l", " ", 1), "%g %g %g %g", &x, &y, &dx, &dy); err != nil {
					t.Fatalf("%v: %q: %v", box, line, err)
				}
				const off = 0.101 // by rounding to tenths
				if x < left-off || x+dx > left+width+off || min(y, y+dy) < top-off || max(y, y+dy) > top+height+off {
					t.Errorf("%v: %q leaves the box", box, line)
				}
				if dx <= 0 || math.Abs(dx) != math.Abs(dy) || (dy < 0) != rising {
					t.Errorf("%v, rising %v: %q has another slant", box, rising, line)
				}
			}
		}
	}
}

// A browser takes ten times as long to print a page whose pictures have patterns.
func TestNoPattern(t *testing.T) {
	f := &figure{Direction: "nominal", To: 1e6, RouteLength: 1e6, After: []level{{To: 1e6, Speed: 80}}, Marks: []mark{{From: 2e5, To: 6e5, Before: 60, After: 80}, {From: 7e5, To: 8e5, Before: 100, After: 80}}}
	trace := &Trace{
		Trails:    []TraceTrail{{Line: []TraceReign{{Committed: "2026-01-01T00:00:00Z", Gap: true}, {Committed: "2026-01-02T00:00:00Z"}, {Committed: "2026-01-03T00:00:00Z", Speed: 60}}}},
		Stretches: []TraceStretch{{Bands: []TraceBand{{Gap: true, Pieces: []TraceLevel{{End: 10}}}, {Pieces: []TraceLevel{{End: 5}, {Start: 5, End: 10, Speed: 60}}}}}},
	}
	for _, svg := range []string{f.svg("a"), trace.timeChart(&trace.Trails[0], "a"), trace.distanceChart(&trace.Stretches[0], "a")} {
		if strings.Contains(svg, "pattern") || strings.Contains(svg, "url(") || !strings.Contains(svg, `fill="none"`) {
			t.Errorf("%s", svg)
		}
	}
}
