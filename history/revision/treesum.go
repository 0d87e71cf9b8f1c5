package revision

import (
	"encoding"
	"slices"

	"github.com/go-git/go-git/v5/plumbing"

	"speedtrail/schema/common"
)

// A history of a network holds the folder of its routes thousands of times, mostly
// with one line in another way, and to hash it is the greatest part of reading it.
// So it is noted where the hash of a tree stood on its way, and the hash of the next
// one begins where that tree stops being the one before.

// markEvery is how many bytes lie between two notes.
const markEvery = 2 << 10

// sumTree checks the hash of a tree, and gives its notes. The tree before has been
// checked. Of the search for collisions nothing is left out: what has been found
// to hold no trace of one holds none in the same place after the same bytes.
func sumTree(data []byte, before Tree, want plumbing.Hash) (marks [][]byte, err error) {
	sum := sums.Get().(summing)
	defer sums.Put(sum)
	sum.Reset()
	at := 0
	if len(data) == len(before.data) { // with the length the hash begins
		n := min(common.Start(data, before.data)/markEvery, len(before.marks))
		if n > 0 && sum.(encoding.BinaryUnmarshaler).UnmarshalBinary(before.marks[n-1]) == nil {
			at, marks = n*markEvery, slices.Clip(before.marks[:n])
		}
	}
	if at == 0 {
		writeHead(sum, plumbing.TreeObject, int64(len(data)))
	}
	for len(data)-at > markEvery {
		sum.Write(data[at : at+markEvery])
		at += markEvery
		mark, err := sum.(encoding.BinaryMarshaler).MarshalBinary()
		if err != nil {
			return nil, err
		}
		marks = append(marks, mark)
	}
	sum.Write(data[at:])
	return marks, checkSum(sum, want)
}

// treeAfter reads a tree of which a great part may stand in the one before.
func (r *Repo) treeAfter(h plumbing.Hash, before Tree, what string) (Tree, error) {
	if kind, data, ok := r.store.stored(h, maxTree); ok && kind == plumbing.TreeObject {
		if marks, err := sumTree(data, before, h); err == nil {
			return Tree{data, marks}, nil
		}
	}
	data, err := r.read(h, plumbing.TreeObject, maxTree, what)
	return Tree{data: data}, err
}
