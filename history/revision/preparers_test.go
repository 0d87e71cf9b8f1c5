package revision

import (
	"fmt"
	"slices"
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
