package main

import (
	"bytes"
	"slices"
	"strings"
	"testing"

	"speedtrail/cmd/speedtrail/internal/render"
)

// Help texts fit a terminal of 80 columns.
func TestHelpFits(t *testing.T) {
	root := (&app{}).command()
	calls := [][]string{{}}
	for _, c := range root.Commands() {
		calls = append(calls, []string{c.Name()})
		for _, below := range c.Commands() {
			calls = append(calls, []string{c.Name(), below.Name()})
		}
	}
	for _, call := range calls {
		var out bytes.Buffer
		run(t.Context(), append(slices.Clone(call), "--help"), nil, &out, &out)
		for line := range strings.Lines(out.String()) {
			if strings.HasPrefix(line, "  speedtrail ") {
				continue // to be copied whole
			}
			if n := render.Cells(strings.TrimRight(line, "\n")); n > 80 {
				t.Errorf("%v: %d columns: %s", call, n, line)
			}
		}
	}
}
