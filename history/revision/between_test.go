package revision

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// randomHistory writes commits with up to three parents among the earlier ones,
// to references of their own, and gives these. Dates run forward, all stand still,
// or jump back and forth as on machines whose clocks are wrong.
func randomHistory(s *stream, seed uint64, n int) (refs []string) {
	random := rand.New(rand.NewPCG(seed, 1))
	first := s.marks + 1
	for i := range n {
		var parents []int
		for range random.IntN(4) {
			if i == 0 {
				break
			}
			p := first + max(0, i-1-random.IntN(5))
			if !slices.Contains(parents, p) {
				parents = append(parents, p)
			}
		}
		when := 1767000000
		switch seed % 3 {
		case 0:
			when += 100 * i
		case 1:
			when += random.IntN(1000)
		}
		refs = append(refs, fmt.Sprintf("refs/heads/h%d-%d", seed, i))
		s.commit(refs[i], when, "", fmt.Sprintf("commit %d of %d\n", i, seed), parents)
	}
	return refs
}

// reach gives what each commit reaches, itself included. Parents stand before
// their children.
func reach(hashes []string, parents map[string][]string) map[string]map[string]bool {
	out := map[string]map[string]bool{}
	for _, h := range hashes {
		all := map[string]bool{h: true}
		for _, p := range parents[h] {
			for a := range out[p] {
				all[a] = true
			}
		}
		out[h] = all
	}
	return out
}

// TestBetween compares every pair of commits of many histories with what set
// theory says of git's list of parents, and some pairs with git itself.
func TestBetween(t *testing.T) {
	t.Parallel()
	const count, size = 9, 18
	g := newGit(t)
	var s stream
	var refs []string
	for seed := range uint64(count) {
		refs = append(refs, randomHistory(&s, seed, size)...)
	}
	s.load(g)
	all := g.gitResolve(refs)
	parents := map[string][]string{}
	for _, line := range lines(g.git("rev-list", "--all", "--parents")) {
		f := strings.Fields(line)
		parents[f[0]] = f[1:]
	}
	for seed := range count {
		t.Run(fmt.Sprint("history ", seed), func(t *testing.T) {
			r := g.open()
			hashes := all[seed*size:][:size]
			reach := reach(hashes, parents)
			for _, base := range hashes {
				for _, target := range hashes {
					commits, complete, err := r.Between(t.Context(), base, target)
					if err != nil || !complete {
						t.Fatal(err, complete)
					}
					checkOrder(t, commits)
					want := map[string]bool{}
					for h := range reach[target] {
						if !reach[base][h] {
							want[h] = true
						}
					}
					for _, c := range commits {
						if !want[c.Hash] {
							t.Errorf("between %s and %s: %s is too much", base, target, c.Hash)
						}
						delete(want, c.Hash)
					}
					if len(want) > 0 {
						t.Errorf("between %s and %s: %v are missing", base, target, want)
					}
					got, err := r.IsAncestor(t.Context(), base, target)
					if got != reach[target][base] || err != nil {
						t.Errorf("%s is an ancestor of %s: %v (%v)", base, target, got, err)
					}
				}
			}
			last := len(hashes) - 1
			for _, p := range [][2]int{{seed, last - seed%3}, {last, last / 2}} {
				checkBetween(t, g, r, hashes[p[0]], hashes[p[1]])
				checkAncestor(t, g, r, hashes[p[0]], hashes[p[1]])
			}
		})
	}
}

// TestBetweenOrder: where nothing else decides, the newest comes first, then the
// hash; the same every time.
func TestBetweenOrder(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	var s stream
	root := s.commit("refs/heads/root", 1767000000, "", "root\n", nil)
	newer := s.commit("refs/heads/newer", 1767000900, "", "newer\n", []int{root})
	older := s.commit("refs/heads/older", 1767000300, "", "older\n", []int{root})
	even1 := s.commit("refs/heads/even1", 1767000500, "", "one\n", []int{root})
	even2 := s.commit("refs/heads/even2", 1767000500, "", "two\n", []int{root})
	s.commit("refs/heads/all", 1767000100, "", "merge, dated before its parents\n", []int{older, newer, even1, even2})
	s.load(g)
	h := g.gitResolve([]string{"root", "newer", "older", "even1", "even2", "all"})
	even := []string{h[3], h[4]}
	slices.Sort(even)
	want := []string{h[5], h[1], even[0], even[1], h[2]}
	for range 3 {
		commits, _, err := g.open().Between(t.Context(), h[0], h[5])
		var got []string
		for _, c := range commits {
			got = append(got, c.Hash)
		}
		if err != nil || !slices.Equal(got, want) {
			t.Errorf("order %v (%v), want %v", got, err, want)
		}
	}
}

func TestBetweenErrors(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	r := g.open()
	main, tree := g.git("rev-parse", "main"), g.git("rev-parse", "main^{tree}")
	stopped, cancel := context.WithCancel(t.Context())
	cancel()
	for _, c := range []struct {
		name, base, target string
		ctx                context.Context
		class              error
	}{
		{"a name", "main", main, t.Context(), ErrUnknown},
		{"a short hash", main, main[:10], t.Context(), ErrUnknown},
		{"nothing", "", main, t.Context(), ErrUnknown},
		{"no object", main, strings.Repeat("12", 20), t.Context(), ErrMissingObject},
		{"no object as base", strings.Repeat("12", 20), main, t.Context(), ErrMissingObject},
		{"a tree", tree, main, t.Context(), ErrCorrupt},
		{"stopped", g.git("rev-parse", "v1^{commit}"), main, stopped, context.Canceled},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, complete, err := r.Between(c.ctx, c.base, c.target)
			if !errors.Is(err, c.class) || complete {
				t.Errorf("between: %v, complete %v", err, complete)
			}
			if _, err := r.IsAncestor(c.ctx, c.base, c.target); !errors.Is(err, c.class) {
				t.Errorf("is ancestor: %v", err)
			}
		})
	}
}
