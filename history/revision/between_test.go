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

// randomHistory writes commits with up to three parents among the earlier ones.
// Dates run forward, all stand still, or jump back and forth as on machines whose
// clocks are wrong.
func randomHistory(t testing.TB, seed uint64, n int) (g *gitRepo, hashes []string) {
	g = newGit(t)
	random := rand.New(rand.NewPCG(seed, 1))
	var s stream
	for i := range n {
		var parents []int
		for range random.IntN(4) {
			if i == 0 {
				break
			}
			p := 1 + max(0, i-1-random.IntN(5))
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
		mark := s.commit(fmt.Sprintf("refs/heads/b%d", i), when, "", fmt.Sprintf("commit %d\n", i), parents)
		if mark != i+1 {
			t.Fatal("marks are not the numbers of the commits")
		}
	}
	s.load(g)
	for i := range n {
		hashes = append(hashes, fmt.Sprintf("refs/heads/b%d", i))
	}
	return g, g.gitResolve(hashes)
}

// reach gives, by git rev-list, what each commit reaches, itself included.
func (g *gitRepo) reach(hashes []string) map[string]map[string]bool {
	g.t.Helper()
	parents := map[string][]string{}
	for _, line := range lines(g.git("rev-list", "--all", "--parents")) {
		f := strings.Fields(line)
		parents[f[0]] = f[1:]
	}
	out := map[string]map[string]bool{}
	for _, h := range hashes { // parents stand before their children
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
	for seed := range uint64(9) {
		t.Run(fmt.Sprint("history ", seed), func(t *testing.T) {
			t.Parallel()
			g, hashes := randomHistory(t, seed, 24)
			r := g.open()
			reach := g.reach(hashes)
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
			for _, p := range [][2]int{{0, last}, {last / 2, last}, {last, last / 2}, {last - 1, last}, {last, last}} {
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
	g := sample(t)
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
