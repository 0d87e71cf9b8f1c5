package parallel

import (
	"context"
	"errors"
	"runtime"
	"sync/atomic"
	"testing"
)

// Law: every piece is done once, and at most one a processor at a time.
func TestEach(t *testing.T) {
	for _, n := range []int{0, 1, 2, 100} {
		done := make([]int, n)
		var now, most atomic.Int64
		Each(n, func(i int) {
			at := now.Add(1)
			for seen := most.Load(); at > seen && !most.CompareAndSwap(seen, at); seen = most.Load() {
			}
			runtime.Gosched()
			done[i]++
			now.Add(-1)
		})
		for i, times := range done {
			if times != 1 {
				t.Errorf("piece %d of %d was done %d times", i, n, times)
			}
		}
		if got := most.Load(); got > int64(runtime.GOMAXPROCS(0)) {
			t.Errorf("%d at a time", got)
		}
	}
}

// The first error is given, and no piece begins long after it.
func TestTryStops(t *testing.T) {
	failed := errors.New("failed")
	var begun atomic.Int64
	err := Try(t.Context(), 10_000, func(ctx context.Context, i int) error {
		begun.Add(1)
		if i == 3 {
			return failed
		}
		if i > 3 {
			<-ctx.Done()
		}
		return nil
	})
	if !errors.Is(err, failed) {
		t.Errorf("got %v", err)
	}
	if most := int64(4 + runtime.GOMAXPROCS(0)); begun.Load() > most {
		t.Errorf("%d pieces were begun, of which at most %d were before the error", begun.Load(), most)
	}
}

func TestTryUntilTheContextEnds(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	begun := false
	err := Try(ctx, 1, func(context.Context, int) error { begun = true; return nil })
	if !errors.Is(err, context.Canceled) || begun {
		t.Errorf("got %v, begun: %t", err, begun)
	}
	if err := Try(t.Context(), 3, func(context.Context, int) error { return nil }); err != nil {
		t.Error(err)
	}
}
