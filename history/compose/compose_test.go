package compose

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
)

var (
	ada  = Person{"Ada Tern", "a.tern@fernway.example"}
	bo   = Person{"Bo Ødegård", "b.odegard@fernway.example"}
	noon = time.Date(2026, 1, 5, 12, 0, 0, 0, time.UTC)
)

// sample has a branch and a merge, nested folders whose order is not that of
// their names, an empty file, and two tags.
func sample() []Commit {
	base := map[string]string{
		"a/x.csv": "1\n", "a.csv": "before the folder a\n", "a0": "after it\n", "empty": "", "bytes": "\x00\xff\r\nno end", "Vägar/smal bro.csv": "ö\n",
		"deep/er/still/x": "x\n", ".gitignore": "*.tmp\n",
	}
	with := func(name, content string) map[string]string {
		out := map[string]string{name: content}
		for k, v := range base {
			if k != name {
				out[k] = v
			}
		}
		return out
	}
	west := time.FixedZone("", -5*3600)
	return []Commit{
		{Files: base, Author: ada, When: noon, Message: "Start\n", Tag: "v1", TagText: "First\n"},
		{Parents: []int{0}, Files: with("a/x.csv", "2\n"), Author: bo, Committer: ada, When: noon.Add(time.Hour).In(west), Message: "Change\n\nBody.\n"},
		{Parents: []int{0}, Files: with("new", "n\n"), Author: bo, When: noon.Add(2 * time.Hour), Message: "Side\n"},
		{Parents: []int{1, 2}, Files: map[string]string{"a": "a folder before\n"}, Author: ada, When: noon.Add(3 * time.Hour), Message: "Merge\n", Tag: "v2", TagText: "Second\n\nwith text\n"},
	}
}

// userConfig is the file of the user's settings that git sees.
var userConfig = os.DevNull

// runGit asks the git program about a repository, without anybody's settings
// but those.
func runGit(t testing.TB, dir string, args ...string) string {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal("the git program is needed here")
		}
		t.Skip("no git program on this machine")
	}
	c := exec.Command("git", args...)
	c.Dir = dir
	c.Env = []string{"PATH=" + os.Getenv("PATH"), "HOME=" + dir, "GIT_CONFIG_NOSYSTEM=1", "GIT_CONFIG_GLOBAL=" + userConfig, "LC_ALL=C"}
	out, err := c.CombinedOutput()
	if err != nil {
		t.Fatalf("git %s: %v\n%s", strings.Join(args, " "), err, out)
	}
	return strings.TrimSuffix(string(out), "\n")
}

func write(t testing.TB, history []Commit) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "new", "repository")
	if err := Write(t.Context(), dir, history); err != nil {
		t.Fatal(err)
	}
	return dir
}

func TestWrite(t *testing.T) {
	dir := write(t, sample())
	if out := runGit(t, dir, "fsck", "--strict", "--full"); out != "" {
		t.Errorf("fsck: %s", out)
	}
	if out := runGit(t, dir, "status", "--porcelain", "--ignored"); out != "" {
		t.Errorf("status: %s", out)
	}
	if out := runGit(t, dir, "branch", "--show-current"); out != Branch {
		t.Errorf("branch %q", out)
	}
	if out := runGit(t, dir, "for-each-ref", "--format=%(refname) %(objecttype)"); out != "refs/heads/main commit\nrefs/tags/v1 tag\nrefs/tags/v2 tag" {
		t.Errorf("references:\n%s", out)
	}
	if out := runGit(t, dir, "for-each-ref", "--format=%(tag)|%(*subject)|%(contents)|%(taggername)|%(taggerdate:raw)", "refs/tags/"); out !=
		"v1|Start|First\n|Ada Tern|1767614400 +0000\nv2|Merge|Second\n\nwith text\n|Ada Tern|1767625200 +0000" {
		t.Errorf("tags:\n%s", out)
	}
	want := strings.Join([]string{
		"Merge|Change Side|Ada Tern <a.tern@fernway.example> 1767625200 +0000|Ada Tern <a.tern@fernway.example> 1767625200 +0000",
		"Side|Start|Bo Ødegård <b.odegard@fernway.example> 1767621600 +0000|Bo Ødegård <b.odegard@fernway.example> 1767621600 +0000",
		"Change|Start|Bo Ødegård <b.odegard@fernway.example> 1767618000 -0500|Ada Tern <a.tern@fernway.example> 1767618000 -0500",
		"Start||Ada Tern <a.tern@fernway.example> 1767614400 +0000|Ada Tern <a.tern@fernway.example> 1767614400 +0000",
	}, "\n")
	out := runGit(t, dir, "log", "--date-order", "--date=raw", "--format=%s|%P|%an <%ae> %ad|%cn <%ce> %cd")
	for _, subject := range []string{"Start", "Change", "Side"} {
		hash := runGit(t, dir, "log", "--format=%H", "--grep=^"+subject+"$")
		out = strings.ReplaceAll(out, hash, subject)
	}
	if out != want {
		t.Errorf("log:\n%s\nwant\n%s", out, want)
	}
	if out := runGit(t, dir, "log", "-1", "--format=%B", "v2~1"); out != "Change\n\nBody.\n" {
		t.Errorf("message %q", out)
	}
}

// TestFiles compares the files of each commit, and of the checkout.
func TestFiles(t *testing.T) {
	history := sample()
	dir := write(t, history)
	for i, rev := range []string{"v1", "v2^1", "v2^2", "v2"} {
		var names []string
		for name, content := range history[i].Files {
			names = append(names, name)
			if got := runGit(t, dir, "cat-file", "blob", rev+":"+name); got != strings.TrimSuffix(content, "\n") {
				t.Errorf("%s of %s: %q, want %q", name, rev, got, content)
			}
		}
		slices.Sort(names)
		got := strings.Split(strings.TrimSuffix(runGit(t, dir, "ls-tree", "-r", "-z", "--name-only", rev), "\x00"), "\x00")
		slices.Sort(got)
		if !slices.Equal(got, names) {
			t.Errorf("%s has %q, want %q", rev, got, names)
		}
		if modes := runGit(t, dir, "ls-tree", "-r", "--format=%(objectmode)", rev); strings.Trim(strings.ReplaceAll(modes, "100644", ""), "\n") != "" {
			t.Errorf("%s has the modes %s", rev, modes)
		}
	}
	if data, err := os.ReadFile(filepath.Join(dir, "a")); string(data) != "a folder before\n" || err != nil {
		t.Errorf("checkout: %q, %v", data, err)
	}
	checkFiles(t, dir, "a")
}

// checkFiles has what lies in a folder besides .git.
func checkFiles(t testing.TB, dir string, want ...string) {
	t.Helper()
	var got []string
	entries, err := os.ReadDir(dir)
	for _, e := range entries {
		if e.Name() != ".git" {
			got = append(got, e.Name())
		}
	}
	if err != nil || !slices.Equal(got, want) {
		t.Errorf("%s holds %q (%v), want %q", dir, got, err, want)
	}
}

// TestSame: the same history has the same hashes, wherever and whenever it is
// written and whatever the user has set. The hash is pinned: every machine must
// get it.
func TestSame(t *testing.T) {
	const tip = "cdf1b21f89d9268a5ae7e0ee7e7ea15c58c23581"
	for i := range 3 {
		if i == 2 {
			home := t.TempDir()
			settings := "[core]\n\tautocrlf = true\n\teol = crlf\n[init]\n\tdefaultBranch = other\n[user]\n\tname = Somebody\n\temail = s@fernway.example\n[commit]\n\tgpgSign = true\n"
			if err := os.WriteFile(filepath.Join(home, ".gitconfig"), []byte(settings), 0o644); err != nil {
				t.Fatal(err)
			}
			userConfig = filepath.Join(home, ".gitconfig")
			defer func() { userConfig = os.DevNull }()
			t.Setenv("HOME", home)
			t.Setenv("XDG_CONFIG_HOME", home)
			t.Setenv("TZ", "Asia/Kathmandu")
		}
		history := sample()
		history[3].Files = map[string]string{"lines.csv": "1\n2\r\n3\n"}
		dir := write(t, history)
		if got := runGit(t, dir, "rev-parse", "HEAD"); got != tip {
			t.Errorf("round %d: %s, want %s", i, got, tip)
		}
		if data, err := os.ReadFile(filepath.Join(dir, "lines.csv")); string(data) != "1\n2\r\n3\n" || err != nil {
			t.Errorf("round %d: the checkout has %q (%v)", i, data, err)
		}
		if out := runGit(t, dir, "status", "--porcelain"); out != "" {
			t.Errorf("round %d: status %s", i, out)
		}
	}
}

// TestFolders: a folder that is there and empty is used; one that holds anything
// is refused and left as it is.
func TestFolders(t *testing.T) {
	dir := t.TempDir()
	if err := Write(t.Context(), dir, sample()); err != nil {
		t.Errorf("an empty folder: %v", err)
	}
	if err := Write(t.Context(), dir, sample()); !errors.Is(err, ErrNotEmpty) {
		t.Errorf("twice: %v", err)
	}
	if out := runGit(t, dir, "status", "--porcelain"); out != "" {
		t.Errorf("after the refusal: %s", out)
	}
	for _, name := range []string{"file", ".hidden"} {
		dir := t.TempDir()
		if err := os.WriteFile(filepath.Join(dir, name), []byte("mine\n"), 0o600); err != nil {
			t.Fatal(err)
		}
		if err := Write(t.Context(), dir, sample()); !errors.Is(err, ErrNotEmpty) {
			t.Errorf("a folder with %s: %v", name, err)
		}
		entries, err := os.ReadDir(dir)
		if len(entries) != 1 || err != nil {
			t.Errorf("the folder holds %v (%v)", entries, err)
		}
		if data, err := os.ReadFile(filepath.Join(dir, name)); string(data) != "mine\n" || err != nil {
			t.Errorf("%s holds %q (%v)", name, data, err)
		}
	}
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, []byte("mine\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := Write(t.Context(), file, sample()); err == nil || errors.Is(err, ErrNotEmpty) {
		t.Errorf("a file: %v", err)
	}
	if data, _ := os.ReadFile(file); string(data) != "mine\n" {
		t.Errorf("the file holds %q", data)
	}
}

// stopAfter is a context that ends when it has been asked some times.
type stopAfter struct {
	context.Context
	left int
}

func (s *stopAfter) Err() error {
	if s.left--; s.left < 0 {
		return context.Canceled
	}
	return nil
}

// TestRemoved: what was written is removed again when something fails; an empty
// folder that was there stays.
func TestRemoved(t *testing.T) {
	for n := range len(sample()) {
		top := t.TempDir()
		dir := filepath.Join(top, "above", "new")
		if err := Write(&stopAfter{t.Context(), n}, dir, sample()); !errors.Is(err, context.Canceled) {
			t.Errorf("stopped at commit %d: %v", n, err)
		}
		if entries, err := os.ReadDir(top); len(entries) != 0 || err != nil {
			t.Errorf("stopped at commit %d: left behind %v (%v)", n, entries, err)
		}
		if err := os.MkdirAll(dir, 0o755); err != nil {
			t.Fatal(err)
		}
		if err := Write(&stopAfter{t.Context(), n}, dir, sample()); !errors.Is(err, context.Canceled) {
			t.Errorf("stopped at commit %d: %v", n, err)
		}
		if entries, err := os.ReadDir(dir); len(entries) != 0 || err != nil {
			t.Errorf("stopped at commit %d: left behind %v (%v)", n, entries, err)
		}
	}
}

// TestOctopus has more parents than two, in the order given.
func TestOctopus(t *testing.T) {
	var history []Commit
	var parents []int
	for i := range 5 {
		history = append(history, Commit{Files: map[string]string{"f": fmt.Sprint(i)}, Author: ada, When: noon, Message: fmt.Sprintf("%d\n", i), Tag: fmt.Sprintf("t%d", i), TagText: "t\n"})
		parents = append([]int{i}, parents...)
	}
	history = append(history, Commit{Parents: parents, Files: map[string]string{}, Author: ada, When: noon, Message: "all\n"})
	dir := write(t, history)
	for i := range 5 {
		if a, b := runGit(t, dir, "rev-parse", fmt.Sprintf("HEAD^%d", i+1)), runGit(t, dir, "rev-parse", fmt.Sprintf("t%d^{commit}", 4-i)); a != b {
			t.Errorf("parent %d is %s, want %s", i+1, a, b)
		}
	}
	if out := runGit(t, dir, "fsck", "--strict"); out != "" {
		t.Errorf("fsck: %s", out)
	}
	checkFiles(t, dir)
}

// TestRefused has the histories that no repository can hold. Each is refused
// with what is wrong, and nothing of it is left, nor of the folders above.
func TestRefused(t *testing.T) {
	commit := func(files map[string]string, parents ...int) Commit {
		return Commit{Parents: parents, Files: files, Author: ada, When: noon, Message: "x\n"}
	}
	for name, c := range map[string]struct {
		history []Commit
		part    string
	}{
		"no commit":                 {nil, "no commit"},
		"its own parent":            {[]Commit{commit(nil, 0)}, "commit 0: parent 0"},
		"a later parent":            {[]Commit{commit(nil), commit(nil, 2), commit(nil)}, "commit 1: parent 2"},
		"a parent beyond the end":   {[]Commit{commit(nil), commit(nil, 0, 7)}, "commit 1: parent 7"},
		"a negative parent":         {[]Commit{commit(nil), commit(nil, -1)}, "commit 1: parent -1"},
		"a file and a folder":       {[]Commit{commit(nil), commit(map[string]string{"a": "", "a/b": ""})}, `commit 1: "a" is to be a file`},
		"the same further down":     {[]Commit{commit(map[string]string{"x/a": "", "x/a/b/c": "", "x/a.csv": ""})}, `"x/a" is to be a file`},
		"no name":                   {[]Commit{commit(map[string]string{"": ""})}, `""`},
		"a path out of the folder":  {[]Commit{commit(map[string]string{"../x": ""})}, `"../x"`},
		"an absolute path":          {[]Commit{commit(map[string]string{"/x": ""})}, `"/x"`},
		"a path with an empty part": {[]Commit{commit(map[string]string{"x//y": ""})}, `"x//y"`},
		"the folder itself":         {[]Commit{commit(map[string]string{".": ""})}, `"."`},
		"a zero byte":               {[]Commit{commit(map[string]string{"a\x00b": ""})}, `"a\x00b"`},
		"a file of the git folder":  {[]Commit{commit(map[string]string{"x/.Git/config": ""})}, `"x/.Git/config"`},
		"a path that is not UTF-8":  {[]Commit{commit(map[string]string{"v\xe4g": ""})}, `"v\xe4g"`},
	} {
		t.Run(name, func(t *testing.T) {
			top := t.TempDir()
			err := Write(t.Context(), filepath.Join(top, "new", "repository"), c.history)
			if !errors.Is(err, ErrHistory) || !strings.Contains(err.Error(), c.part) {
				t.Errorf("error %v, want one that says %q", err, c.part)
			}
			if entries, err := os.ReadDir(top); len(entries) != 0 || err != nil {
				t.Errorf("left behind: %v (%v)", entries, err)
			}
			if err := Write(t.Context(), top, c.history); !errors.Is(err, ErrHistory) {
				t.Errorf("into an empty folder: %v", err)
			}
			if entries, err := os.ReadDir(top); len(entries) != 0 || err != nil {
				t.Errorf("left behind in an empty folder: %v (%v)", entries, err)
			}
		})
	}
}
