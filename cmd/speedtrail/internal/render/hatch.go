package render

import (
	"fmt"
	"math"
	"strings"
)

const (
	hatchStep  = 6.0 // between two lines, along the axis
	leastLines = 3   // of a box that is narrower or lower than a few steps
)

// hatch gives the path of the slanted lines in a box: rising to the right, or
// falling. The lines are cut to the box here, since a browser takes many times as
// long to print a pattern. Lines of boxes that touch meet.
func hatch(left, top, width, height float64, rising bool) string {
	step := hatchStep
	if least := min(width, height); least > 0 && least < leastLines*hatchStep {
		// Of a small box the number of lines must tell the slant.
		step = min(max(least/2, 1.5), hatchStep)
	}
	right, bottom := left+width, top+height
	var path strings.Builder
	line := func(x, y, n float64) {
		dy := n
		if rising {
			dy = -n
		}
		fmt.Fprintf(&path, "M%s %sl%s %s", tenth(x), tenth(y), tenth(n), tenth(dy))
	}
	// A line is all points of one sum (rising) or difference (falling) of x and y.
	if rising {
		for c := math.Ceil((left+top)/step) * step; c <= right+bottom; c += step {
			from, to := max(left, c-bottom), min(right, c-top)
			if to-from >= 0.1 {
				line(from, c-from, to-from)
			}
		}
	} else {
		for c := math.Ceil((left-bottom)/step) * step; c <= right-top; c += step {
			from, to := max(left, c+top), min(right, c+bottom)
			if to-from >= 0.1 {
				line(from, from-c, to-from)
			}
		}
	}
	return path.String()
}

// tenth writes a measure of a picture without zeros that say nothing.
func tenth(v float64) string {
	return strings.TrimSuffix(fmt.Sprintf("%.1f", v), ".0")
}
