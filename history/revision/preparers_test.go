package revision

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// TestPreparers has authors, committers and Co-authored-by lines, read from
// commits that git wrote.
func TestPreparers(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	tree := g.mktree()
	write := func(author, committer, message string) string {
		return g.object("commit", fmt.Sprintf("tree %s\nauthor %s 1 +0000\ncommitter %s 1 +0000\n\n%s", tree, author, committer, message))
	}
	for name, c := range map[string]struct {
		commits []string
		want    string
	}{
		"none": {nil, ""},
		"author and committer": {
			[]string{write("Wanda Quill <w@fernway.example>", "Bram Ostler <b@fernway.example>", "x\n")},
			"Bram Ostler <b@fernway.example>, Wanda Quill <w@fernway.example>",
		},
		"one person in several spellings": {
			[]string{
				write("Wanda Quill <W@Fernway.Example>", "w quill <w@fernway.example>", "x\n"),
				write("A Quill <w@FERNWAY.example>", "Wanda <w@fernway.example>", "x\n"),
			},
			"A Quill <w@fernway.example>",
		},
		"letters beyond ASCII stay": {
			[]string{write("Ö <Ö@fernway.example>", "ö <ö@fernway.example>", "x\n")},
			"Ö <Ö@fernway.example>, ö <ö@fernway.example>",
		},
		"co-authors": {
			[]string{write("W <w@x>", "W <w@x>", "x\n\nCo-authored-by: Mirela Tansey <M.Tansey@fernway.example>\nco-AUTHORED-by:Bo <bo@x>\nCo-Authored-By:   <only@x>  \n")},
			"Bo <bo@x>, Mirela Tansey <m.tansey@fernway.example>,  <only@x>, W <w@x>",
		},
		"co-authors anywhere": {
			[]string{write("W <w@x>", "W <w@x>", "Co-authored-by: In Subject <s@x>\n\nbody\n  Co-authored-by: Indented <i@x>\n\nCo-authored-by: Middle <m@x>\n\nSigned-off-by: Nobody <n@x>\nend\n")},
			"Indented <i@x>, Middle <m@x>, In Subject <s@x>, W <w@x>",
		},
		"co-authors with Windows line ends": {
			[]string{write("W <w@x>", "W <w@x>", "x\r\n\r\nCo-authored-by: M <m@x>\r\n")},
			"M <m@x>, W <w@x>",
		},
		"no co-authors": {
			[]string{write("W <w@x>", "W <w@x>", "x\n\nCo-authored-by\nNot-co-authored-by: A <a@x>\nCo-authored-by is: B <b@x>\nCo-authored-by:\n> Co-authored-by: C <c@x>\n")},
			"W <w@x>",
		},
		"a co-author without address": {
			[]string{write("W <w@x>", "W <w@x>", "x\n\nCo-authored-by: Just A Name\nCo-authored-by: Another\n")},
			"Another <>, Just A Name <>, W <w@x>",
		},
		"no address": {
			[]string{write("One <>", "Two <>", "x\n"), write("One <>", "Two <>", "x\n")},
			"One <>, Two <>",
		},
		"neither name nor address": {
			[]string{write(" <>", "<>", "x\n\nCo-authored-by: <>\n"), write("W <w@x>", "<>", "x\n")},
			" <>, W <w@x>",
		},
		"two authors, two committers": {
			[]string{write("W <w@x>", "W <w@x> 1 +0000\nauthor A <a@x> 1 +0000\ncommitter C <c@x>", "x\n")},
			"A <a@x>, C <c@x>, W <w@x>",
		},
		"several co-authors in a line": {
			[]string{write("W <w@x>", "W <w@x>", "x\n\nCo-authored-by: A <a@x>, B <b@x> C <c@x\nCo-authored-by: D <d@x>> and so on\n")},
			"A <a@x>, B <b@x>, C <c@x>, D <d@x>, W <w@x>",
		},
		"co-authors folded": {
			[]string{write("W <w@x>", "W <w@x>", "x\n\nCo-authored-by:\n A <a@x>\n\nCo-authored-by: B\n\t<b@x>\n  Co-authored-by: C\n <c@x>\nend\n <n@x>\nCo-authored-by:\n\n <n@x>\n")},
			"A <a@x>, B <b@x>, C <c@x>, W <w@x>",
		},
		"an encoding that is read": {
			[]string{write("W <w@x>", "W <w@x> 1 +0000\nencoding iso-8859-1\nnote", "x\n\nCo-authored-by: \xe4 <\xe4@x>\n")},
			"W <w@x>, ä <ä@x>",
		},
		"not UTF-8": {
			[]string{write("V\xe4n <v@x>", "W <w@x>", "x\n")},
			"V\uFFFDn <v@x>, W <w@x>",
		},
	} {
		r := g.open()
		var commits []Commit
		for _, hash := range c.commits {
			commit, err := r.Resolve(hash)
			if err != nil {
				t.Fatal(err)
			}
			commits = append(commits, commit)
		}
		for range 2 {
			var got []string
			for _, p := range r.Preparers(commits) {
				got = append(got, p.Name+" <"+p.Email+">")
			}
			if strings.Join(got, ", ") != c.want {
				t.Errorf("%s: %q, want %q", name, strings.Join(got, ", "), c.want)
			}
			slices.Reverse(commits) // the order of commits has no say
		}
	}
}

// TestCoAuthorsAsGit asks git for the trailers of a message and wants every
// address of them. What git does not take for one may be there besides.
func TestCoAuthorsAsGit(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	tree := g.mktree()
	addresses := regexp.MustCompile(`<([^<>]*)>`)
	seen := 0
	for _, c := range []struct {
		trailers string // the last paragraph
		encoding string
		want     int // how many addresses git has
	}{
		{"Co-authored-by: ann <ann@x>\n", "", 1},
		{"Co-authored-by:\n ann <ann@x>\n", "", 1},
		{"Co-authored-by:\n\tann\n <ann@x>\n", "", 1},
		{"Co-authored-by:\n ann\n\t\t<ann@x>\n and bob\n <bob@x>\nSigned-off-by: W <w@x>\n", "", 2},
		{"Co-authored-by:\r\n ann <ann@x>\r\n", "", 1},
		{"Co-authored-by:\n\rann <ann@x>\n", "", 1},
		{"Co-authored-by:\n\fann <ann@x>\n", "", 0},
		{"Co-authored-by:\n \u00a0 ann <ann@x>\n", "", 1},
		{"Co-authored-by \t : ann <ann@x>\n", "", 1},
		{"CO-AUTHORED-BY:ann <ann@x>", "", 1},
		{"Co-authored-by: ann <ann@x>\n  Co-authored-by: bob <bob@x>\n", "", 2},
		{"Co-authored-by: ann <ann@x>, bob <bob@x>\n  cat <cat@x>\n", "", 3},
		{"Signed-off-by: W <w@x>\n (on behalf)\nCo-authored-by:\n ann <ann@x>\n# a remark\n", "", 1},
		{"some prose\nCo-authored-by:\n ann <ann@x>\nSigned-off-by: W <w@x>\n", "", 1},
		{"Co-authored-by: a: b <ann@x>\n : <bob@x>\n", "", 2},
		{"Co-authored-by:\n\n ann <ann@x>\n", "", 0},
		{"Co-authored-by:\n \n ann <ann@x>\n", "", 0},
		{"Co-authored-by: ann <ANN@x>\n\n\n", "", 1},
		{"Co-authored-by: \xe4nn <\xe4nn@x>\n", "ISO-8859-1", 1},
		{"Co-authored-by:\n \xe4nn <\xe4nn@x>\n", "latin1", 1},
	} {
		head := fmt.Sprintf("tree %s\nauthor W <w@x> 1 +0000\ncommitter W <w@x> 1 +0000\n", tree)
		if c.encoding != "" {
			head += "encoding " + c.encoding + "\n"
		}
		hash := g.object("commit", head+"\nsubject\n\nbody\n\n"+c.trailers)
		out := g.git("log", "--no-walk", "--encoding=UTF-8", "--format=%(trailers:key=Co-authored-by,valueonly,unfold)", hash)
		commit, err := g.open().Resolve(hash)
		if err != nil {
			t.Fatal(err)
		}
		have := (&Repo{}).Preparers([]Commit{commit})
		found := addresses.FindAllStringSubmatch(out, -1)
		for _, m := range found {
			if !slices.ContainsFunc(have, func(p Preparer) bool { return p.Email == lowerASCII(m[1]) }) {
				t.Errorf("%q: git has %s, preparers are %v", c.trailers, m[1], have)
			}
		}
		if len(found) != c.want {
			t.Errorf("%q: git has %q, %d addresses were expected", c.trailers, out, c.want)
		}
		seen += len(found)
	}
	if seen < 20 {
		t.Errorf("%d addresses compared", seen)
	}
}

// TestPreparersInOtherEncodings: to a git that knows the encoding these messages
// name a co-author. Here there is somebody without an address.
func TestPreparersInOtherEncodings(t *testing.T) {
	t.Parallel()
	for encoding, message := range map[string]string{
		"UTF-7": "+AEM-o-authored-by: ann <ann@x>\n", "ISO-2022-JP": "\x1b(JCo-authored-by: ann <ann@x>\n",
		"LATIN-GREEK": "x\n", "no such thing \x1b[2J": "x\n", strings.Repeat("long", 100): "x\n",
	} {
		const zero = "0000000000000000000000000000000000000000"
		c, err := parseCommit([]byte("tree " + zero + "\nauthor W <w@x> 1 -0000\ncommitter W <w@x> 1 -0000\nencoding " + encoding + "\nencoding UTF-8\n\nx\n\n" + message))
		if err != nil {
			t.Fatal(err)
		}
		have := (&Repo{}).Preparers([]Commit{c})
		if len(have) != 2 || have[0].Email != "" || !strings.HasPrefix(have[0].Name, "whoever commit") || !strings.Contains(have[0].Name, strconv.QuoteToASCII(encoding[:5])[1:6]) || len(have[0].Name) > 200 {
			t.Errorf("%q: %q", encoding, have)
		}
	}
	for _, encoding := range []string{"", "utf8", "UTF-8", "US-ASCII", "ISO-8859-15", "iso_8859-1", "latin1", "windows-1252", "CP1250", "KOI8-R", "EUC-JP", "GB18030"} {
		if !readable(encoding) {
			t.Errorf("%s is not read", encoding)
		}
	}
}

// TestPreparersOfMerge: everybody on either side of a merge counts, by Between.
func TestPreparersOfMerge(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	r := g.open()
	commits, complete, err := r.Between(t.Context(), g.git("rev-parse", "v1^{commit}"), g.git("rev-parse", "main"))
	if err != nil || !complete {
		t.Fatal(err, complete)
	}
	var want []string
	for _, line := range lines(g.git("log", "--format=%ae%n%ce", "v1..main")) {
		want = append(want, strings.ToLower(line))
	}
	slices.Sort(want)
	want = slices.Compact(want)
	var got []string
	for _, p := range r.Preparers(commits) {
		got = append(got, p.Email)
	}
	if !slices.Equal(got, want) || len(got) < 3 {
		t.Errorf("preparers %v, git has %v", got, want)
	}
}
