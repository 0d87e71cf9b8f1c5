package revision

import (
	"bytes"
	"fmt"
	"io"
	"io/fs"
	"path"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// listed is one line of a tree as git prints it.
type listed struct {
	mode, kind, hash string
	size             int64
}

// lsTree gives the entries of a tree, folders included, by path.
func (g *gitRepo) lsTree(tree string) map[string]listed {
	g.t.Helper()
	out := map[string]listed{}
	for _, line := range split(g.tell("", "ls-tree", "-r", "-t", "-l", "-z", "--full-tree", tree)) {
		head, name, _ := strings.Cut(line, "\t")
		f := strings.Fields(head)
		size, _ := strconv.ParseInt(f[3], 10, 64)
		out[name] = listed{f[0], f[1], f[2], size}
	}
	return out
}

// blobs gives the contents of objects by one call of git cat-file.
func (g *gitRepo) blobs(hashes []string) map[string]string {
	g.t.Helper()
	slices.Sort(hashes)
	out := g.tell(strings.Join(slices.Compact(hashes), "\n")+"\n", "cat-file", "--batch") + "\n"
	found := map[string]string{}
	for out != "" {
		head, rest, _ := strings.Cut(out, "\n")
		f := strings.Fields(head)
		size, err := strconv.Atoi(f[len(f)-1])
		if err != nil {
			g.t.Fatalf("cat-file: %q", head)
		}
		found[f[0]], out = rest[:size], rest[size+1:]
	}
	return found
}

// gitMode is a mode as git writes it.
func gitMode(m fs.FileMode) string {
	switch {
	case m.IsDir():
		return "040000"
	case m&fs.ModeSymlink != 0:
		return "120000"
	case m&fs.ModeIrregular != 0:
		return "160000"
	case m&0o100 != 0:
		return "100755"
	}
	return "100644"
}

// checkTree compares a folder of a commit with what git says about it.
func checkTree(t *testing.T, g *gitRepo, r *Repo, commit, folder string) {
	t.Helper()
	fsys, err := r.Snapshot(commit, folder)
	if err != nil {
		t.Errorf("snapshot of %q in %s: %v", folder, commit, err)
		return
	}
	tree := commit + "^{tree}"
	if folder != "." {
		tree = commit + ":" + folder
	}
	want := g.lsTree(tree)
	var hashes []string
	for _, l := range want {
		if l.kind == "blob" {
			hashes = append(hashes, l.hash)
		}
	}
	contents := g.blobs(hashes)
	seen := 0
	err = fs.WalkDir(fsys, ".", func(name string, e fs.DirEntry, err error) error {
		if err != nil || name == "." {
			return err
		}
		seen++
		w, ok := want[name]
		if !ok {
			t.Errorf("%s: %q is not in git's tree", commit, name)
			return nil
		}
		info, err := e.Info()
		if err != nil {
			return err
		}
		if gitMode(info.Mode()) != w.mode || e.(Entry).Identity() != w.hash || info.(Entry).Identity() != w.hash || info.Name() != path.Base(name) {
			t.Errorf("%s: %q is %s %s, git has %s %s", commit, name, gitMode(info.Mode()), e.(Entry).Identity(), w.mode, w.hash)
		}
		if e.Type() != info.Mode().Type() || e.IsDir() != info.IsDir() || !info.ModTime().IsZero() {
			t.Errorf("%s: %q: entry and info differ", commit, name)
		}
		if w.kind == "blob" && info.Size() != w.size {
			t.Errorf("%s: %q has size %d, git says %d", commit, name, info.Size(), w.size)
		}
		switch w.mode {
		case "100644", "100755":
			checkContent(t, fsys, name, contents[w.hash])
		default:
			if data, err := fs.ReadFile(fsys, name); err == nil {
				t.Errorf("%s: %q of mode %s was read: %q", commit, name, w.mode, data)
			} else {
				wantClass(t, err, ErrNotFile)
			}
		}
		return nil
	})
	if err != nil {
		t.Errorf("walk of %s: %v", commit, err)
	}
	if seen != len(want) {
		t.Errorf("%s: %d entries, git has %d", commit, seen, len(want))
	}
}

// checkContent reads a file at once and in pieces.
func checkContent(t *testing.T, fsys fs.FS, name, want string) {
	t.Helper()
	data, err := fs.ReadFile(fsys, name)
	if err != nil || string(data) != want {
		t.Errorf("%q: read %d bytes (%v), git has %d", name, len(data), err, len(want))
	}
	f, err := fsys.Open(name)
	if err != nil {
		t.Errorf("%q: %v", name, err)
		return
	}
	defer f.Close()
	var b bytes.Buffer
	if _, err := io.CopyBuffer(struct{ io.Writer }{&b}, f, make([]byte, 777)); err != nil || b.String() != want {
		t.Errorf("%q in pieces: %d bytes (%v), git has %d", name, b.Len(), err, len(want))
	}
}

// checkCommits compares the fields of commits. Where the text is not UTF-8 git
// prints the bytes as they are and this package U+FFFD.
func checkCommits(t *testing.T, g *gitRepo, r *Repo, hashes []string) {
	t.Helper()
	format := "%x01%H%x00%T%x00%P%x00%an%x00%ae%x00%ad%x00%cn%x00%ce%x00%cd%x00%s%x00%B"
	out := g.tell(strings.Join(hashes, "\n")+"\n", "log", "--no-walk", "--stdin", "--encoding=UTF-8", "--date=raw", "--format="+format)
	records := strings.Split(out, "\x01")[1:]
	if len(records) != len(hashes) {
		t.Fatalf("git gave %d commits of %d", len(records), len(hashes))
	}
	for _, record := range records {
		want := strings.Split(strings.ToValidUTF8(record, "\uFFFD"), "\x00")
		c, err := r.Resolve(want[0])
		if err != nil {
			t.Errorf("commit %s: %v", want[0], err)
			continue
		}
		got := []string{
			c.Hash, c.Tree, strings.Join(c.Parents, " "), c.Author.Name, c.Author.Email, rawDate(c.Author),
			c.Committer.Name, c.Committer.Email, rawDate(c.Committer), c.Subject, c.Message,
		}
		for i := range want {
			if strings.TrimRight(got[i], "\n") != strings.TrimRight(want[i], "\n") {
				t.Errorf("commit %s, field %d: %q, git has %q", c.Hash, i, got[i], want[i])
			}
		}
	}
}

func rawDate(p Person) string { return fmt.Sprintf("%d %s", p.When.Unix(), p.When.Format("-0700")) }

// gitResolve asks git which commits some names mean; "" for those that mean none.
func (g *gitRepo) gitResolve(names []string) []string {
	g.t.Helper()
	var out []string
	for len(out) < len(names) {
		left := names[len(out):]
		answer, err := g.run(strings.Join(left, "^{commit}\n")+"^{commit}\n", "cat-file", "--batch-check=:%(objectname)")
		answers := lines(answer)
		if err == nil && len(answers) != len(left) || len(answers) > len(left) {
			g.t.Fatalf("git gave %d answers to %d names", len(answers), len(left))
		}
		for _, line := range answers {
			hash, found := strings.CutPrefix(line, ":")
			if !found {
				hash = ""
			}
			out = append(out, hash)
		}
		if err != nil && len(answers) < len(left) {
			// git gives up at a reflog that is too short: ask for that name alone.
			hash, err := g.try("rev-parse", "--quiet", "--verify", names[len(out)]+"^{commit}")
			if err != nil {
				hash = ""
			}
			out = append(out, hash)
		}
	}
	return out
}

// checkResolve compares what names mean. What means no commit to git must be an
// error here.
func checkResolve(t *testing.T, g *gitRepo, r *Repo, names []string) {
	t.Helper()
	for i, want := range g.gitResolve(names) {
		c, err := r.Resolve(names[i])
		if c.Hash != want || (err == nil) != (want != "") {
			t.Errorf("%q is %q (%v), git has %q", names[i], c.Hash, err, want)
		}
	}
}

// checkBetween compares the commits between two, as a set, and checks that
// children come before their parents.
func checkBetween(t *testing.T, g *gitRepo, r *Repo, base, target string) {
	t.Helper()
	commits, complete, err := r.Between(t.Context(), base, target)
	if err != nil || !complete {
		t.Errorf("between %s and %s: %v, complete %v", base, target, err, complete)
		return
	}
	checkOrder(t, commits)
	var got []string
	for _, c := range commits {
		got = append(got, c.Hash)
	}
	want := lines(g.tell("", "rev-list", base+".."+target))
	slices.Sort(got)
	slices.Sort(want)
	if !slices.Equal(got, want) {
		t.Errorf("between %s and %s:\n got %v\nwant %v", base, target, got, want)
	}
}

func checkOrder(t *testing.T, commits []Commit) {
	t.Helper()
	given := map[string]bool{}
	for _, c := range commits {
		if given[c.Hash] {
			t.Errorf("commit %s comes twice", c.Hash)
		}
		given[c.Hash] = true
		for _, p := range c.Parents {
			if given[p] {
				t.Errorf("commit %s comes after its parent %s", c.Hash, p)
			}
		}
	}
}

func checkAncestor(t *testing.T, g *gitRepo, r *Repo, base, target string) {
	t.Helper()
	got, err := r.IsAncestor(t.Context(), base, target)
	_, status := g.told("", "merge-base", "--is-ancestor", base, target)
	if want := status == 0; got != want || err != nil {
		t.Errorf("%s is an ancestor of %s: %v (%v), git says %v", base, target, got, err, want)
	}
}

// checkAll compares a repository that is laid out in some way: every commit and
// its files, every reference, and some walks.
func checkAll(t *testing.T, g *gitRepo, r *Repo) {
	t.Helper()
	all := lines(g.git("rev-list", "--all"))
	if len(all) < 5 {
		t.Fatalf("%d commits are no test", len(all))
	}
	checkCommits(t, g, r, all)
	some := g.gitResolve([]string{"v1", "main", "main~2"})
	first, tip := some[0], some[1]
	checkTree(t, g, r, tip, ".")
	checkTree(t, g, r, some[2], "network")
	names := lines(g.git("for-each-ref", "--format=%(refname)"))
	names = append(names, "HEAD", "main", "v1-again", "main~3", "main^2", all[2][:12], "none")
	checkResolve(t, g, r, names)
	checkBetween(t, g, r, first, tip)
	checkBetween(t, g, r, tip, first)
	checkAncestor(t, g, r, first, tip)
	checkAncestor(t, g, r, tip, first)
}
