package revision

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// drawTree gives the entries of a random tree in Git's order.
func drawTree(rnd *rand.Rand) []treeEntry {
	byName := map[string]treeEntry{}
	for range rnd.IntN(12) {
		e := treeEntry{name: [...]string{"a", "a-b", "a.c", "ab", "b", "c", "c0", "d", "\xff"}[rnd.IntN(9)]}
		e.mode = [...]uint32{modeTree, modeTree, modeFile, modeExec, modeLink, modeGitlink}[rnd.IntN(6)]
		e.hash[0], e.hash[19] = byte(rnd.IntN(2)), byte(rnd.IntN(2)) // zero bytes are bytes, too
		byName[e.name] = e
	}
	var list []treeEntry
	for _, e := range byName {
		list = append(list, e)
	}
	slices.SortFunc(list, func(a, b treeEntry) int { return strings.Compare(sortKey(a), sortKey(b)) })
	return list
}

func storedTree(list []treeEntry) []byte {
	var b bytes.Buffer
	for _, e := range list {
		fmt.Fprintf(&b, "%o %s\x00%s", e.mode, e.name, e.hash[:])
	}
	return b.Bytes()
}

// byKind lists lines by name and kind: a folder and something else of one name
// are two lines.
func byKind(list []treeEntry) map[string]TreeEntry {
	m := map[string]TreeEntry{}
	for _, e := range list {
		m[sortKey(e)] = e.public()
	}
	return m
}

// Law: of two trees, the changes are exactly the lines that are not the same, in
// order; and a tree is refused exactly where parseTree refuses it, whatever it is
// compared with.
func TestTreeChanges(t *testing.T) {
	rnd := rand.New(rand.NewPCG(3, 3))
	refused := 0
	for range 30_000 {
		old, now := drawTree(rnd), drawTree(rnd)
		if rnd.IntN(2) == 0 && len(old) > 0 {
			// Mostly the same, as trees of a history are.
			now = slices.Clone(old)
			i := rnd.IntN(len(now))
			switch rnd.IntN(3) {
			case 0:
				now = slices.Delete(now, i, i+1)
			case 1:
				now[i].hash[5] ^= 1
			case 2:
				now[i].mode = modeTree
				slices.SortFunc(now, func(a, b treeEntry) int { return strings.Compare(sortKey(a), sortKey(b)) })
			}
		}
		before, data := Tree{data: storedTree(old)}, storedTree(now)
		list, err := Tree{data: data}.changes(before)
		if err != nil {
			t.Fatalf("%v: %q to %q", err, before.data, data)
		}
		was, is := byKind(old), byKind(now)
		want := 0
		for key := range was {
			if was[key] != is[key] {
				want++
			}
		}
		for key := range is {
			if _, ok := was[key]; !ok {
				want++
			}
		}
		last := ""
		for _, c := range list {
			e := c.Now
			if e.Name == "" {
				e = c.Old
			}
			key := e.Name
			if e.Mode.IsDir() {
				key += "/"
			}
			if c.Old != was[key] || c.Now != is[key] || c.Old == c.Now || key <= last {
				t.Fatalf("%+v after %q: %q to %q", c, last, before.data, data)
			}
			last = key
		}
		if len(list) != want {
			t.Fatalf("%d changes, want %d: %q to %q", len(list), want, before.data, data)
		}
		// Damage: bytes, cut, or an entry in the wrong place.
		bad := bytes.Clone(data)
		switch n := rnd.IntN(3); {
		case len(bad) == 0:
			continue
		case n == 0:
			bad[rnd.IntN(len(bad))] ^= 1 << rnd.IntN(8)
		case n == 1:
			bad = bad[:rnd.IntN(len(bad))]
		case len(now) > 1:
			i, k := rnd.IntN(len(now)), rnd.IntN(len(now))
			now[i], now[k] = now[k], now[i]
			if rnd.IntN(2) == 0 {
				now[i].name = now[k].name
			}
			bad = storedTree(now)
		}
		_, wantErr := parseTree(bad)
		_, gotErr := Tree{data: bad}.changes(before)
		if (gotErr == nil) != (wantErr == nil) {
			t.Fatalf("%q after %q: %v, parseTree says %v", bad, before.data, gotErr, wantErr)
		}
		if gotErr != nil {
			refused++
		}
	}
	if refused < 1000 {
		t.Errorf("only %d trees were refused", refused)
	}
}
