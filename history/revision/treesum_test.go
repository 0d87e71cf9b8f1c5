package revision

import (
	"bytes"
	"math/rand/v2"
	"testing"

	"github.com/go-git/go-git/v5/plumbing"
)

// The hash of a tree is the same whether it begins at its start or where the tree
// before stops being the same, over many trees in a row.
func TestSumTree(t *testing.T) {
	rnd := rand.New(rand.NewPCG(1, 2))
	var before Tree
	data := make([]byte, 5*markEvery+17)
	for round := range 2000 {
		data = bytes.Clone(data)
		switch rnd.IntN(8) {
		case 0: // another length, with which the hash begins
			data = data[:rnd.IntN(len(data)+1)]
			if rnd.IntN(2) == 0 {
				data = append(data, make([]byte, rnd.IntN(6*markEvery))...)
			}
		case 1: // at a mark
			if i := markEvery * rnd.IntN(6); i < len(data) {
				data[i]++
			}
		case 2: // before one
			if i := markEvery*rnd.IntN(6) - 1; i >= 0 && i < len(data) {
				data[i]++
			}
		case 3: // nowhere
		default:
			if len(data) > 0 {
				data[rnd.IntN(len(data))]++
			}
		}
		want := plumbing.ComputeHash(plumbing.TreeObject, data)
		marks, err := sumTree(data, before, want)
		if err != nil {
			t.Fatalf("round %d, %d bytes after %d: %v", round, len(data), len(before.data), err)
		}
		if n := max(0, len(data)-1) / markEvery; len(marks) != n {
			t.Fatalf("round %d: %d notes of %d bytes", round, len(marks), len(data))
		}
		if len(data) > 0 {
			damaged := bytes.Clone(data)
			damaged[rnd.IntN(len(data))] ^= 1
			if _, err := sumTree(damaged, before, want); err == nil {
				t.Fatalf("round %d: a damaged tree is taken", round)
			}
			if _, err := sumTree(damaged, Tree{data, marks}, want); err == nil {
				t.Fatalf("round %d: a tree that was damaged after it was read is taken", round)
			}
		}
		before = Tree{data, marks}
	}
}

// BenchmarkSumTree compares the hash of a folder of 500 routes, one of them changed, with
// that of the whole folder.
func BenchmarkSumTree(b *testing.B) {
	data := make([]byte, 500*33)
	first, err := sumTree(data, Tree{}, plumbing.ComputeHash(plumbing.TreeObject, data))
	if err != nil {
		b.Fatal(err)
	}
	before := Tree{data, first}
	changed := bytes.Clone(data)
	changed[len(changed)/2]++
	want := plumbing.ComputeHash(plumbing.TreeObject, changed)
	for name, from := range map[string]Tree{"whole": {}, "after": before} {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				if _, err := sumTree(changed, from, want); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
