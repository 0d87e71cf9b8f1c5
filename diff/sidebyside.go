package diff

import (
	"runtime"

	"golang.org/x/sync/errgroup"
)

// sideBySide does n pieces of work, one a processor at a time. Each fills in its
// own place, so that the result does not depend on which is done first.
func sideBySide(n int, work func(i int)) {
	var g errgroup.Group
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i := range n {
		g.Go(func() error {
			work(i)
			return nil
		})
	}
	_ = g.Wait()
}
