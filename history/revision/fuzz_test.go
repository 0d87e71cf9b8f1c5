package revision

import (
	"bytes"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/go-git/go-git/v5/plumbing"
	"github.com/go-git/go-git/v5/plumbing/filemode"
	gitobject "github.com/go-git/go-git/v5/plumbing/object"
)

// rawTree writes a tree from modes and names, each entry with a hash of its own.
func rawTree(modesAndNames ...string) []byte {
	var b bytes.Buffer
	for i := 0; i < len(modesAndNames); i += 2 {
		b.WriteString(modesAndNames[i] + " " + modesAndNames[i+1] + "\x00" + strings.Repeat(string(rune('a'+i)), hashSize))
	}
	return b.Bytes()
}

// FuzzTree: what is accepted has names that are one path each, is what go-git
// reads from the same bytes, and comes back the same when it is written again.
func FuzzTree(f *testing.F) {
	for _, seed := range [][]byte{
		nil,
		rawTree("100644", "dataset.toml", "40000", "routes"),
		rawTree("100644", "a", "100755", "b", "120000", "c", "160000", "d", "40000", "e"),
		rawTree("100664", "a.b", "40000", "a", "100644", "a0"), // a folder sorts as if it ended in a slash
		rawTree("40000", "a", "100644", "a"),
		rawTree("100644", "a", "100644", "a"),
		rawTree("100644", "b", "100644", "a"),
		rawTree("40000", ".git"), rawTree("40000", ".GIT"), rawTree("40000", ".."), rawTree("100644", ""), rawTree("100644", "a/b"),
		rawTree("040000", "a"), rawTree("0", "a"), rawTree("10064", "a"), rawTree("37777777777", "a"), rawTree("", "a"),
		rawTree("100644", "\xff\x1b[31m\u202e"),
		rawTree("100644", "a")[:20],
		[]byte("100644 a"), []byte("100644"),
	} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		entries, err := parseTree(data)
		if err != nil {
			if entries != nil {
				t.Fatalf("%d entries beside %v", len(entries), err)
			}
			return
		}
		var o plumbing.MemoryObject
		o.SetType(plumbing.TreeObject)
		o.Write(data)
		var other gitobject.Tree
		if err := other.Decode(&o); err != nil {
			t.Fatalf("go-git refuses it: %v", err)
		}
		if len(other.Entries) != len(entries) {
			t.Fatalf("%d entries, go-git has %d", len(entries), len(other.Entries))
		}
		modes := map[uint32]filemode.FileMode{modeTree: filemode.Dir, modeFile: filemode.Regular, modeExec: filemode.Executable, modeLink: filemode.Symlink, modeGitlink: filemode.Submodule}
		for i, e := range entries {
			if e.name == "" || e.name == "." || e.name == ".." || strings.EqualFold(e.name, ".git") || strings.ContainsAny(e.name, "/\x00") {
				t.Fatalf("name %q", e.name)
			}
			if i > 0 && entries[i-1].name >= e.name {
				t.Fatalf("%q before %q", entries[i-1].name, e.name)
			}
			if got, ok := find(entries, e.name); !ok || got != e {
				t.Fatalf("%q is not found", e.name)
			}
			k := slices.IndexFunc(other.Entries, func(x gitobject.TreeEntry) bool { return x.Name == e.name })
			if k < 0 || other.Entries[k].Hash != e.hash {
				t.Fatalf("entry %q: go-git has %v", e.name, other.Entries)
			}
			mode, ok := modes[e.mode]
			if raw := other.Entries[k].Mode; !ok || raw&0o170000 != mode&0o170000 {
				t.Fatalf("entry %q has mode %o, go-git %o", e.name, e.mode, raw)
			}
		}
		written := encodeTree(entries)
		again, err := parseTree(written)
		if err != nil || !slices.Equal(again, entries) {
			t.Fatalf("written again: %v, %v, want %v", again, err, entries)
		}
		if canonical := encodeTree(again); !bytes.Equal(canonical, written) {
			t.Fatal("one tree is written in two ways")
		}
	})
}

// FuzzCommit: the two readers of commits agree, texts are UTF-8, and times have
// a form that every report can write.
func FuzzCommit(f *testing.F) {
	hash := strings.Repeat("0a", 20)
	head := "tree " + hash + "\n"
	persons := "author A <a@b> 1767261600 +0100\ncommitter C <c@d> 1767265200 -0230\n"
	for _, seed := range []string{
		"", head, head + persons, head + persons + "\nsubject\n\nbody\n",
		head + "parent " + hash + "\nparent " + strings.Repeat("B1", 20) + "\n" + persons + "\nmerge\n",
		head + persons + "encoding ISO-8859-1\n\n\xfcber\n",
		head + persons + "gpgsig -----BEGIN\n more\n\nsigned",
		head + persons + "mergetag object " + hash + "\n encoding latin1\n\n\xff",
		head + "author <<a> b> c> 99999999999999999999 +9999\ncommitter  <> -1 -0000\n\n\n\n  a \n b\x00c",
		head + "author A <a> 253402300799 +1459\ncommitter C <c> 253402300800 -1500\n\nfar",
		head + "author A\ncommitter\n",
		"tree " + hash[:39] + "\n" + persons, "tree" + hash, head + "parent x\n" + persons,
		head + strings.Repeat("parent "+hash+"\n", 3) + "committer C <c> 1 +0000\n",
		head + "author A <a> \xa01767261600 +0000\ncommitter C <c> \xa01767265200 +0000\nencoding latin1\n\nx",
		head + persons + "\r\n\r\nsubject\r\nmore\r\n\r\nbody",
	} {
		f.Add([]byte(seed))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		c, err := parseCommit(data)
		l, err2 := parseLinks(data)
		if (err == nil) != (err2 == nil) {
			t.Fatalf("one reader says %v, the other %v", err, err2)
		}
		if err != nil {
			return
		}
		if len(c.Parents) != len(l.parents) {
			t.Fatalf("%d parents and %d", len(c.Parents), len(l.parents))
		}
		for i, p := range c.Parents {
			if l.parents[i].String() != p || len(p) != 40 {
				t.Fatalf("parent %q, %s", p, l.parents[i])
			}
		}
		if len(c.Tree) != 40 || !strings.EqualFold(c.Tree, string(data[5:45])) {
			t.Fatalf("tree %q", c.Tree)
		}
		when := int64(0)
		if !c.Committer.When.IsZero() {
			when = c.Committer.When.Unix()
		}
		if l.when != when {
			t.Fatalf("one reader has the time %d, the other %d", when, l.when)
		}
		for _, p := range []Person{c.Author, c.Committer} {
			if !utf8.ValidString(p.Name) || !utf8.ValidString(p.Email) {
				t.Fatalf("person %q %q", p.Name, p.Email)
			}
			if p.When.IsZero() {
				continue
			}
			if year := p.When.UTC().Year(); year < 1970 || year > 9999 {
				t.Fatalf("year %d", year)
			}
			if _, offset := p.When.Zone(); offset <= -15*3600 || offset >= 15*3600 {
				t.Fatalf("offset %d", offset)
			}
		}
		if !utf8.ValidString(c.Message) || !utf8.ValidString(c.Subject) || strings.ContainsAny(c.Subject, "\n\x00") {
			t.Fatalf("subject %q of %q", c.Subject, c.Message)
		}
		if blank := strings.Trim(strings.SplitN(c.Message, "\x00", 2)[0], " \t\r\n") == ""; blank != (c.Subject == "") {
			t.Fatalf("subject %q of %q", c.Subject, c.Message)
		}
	})
}
