package revision

import (
	"fmt"
	"io/fs"
	"strings"
	"testing"
)

// A tree of as many bytes as are read, and of one more.
func TestTreeLimit(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	blob := g.object("blob", "")
	raw := rawHash(blob)
	treeOf := func(size int) (tree string, entries int) {
		var b strings.Builder
		for size-b.Len() > 2*60 {
			fmt.Fprintf(&b, "100644 f%09d.csv\x00%s", entries, raw)
			entries++
		}
		b.WriteString("100644 " + "z" + strings.Repeat("z", size-b.Len()-7-1-1-20) + "\x00" + raw)
		return b.String(), entries + 1
	}
	person := "A <a@b> 1767261600 +0100"
	commit := func(tree string) string {
		return g.object("commit", fmt.Sprintf("tree %s\nauthor %s\ncommitter %s\n\nLarge\n", tree, person, person))
	}
	text, entries := treeOf(maxTree)
	at := commit(g.object("tree", text))
	fsys, err := g.open().Snapshot(at, ".")
	if err != nil {
		t.Fatal(err)
	}
	if list, err := fs.ReadDir(fsys, "."); err != nil || len(list) != entries {
		t.Errorf("%d entries, want %d, %v", len(list), entries, err)
	}
	text, _ = treeOf(maxTree + 1)
	past := commit(g.object("tree", text))
	_, err = g.open().Snapshot(past, ".")
	if err == nil {
		if fsys, err = g.open().Snapshot(past, "."); err == nil {
			_, err = fs.ReadDir(fsys, ".")
		}
	}
	wantClass(t, err, ErrTooLarge, "has 16777217 bytes, at most 16777216 are read")
}

// rawHash turns digits into bytes.
func rawHash(digits string) string {
	h, _ := parseHash(digits)
	return string(h[:])
}

// A commit of as many bytes as are read, most of them its message, and of one
// more; of as many parents as are read, and of one more.
func TestCommitLimits(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	tree := g.object("tree", "")
	person := "A <a@b> 1767261600 +0100"
	head := func(parents int) string {
		return "tree " + tree + "\n" + strings.Repeat("parent "+strings.Repeat("1", 40)+"\n", parents) + "author " + person + "\ncommitter " + person + "\n\n"
	}
	for _, c := range []struct {
		name, text string
		class      error
		want       string
	}{
		{"a message up to the limit", head(0) + strings.Repeat("x", maxCommit-len(head(0))), nil, ""},
		{"a message past the limit", head(0) + strings.Repeat("x", maxCommit+1-len(head(0))), ErrTooLarge, "has 16777217 bytes, at most 16777216 are read"},
		{"a message of lines up to the limit", head(0) + strings.Repeat("x\n", (maxCommit-len(head(0)))/2), nil, ""},
		{"parents up to the limit", head(maxParents), nil, ""},
		{"parents past the limit", head(maxParents + 1), ErrCorrupt, "more than 4096 parents"},
	} {
		t.Run(c.name, func(t *testing.T) {
			hash := g.object("commit", c.text)
			got, err := g.open().Resolve(hash)
			if c.class != nil {
				wantClass(t, err, c.class, c.want, hash)
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			_, message, _ := strings.Cut(c.text, "\n\n")
			if got.Message != message || got.Hash != hash || len(got.Parents) != strings.Count(c.text, "parent ") {
				t.Errorf("%d bytes of message, want %d; %d parents", len(got.Message), len(message), len(got.Parents))
			}
		})
	}
}

// The configuration of as many bytes as are read, and of one more.
func TestConfigLimit(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	text := readFile(t, g.path(".git/config"))
	g.write(".git/config", text+strings.Repeat("#", maxConfigFile-len(text)))
	g.open()
	g.write(".git/config", text+strings.Repeat("#", maxConfigFile+1-len(text)))
	_, err := Open(g.dir)
	wantClass(t, err, ErrCorrupt, "configuration", "has 4194305 bytes, at most 4194304 are read")
}
