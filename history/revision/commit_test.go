package revision

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// TestCommits: tree and parents must be well formed, the rest is read leniently.
func TestCommits(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	tree := g.mktree()
	const people = "author Ann <a@fernway.example> 1767000000 +0100\ncommitter Ann <a@fernway.example> 1767000000 +0100\n"
	for name, content := range map[string]string{
		"empty":                "",
		"no tree":              people + "\nx\n",
		"short tree":           "tree " + tree[:39] + "\n" + people + "\nx\n",
		"tree is no hash":      "tree " + strings.Repeat("g", 40) + "\n" + people + "\nx\n",
		"short parent":         "tree " + tree + "\nparent " + tree[:10] + "\n" + people + "\nx\n",
		"parent after author":  "tree " + tree + "\nauthor Ann <a@fernway.example> 1 +0000\nparent " + tree + "\n" + people,
		"parent after people":  "tree " + tree + "\n" + people + "parent " + tree + "\n\nx\n",
		"parent after another": "tree " + tree + "\nother\nparent " + tree + "\n" + people + "\nx\n",
		"two trees":            "tree " + tree + "\ntree " + tree + "\nparent " + tree + "\n" + people + "\nx\n",
		"space before the tag": " tree " + tree + "\n" + people,
	} {
		hash := g.object("commit", content)
		r := g.open()
		_, err := r.Resolve(hash)
		t.Run(name, func(t *testing.T) {
			wantClass(t, err, ErrCorrupt, hash)
			_, err := r.IsAncestor(t.Context(), hash, hash)
			wantClass(t, err, ErrCorrupt, hash)
		})
	}
	for name, c := range map[string]struct{ author, wantName, wantEmail, wantDate string }{
		"plain":          {"Ann Bo <a@fernway.example> 1767000000 +0130", "Ann Bo", "a@fernway.example", "1767000000 +0130"},
		"west":           {"Ann <a@x> 1767000000 -1200", "Ann", "a@x", "1767000000 -1200"},
		"no name":        {"<a@x> 1 +0000", "", "a@x", "1 +0000"},
		"no address":     {"Ann", "Ann", "", "0001-01-01"},
		"empty address":  {"Ann <> 1 +0000", "Ann", "", "1 +0000"},
		"open bracket":   {"Ann <a@x", "Ann", "a@x", "0001-01-01"},
		"two brackets":   {"Ann <a@x>> 1 +0000", "Ann", "a@x>", "1 +0000"},
		"no date":        {"Ann <a@x>", "Ann", "a@x", "0001-01-01"},
		"word as date":   {"Ann <a@x> now +0000", "Ann", "a@x", "0001-01-01"},
		"before 1970":    {"Ann <a@x> -5 +0000", "Ann", "a@x", "0001-01-01"},
		"far future":     {"Ann <a@x> 99999999999999 +0000", "Ann", "a@x", "0001-01-01"},
		"too far":        {"Ann <a@x> 99999999999999999999999 +0000", "Ann", "a@x", "0001-01-01"},
		"zone of a word": {"Ann <a@x> 1 CEST", "Ann", "a@x", "1 +0000"},
		"zone too large": {"Ann <a@x> 1 +9999", "Ann", "a@x", "1 +0000"},
		"no zone":        {"Ann <a@x> 1", "Ann", "a@x", "1 +0000"},
	} {
		hash := g.object("commit", "tree "+tree+"\nauthor "+c.author+"\ncommitter Bo <b@x> 1767000000 +0000\nunknown header\n\nx\n")
		got, err := g.open().Resolve(hash)
		date := rawDate(got.Author)
		if got.Author.When.IsZero() {
			date = got.Author.When.Format("2006-01-02")
		}
		if err != nil || got.Author.Name != c.wantName || got.Author.Email != c.wantEmail || date != c.wantDate || got.Message != "x\n" {
			t.Errorf("%s: %+v %s (%v)", name, got.Author, date, err)
		}
	}
}

// TestCommitWithoutPeople: a commit that lacks the line of a person is read, as git
// reads it, and somebody without a name has prepared it.
func TestCommitWithoutPeople(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	first := g.commit("x")
	const author, committer = "author Ann <a@fernway.example> 1767000000 +0100\n", "committer Bo <b@fernway.example> 1767000000 +0100\n"
	for name, c := range map[string]struct {
		people string
		emails []string
	}{
		"no author":        {committer, []string{"", "b@fernway.example"}},
		"no committer":     {author, []string{"", "a@fernway.example"}},
		"neither":          {"", []string{""}},
		"in another order": {committer + author, []string{"", "a@fernway.example", "b@fernway.example"}},
	} {
		hash := g.object("commit", "tree "+g.mktree()+"\nparent "+first+"\n"+c.people+"\nx\n")
		next := g.object("commit", "tree "+g.mktree()+"\nparent "+hash+"\n"+author+committer+"\ny\n")
		r := g.open()
		commits, complete, err := r.Between(t.Context(), first, hash)
		if err != nil || !complete || len(commits) != 1 || commits[0].Message != "x\n" {
			t.Errorf("%s: %+v %v", name, commits, err)
			continue
		}
		var emails []string
		for _, p := range r.Preparers(commits) {
			emails = append(emails, p.Email)
		}
		if !slices.Equal(emails, c.emails) {
			t.Errorf("%s: prepared by %q, want %q", name, emails, c.emails)
		}
		if before, err := r.IsAncestor(t.Context(), first, next); err != nil || !before {
			t.Errorf("%s: its parent is not found: %v", name, err)
		}
		if got := g.git("rev-list", "--count", first+".."+next); got != "2" {
			t.Errorf("%s: git counts %s", name, got)
		}
	}
}

// TestSubjects compares the subject of messages with git's.
func TestSubjects(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	tree := g.mktree()
	messages := []string{
		"", "\n", "\nx", "\nx\n", "\n\n\nx\ny\n\nz\n", "\nx  \ny\n", "\nx\n   \ny\n", "\nx\r\ny\r\n", "\n \n\t\n", "\nå ä ö\n",
		"\nx\n  y\n", "\n  x\n", "\n \n  x \n\ty\t\n \r\nz", "\n\v\nx\n", "\nx\n\f\ny\n", "\n\u00a0\nx\n", "\nx\u0085\ny\u2028\nz\n", "\nx\t\v \n\r\ny",
		"\nab\x00cd\nef\n", "\n\x00\nx\n", "\nx\n\x00\ny\n", "\r\n\r\nx\n", "\nx\ry\n", "\nx\n\r\r\ny\n",
	}
	random := rand.New(rand.NewPCG(5, 5))
	for range 100 {
		m := "\n"
		for range random.IntN(12) {
			m += []string{"x", "yz", " ", "  ", "\t", "\n", "\n", "\n\n", "\r", "\r\n", "\v", "\f", "\u00a0", "é", "#"}[random.IntN(15)]
		}
		messages = append(messages, m)
	}
	var hashes []string
	for i, m := range messages {
		// Dates keep two of one message apart.
		hashes = append(hashes, g.object("commit", fmt.Sprintf("tree %s\nauthor A <a@x> %d +0000\ncommitter A <a@x> 1 +0000\n%s", tree, i, m)))
	}
	r := g.open()
	got := strings.Split(g.feed(strings.Join(hashes, "\n")+"\n", "log", "--no-walk=unsorted", "--stdin", "-z", "--format=%s%x01"), "\x00")
	if len(got) != len(messages)+1 && len(got) != len(messages) {
		t.Fatalf("git gave %d subjects of %d", len(got), len(messages))
	}
	for i, m := range messages {
		c, err := r.Resolve(hashes[i])
		if want := strings.TrimSuffix(got[i], "\x01"); c.Subject != want || err != nil {
			t.Errorf("%q: subject %q (%v), git has %q", m, c.Subject, err, want)
		}
	}
}

// TestSigned: a signature's further lines are no headers and no message.
func TestSigned(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	hash := g.object("commit", "tree "+g.mktree()+"\nauthor A <a@x> 1 +0000\ncommitter B <b@x> 2 +0000\ngpgsig -----BEGIN X-----\n encoding ISO-8859-1\n \n parent 1\n -----END X-----\n\nsubject \xe5\n\nbody\n")
	c, err := g.open().Resolve(hash)
	if err != nil || c.Subject != "subject \uFFFD" || c.Message != "subject \uFFFD\n\nbody\n" || len(c.Parents) != 0 {
		t.Errorf("%+v (%v)", c, err)
	}
	merge := g.object("commit", "tree "+g.mktree()+"\nparent "+hash+"\nauthor A <a@x> 1 +0000\ncommitter B <b@x> 2 +0000\nmergetag object "+hash+"\n type commit\n tag v\n\nmerged\n")
	if c, err := g.open().Resolve(merge); err != nil || c.Message != "merged\n" || c.Parents[0] != hash {
		t.Errorf("%+v (%v)", c, err)
	}
}

// TestTags: malformed tags, and more tags on one another than anybody makes.
func TestTags(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	commit := g.commit("x")
	for _, content := range []string{"", "object " + commit[:20] + "\ntype commit\n", "type commit\nobject " + commit + "\n", "object " + commit + "\n"} {
		hash := g.object("tag", content)
		_, err := g.open().Resolve(hash)
		wantClass(t, err, ErrCorrupt, hash)
	}
	at := commit
	kind := "commit"
	for i := range 40 {
		at = g.object("tag", fmt.Sprintf("object %s\ntype %s\ntag t%d\ntagger A <a@x> 1 +0000\n\nx\n", at, kind, i))
		kind = "tag"
		c, err := g.open().Resolve(at)
		if i < maxTagDepth-1 {
			if c.Hash != commit || err != nil {
				t.Errorf("%d tags: %v", i+1, err)
			}
		} else {
			wantClass(t, err, ErrCorrupt, "too many tags")
		}
	}
	_, err := g.open().Resolve(g.object("tag", "object "+strings.Repeat("12", 20)+"\ntype commit\ntag t\n\nx\n"))
	wantClass(t, err, ErrMissingObject)
}
