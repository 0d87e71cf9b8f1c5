package revision

import (
	"fmt"
	"testing"
)

// BenchmarkTreeChanges compares folders of 500 lines, of which one differs, as most
// of a history do, or every tenth.
func BenchmarkTreeChanges(b *testing.B) {
	folder := func(differs func(i int) bool) Tree {
		var list []treeEntry
		for i := range 500 {
			e := treeEntry{name: fmt.Sprintf("route-%04d", i), mode: modeTree}
			if differs(i) {
				e.hash[0] = 1
			}
			list = append(list, e)
		}
		return Tree{data: storedTree(list)}
	}
	before := folder(func(int) bool { return false })
	for name, c := range map[string]struct {
		now  Tree
		want int
	}{
		"one":   {folder(func(i int) bool { return i == 250 }), 1},
		"tenth": {folder(func(i int) bool { return i%10 == 5 }), 50},
	} {
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if got, err := c.now.changes(before); err != nil || len(got) != c.want {
					b.Fatal(got, err)
				}
			}
		})
	}
}
