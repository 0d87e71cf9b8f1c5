package history

import (
	"context"
	"iter"
	"runtime"

	"speedtrail/history/assessment"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// opened is an entry, and what can be said of it by itself.
type opened struct {
	chain.Entry
	broken    error // how it does not follow the entry before it
	canonical error // how its body is not canonical, where that was asked

	// Of an assessment:
	doc        *assessment.Document
	digest     string
	unreadable error
}

// mostAhead bounds the bodies that are opened ahead of the one that is at work, in
// bytes; one of them may be larger.
const mostAhead = 8 << 20

// openAhead runs over the entries after a head, in their order, and has the next
// ones opened by other processors meanwhile: most of the time that a ledger takes
// goes into its JSON.
func openAhead(ctx context.Context, l *ledger.Ledger, head chain.Head, canonical bool) iter.Seq2[*opened, error] {
	type job struct {
		*opened
		done chan struct{}
	}
	return func(yield func(*opened, error) bool) {
		var queue []job
		size := 0
		next := func() bool {
			j := queue[0]
			queue = queue[1:]
			<-j.done
			size -= len(j.Body)
			return yield(j.opened, nil)
		}
		// A caller that ends early leaves nothing behind.
		defer func() {
			for _, j := range queue {
				<-j.done
			}
		}()
		for e, err := range l.Entries(ctx, head.Seq+1) {
			if err != nil {
				// What came before it is handed over first.
				for len(queue) > 0 {
					if !next() {
						return
					}
				}
				yield(nil, err)
				return
			}
			for len(queue) > 0 && (len(queue) > 2*runtime.GOMAXPROCS(0) || size+len(e.Body) > mostAhead) {
				if !next() {
					return
				}
			}
			j := job{&opened{Entry: e}, make(chan struct{})}
			before := head
			go func() {
				defer close(j.done)
				j.open(before, canonical)
			}()
			queue, size, head = append(queue, j), size+len(e.Body), e.Head()
		}
		for len(queue) > 0 {
			if !next() {
				return
			}
		}
	}
}

func (o *opened) open(before chain.Head, canonical bool) {
	o.broken = chain.Check(before, o.Entry)
	if canonical {
		o.canonical = canon.Check(o.Body)
	}
	if o.Kind == chain.Assessment {
		o.doc, o.digest, o.unreadable = assessment.Decode(o.Body)
	}
}
