// Package parallel does many pieces of work at a time, one a processor.
//
// Each piece fills in its own place, so that what comes out does not depend on
// which is done first:
//
//	speeds := make([]unit.Speed, len(rows))
//	parallel.Each(len(rows), func(i int) { speeds[i] = lowest(&rows[i]) })
//
// No goroutine outlives the call.
package parallel

import (
	"context"
	"runtime"

	"golang.org/x/sync/errgroup"
)

// Each does the pieces 0 to n-1.
func Each(n int, work func(i int)) {
	var g errgroup.Group
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i := range n {
		g.Go(func() error {
			work(i)
			return nil
		})
	}
	_ = g.Wait() // no piece gives an error
}

// Try does the pieces 0 to n-1 until one of them gives an error, or the context
// ends: those that were not begun by then are left out. The error is the first one
// that came. The context of a piece ends where a piece has failed.
func Try(ctx context.Context, n int, work func(ctx context.Context, i int) error) error {
	g, ctx := errgroup.WithContext(ctx)
	g.SetLimit(runtime.GOMAXPROCS(0))
	for i := range n {
		g.Go(func() error {
			if err := ctx.Err(); err != nil {
				return err
			}
			return work(ctx, i)
		})
	}
	return g.Wait()
}
