package trace

import (
	"context"
	"runtime"

	"golang.org/x/sync/errgroup"

	"speedtrail/history/revision"
)

// found is what a commit holds, and what it has otherwise than its first parent.
type found struct {
	listing *listing
	changes []change
}

// listed is a batch of commits, and what was found in them.
type listed struct {
	commits []walked
	found   []found
}

// scout lists what commits hold, a batch ahead of the reading of their files: the
// processors are never without work.
type scout struct {
	repo    *revision.Repo
	listers []*lister         // one for each processor
	recent  map[Hash]*listing // of the commits of the last batch
}

func newScout(repo *revision.Repo, folder string) *scout {
	s := &scout{repo: repo, recent: map[Hash]*listing{}}
	for range runtime.GOMAXPROCS(0) {
		s.listers = append(s.listers, newLister(repo, folder))
	}
	return s
}

// run lists commits, some at a time.
func (s *scout) run(ctx context.Context, list []walked, batch batches, to chan<- listed) error {
	for size := batch.first; len(list) > 0; size = min(2*size, batch.most) {
		n := min(size, len(list))
		p := listed{commits: list[:n]}
		list = list[n:]
		var err error
		if p.found, err = s.list(ctx, p.commits); err != nil {
			return err
		}
		select {
		case to <- p:
		case <-ctx.Done():
			return ctx.Err()
		}
	}
	return nil
}

// list lists what the commits of a batch hold: each processor goes through a row
// of commits that follow each other.
func (s *scout) list(ctx context.Context, commits []walked) ([]found, error) {
	out := make([]found, len(commits))
	work, ctx := errgroup.WithContext(ctx)
	share := (len(commits) + len(s.listers) - 1) / len(s.listers)
	for n, l := range s.listers {
		from, to := min(n*share, len(commits)), min((n+1)*share, len(commits))
		work.Go(func() error {
			own := map[Hash]*listing{}
			for i := from; i < to; i++ {
				if err := ctx.Err(); err != nil {
					return err
				}
				c := commits[i]
				var before *listing
				if len(c.parents) > 0 {
					p := c.parents[0]
					if before = own[p]; before == nil {
						var err error
						if before, err = listingOf(s.repo, l, s.recent, p); err != nil {
							return err
						}
						own[p] = before
					}
				}
				now, list, err := l.list(c.Hash, c.tree, before)
				if err != nil {
					return err
				}
				own[c.Hash] = now
				out[i] = found{now, list}
			}
			return nil
		})
	}
	if err := work.Wait(); err != nil {
		return nil, err
	}
	clear(s.recent)
	for _, x := range out {
		s.recent[x.listing.commit] = x.listing
	}
	return out, nil
}

// listingOf gives what a commit holds, if it was not listed lately.
func listingOf(repo *revision.Repo, l *lister, listed map[Hash]*listing, commit Hash) (*listing, error) {
	if x := listed[commit]; x != nil {
		return x, nil
	}
	c, err := repo.Link(commit)
	if err != nil {
		return nil, err
	}
	x, _, err := l.list(commit, c.Tree, nil)
	return x, err
}
