package trace

import (
	"context"
	"slices"

	"speedtrail/history/revision"
)

// Known tells which commits need not be walked to, because they and all before
// them are known already.
type Known func(Hash) bool

// walked is a commit that a walk came to.
type walked struct {
	Hash
	tree    Hash
	parents []Hash
	when    int64
	cut     bool
}

// walk lists the commits that can be reached from tip and are not known, parents
// before their children. Equal histories give equal orders.
func walk(ctx context.Context, repo *revision.Repo, tip Hash, firstParent bool, known Known) ([]walked, error) {
	type visit struct {
		walked
		next int // which parent is gone to next
	}
	var (
		order []walked
		stack []visit
		seen  = map[Hash]bool{}
	)
	enter := func(h Hash) error {
		if seen[h] || known != nil && known(h) {
			return nil
		}
		seen[h] = true
		c, err := repo.Link(h)
		if err != nil {
			return err
		}
		w := walked{Hash: h, tree: c.Tree, when: c.When, cut: c.Boundary}
		for _, p := range c.Parents {
			w.parents = append(w.parents, p)
		}
		if firstParent && len(w.parents) > 1 {
			w.parents = w.parents[:1]
		}
		stack = append(stack, visit{walked: w})
		return nil
	}
	if err := enter(tip); err != nil {
		return nil, err
	}
	for len(stack) > 0 {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		top := &stack[len(stack)-1]
		if top.next < len(top.parents) {
			p := top.parents[top.next]
			top.next++
			if err := enter(p); err != nil {
				return nil, err
			}
			continue
		}
		order = append(order, top.walked)
		stack = stack[:len(stack)-1]
	}
	return slices.Clip(order), nil
}
