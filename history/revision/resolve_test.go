package revision

import (
	"crypto/sha1"
	"encoding/hex"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// TestResolve checks gitrevisions(7) against git itself: what git takes must mean
// the same here, what it refuses must be refused.
func TestResolve(t *testing.T) {
	t.Parallel()
	g := sample(t)
	main, old := g.git("rev-parse", "main"), g.git("rev-parse", "main~4")
	// A branch whose name is a whole hash, which git takes for the hash.
	g.git("update-ref", "refs/heads/"+old, "side")
	g.git("update-ref", "refs/heads/name.with-gdeadbeef", "side")
	g.git("update-ref", "ORIG_HEAD", "side")
	g.write(".git/FETCH_HEAD", old+"\tnot-for-merge\tbranch 'x' of somewhere\n"+main+"\t\tbranch 'y' of somewhere\n")
	tag := g.git("rev-parse", "v1")

	names := []string{
		"HEAD", "@", "main", "heads/main", "refs/heads/main", "topic/deep", "v1", "tags/v1", "refs/tags/v1", "v1-again", "light",
		"origin", "origin/main", "origin/only-there", "remotes/origin/main", "refs/remotes/origin/HEAD", "refs/notes/other", "notes/other",
		"HEAD~", "HEAD^", "HEAD~0", "HEAD^0", "HEAD~2", "HEAD~02", "HEAD^^", "HEAD^1", "HEAD~3^2", "main~3^3", "main~3^4", "main~2^3~1", "@~1", "@^",
		"HEAD~4", "HEAD~9", "HEAD~10", "main^{}", "v1^{}", "v1^{commit}", "v1-again^{}", "v1-again^{commit}~1", "v1~1", "v1^", "v1^{object}", "main^{commit}^{}",
		main, strings.ToUpper(main), main + "~1", main[:39], main[:12], strings.ToUpper(main[:12]), main[:4], old, old[:8],
		tag, tag[:10], tag + "^{commit}", tag[:10] + "~1",
		"v1-3-g" + main[:9], "anything-0-g" + old[:9] + "~1", "v1-g" + main[:9], "name.with-gdeadbeef",
		"ORIG_HEAD", "FETCH_HEAD", "FETCH_HEAD~1",
		// What names no commit.
		"a-tree", "a-blob", "light-blob", "main^{tree}", "main:network", "main:network/speed.csv", g.git("rev-parse", "main^{tree}"),
		g.git("rev-parse", "main^{tree}")[:10], g.git("rev-parse", "main:network/speed.csv"), "a-tree^{}", "a-tree~1",
		"nothing", "nothing~1", "refs/heads/nothing", "main~x", "main^x", "main^{x}", "main^{commit", "main~99999999999999999999", "main^-2",
		"0000000000000000000000000000000000000000", strings.Repeat("f", 40), strings.Repeat("f", 39), strings.Repeat("f", 41), "abc", "main/", "/main",
		"./main", "main/../main", "heads/../heads/main", "refs/heads", "refs", "heads", "topic", "main.lock", "ma in", "main\x01", "main*", "HEAD@",
		"^main", "~", "^", "~1", "^{}", "@@", "@{", "main@{", "..", "main..side", "main...side", "main^@", "main^!", "main~1~", "main^{}x", "main~1x",
		"config", "index", "description", "hooks", "objects", "logs/HEAD", "head", "Main",
	}
	checkResolve(t, g, g.open(), names)

	// A folder of the git folder must not be read as a reference by any spelling.
	r := g.open()
	for _, name := range []string{"../.git/HEAD", "refs/../HEAD", "refs/heads/../../HEAD", `refs\heads\main`, "refs/heads/main\x00", "./HEAD"} {
		_, err := r.Resolve(name)
		wantClass(t, err, ErrUnknown)
	}
}

// TestResolveFull has every commit found by its whole hash, by ten digits of it,
// and by its parents' numbers.
func TestResolveFull(t *testing.T) {
	t.Parallel()
	g := shared(t, false)
	var names []string
	for _, line := range lines(g.git("rev-list", "--all", "--parents")) {
		f := strings.Fields(line)
		names = append(names, f[0], f[0][:10], f[0]+"^0", fmt.Sprintf("%s^%d", f[0], len(f)))
		for i := range f[1:] {
			names = append(names, fmt.Sprintf("%s^%d", f[0], i+1), fmt.Sprintf("%s^%d~1", f[0][:12], i+1))
		}
	}
	checkResolve(t, g, g.open(), names)
	packed := shared(t, true)
	checkResolve(t, packed, packed.open(), names)
}

// TestResolveErrors has the class and the text of each refusal.
func TestResolveErrors(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	r := g.open()
	tree := g.git("rev-parse", "main^{tree}")
	for _, c := range []struct {
		rev   string
		class error
		parts []string
	}{
		{"", ErrUnknown, []string{`""`}},
		{"nothing", ErrUnknown, []string{`"nothing"`, "hint: name a branch"}},
		{"--upload-pack=x", ErrUnknown, []string{"--upload-pack=x"}},
		{strings.Repeat("x", 5000), ErrUnknown, nil},
		{strings.Repeat("e", 40), ErrUnknown, []string{"no such object"}},
		{"main~100", ErrUnknown, []string{`"main~100"`, "has 0 parents"}},
		{"main^7", ErrUnknown, []string{"has 1 parents"}},
		{"~2", ErrUnknown, []string{"nothing stands before"}},
		{"main^{tree}", ErrUnknown, []string{"^{tree}", "^{commit}"}},
		{"main^{/Merge}", ErrUnknown, []string{"does not lead to a commit"}},
		{":/Merge", ErrUnknown, nil},
		{"main@{yesterday}", ErrUnknown, []string{"not supported", "@{upstream}"}},
		{"main@{push}", ErrUnknown, []string{"not supported"}},
		{"main:network/speed.csv", ErrUnknown, nil},
		{"v1..v2", ErrUnknown, nil},
		{"v1^{tag}", ErrUnknown, []string{"^{tag}"}},                        // git takes it, as it goes on to the commit
		{"-3-g" + g.git("rev-parse", "--short=9", "main"), ErrUnknown, nil}, // likewise
		{"a-tree", ErrNotCommit, []string{`"a-tree"`, "is a tree"}},
		{"a-blob~1", ErrNotCommit, []string{"is a blob"}},
		{"light-blob", ErrNotCommit, []string{"is a blob"}},
		{tree, ErrNotCommit, []string{tree, "is a tree"}},
		{tree[:12], ErrNotCommit, []string{tree, "not a commit"}},
	} {
		_, err := r.Resolve(c.rev)
		t.Run(c.rev[:min(len(c.rev), 40)], func(t *testing.T) { wantClass(t, err, c.class, c.parts...) })
	}
}

// TestResolveAmbiguous makes objects that begin with the same four digits.
func TestResolveAmbiguous(t *testing.T) {
	t.Parallel()
	g := sample(t)
	first := g.git("rev-parse", "main")
	tree := g.git("rev-parse", "main^{tree}")

	// A blob with the digits of a commit: git takes the commit, as only that fits.
	blob := search(t, first[:4], "blob", "blob ")
	g.object("blob", blob)
	checkResolve(t, g, g.open(), []string{first[:4], first[:4] + "~1", "x-1-g" + first[:4]})

	// A second commit: ambiguous, until there are more digits.
	commit := search(t, first[:4], "commit",
		"tree "+tree+"\nauthor A <a@fernway.example> 1767000000 +0000\ncommitter A <a@fernway.example> 1767000000 +0000\n\n")
	second := g.object("commit", commit)
	r := g.open()
	checkResolve(t, g, r, []string{first[:4], second, first})
	both := []string{first, second}
	slices.Sort(both)
	_, err := r.Resolve(first[:4])
	wantClass(t, err, ErrAmbiguous, first[:4], strings.Join(both, ", "), "write more digits")
	g.git("repack", "-ad", "--quiet") // one of the two is packed now, the other loose
	_, err = g.open().Resolve(strings.ToUpper(first[:4]))
	wantClass(t, err, ErrAmbiguous)
	var longer []string
	for n := 4; n <= 40; n++ {
		if both[0][:n] != both[1][:n] {
			longer = append(longer, both[0][:n], both[1][:n])
		}
	}
	checkResolve(t, g, r, longer)

	// Only a blob and a tree have these digits.
	data := search(t, tree[:4], "blob", "another ")
	g.object("blob", data)
	_, err = r.Resolve(tree[:4])
	wantClass(t, err, ErrNotCommit, tree[:4])
}

// search gives the first content, a text with a number behind it, whose hash
// begins with four digits.
func search(t *testing.T, digits, kind, text string) string {
	t.Helper()
	want, err := hex.DecodeString(digits)
	if err != nil {
		t.Fatal(err)
	}
	const least = 10_000_000 // all numbers have eight digits
	object := fmt.Appendf(nil, "%s %d\x00%s", kind, len(text)+9, text)
	head := len(object)
	for n := least; n < 2*least; n++ {
		object = append(strconv.AppendInt(object[:head], int64(n), 10), '\n')
		if sum := sha1.Sum(object); sum[0] == want[0] && sum[1] == want[1] {
			return fmt.Sprintf("%s%d\n", text, n)
		}
	}
	t.Fatal("no object found")
	return ""
}

// TestResolveTagAndBranch: a name on two different commits is refused, where git
// warns and takes the tag.
func TestResolveTagAndBranch(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("branch", "v1", "side")
	g.git("tag", "same", "main")
	g.git("branch", "same", "main")
	g.git("tag", "-a", "-m", "annotated", "main", "main")
	r := g.open()
	_, err := r.Resolve("v1~1")
	wantClass(t, err, ErrAmbiguous, `"v1~1"`, "refs/tags/v1, refs/heads/v1", "write the full name")
	checkResolve(t, g, r, []string{"tags/v1", "heads/v1", "refs/tags/v1", "same", "main", "same~1"})

	// HEAD is a full name already, so to write the full name is no way out.
	g.git("update-ref", "refs/heads/HEAD", "side")
	g.git("update-ref", "refs/heads/refs/tags/light", "side")
	for name, other := range map[string]string{"HEAD": "refs/heads/HEAD", "@": "refs/heads/HEAD", "refs/tags/light": "refs/heads/refs/tags/light"} {
		_, err := r.Resolve(name)
		wantClass(t, err, ErrAmbiguous, `"`+name+`"`, "write "+other, "the hash of its commit", "rename "+other)
		checkResolve(t, g, r, []string{other})
	}
}

// TestResolveNameOrHash: a name that is the hash of another commit, abbreviated or
// as git describe has it, is refused, where git takes the name and says little.
func TestResolveNameOrHash(t *testing.T) {
	t.Parallel()
	g := sample(t)
	main, old, tag := g.git("rev-parse", "main"), g.git("rev-parse", "main~4"), g.git("rev-parse", "v1")
	odd := strings.ToUpper(old[:8])
	described, annotated := "v1-3-g"+old[:9], tag[:10]
	g.git("branch", old[:7], "side")
	g.git("tag", odd, "side")
	g.git("tag", described, "side")
	g.git("tag", annotated, "side")
	g.git("branch", main[:6], "main")           // the same commit both ways
	g.git("tag", "v1-0-g"+main[:7], "main")     // so
	g.git("branch", "deadbeefdeadbeef", "side") // no commit has it
	g.git("branch", "fix-g"+old[:7], "side")    // not what git describe writes
	g.git("branch", old[:3], "side")            // too short for a hash
	g.git("branch", old[:9]+"x", "side")
	g.git("update-ref", "refs/heads/"+old, "side")
	tree := g.git("rev-parse", "main^{tree}")
	g.git("branch", tree[:12], "side") // a tree is no commit
	r := g.open()
	for name, hash := range map[string]string{old[:7]: old, odd: old, described: old, annotated: tag} {
		for _, rev := range []string{name, name + "~1", name + "^{commit}"} {
			_, err := r.Resolve(rev)
			wantClass(t, err, ErrAmbiguous, `"`+rev+`"`, g.git("rev-parse", "side"), hash, "write the full name")
		}
	}
	checkResolve(t, g, r, []string{
		"refs/heads/" + old[:7], "heads/" + old[:7], "refs/tags/" + described, old[:10], old, main[:6], "v1-0-g" + main[:7], "deadbeefdeadbeef",
		"fix-g" + old[:7], old[:3], old[:9] + "x", tree[:12],
	})
}

// TestResolveReflog checks NAME@{N}, @{-N} and @{upstream} against git.
func TestResolveReflog(t *testing.T) {
	t.Parallel()
	origin := sample(t)
	g := origin.at(tempDir(t))
	g.git("clone", "--quiet", origin.dir, ".")
	g.git("checkout", "--quiet", "-b", "work", "--track", "origin/side")
	g.git("commit", "--quiet", "--allow-empty", "-m", "one")
	g.git("commit", "--quiet", "--allow-empty", "-m", "two")
	g.git("checkout", "--quiet", "--detach", "v1")
	g.git("checkout", "--quiet", "main")
	g.git("checkout", "--quiet", "-b", "gone")
	g.git("checkout", "--quiet", "work")
	g.git("checkout", "--quiet", "-b", "local", "--track", "main")
	g.git("branch", "--quiet", "-D", "gone")
	g.git("config", "branch.lost.merge", "refs/heads/lost")
	g.git("config", "branch.lost.remote", "origin")
	g.git("branch", "--no-track", "lost", "main")
	g.git("branch", "--no-track", "free", "main")
	names := []string{
		"HEAD@{0}", "HEAD@{1}", "HEAD@{2}", "HEAD@{3}~1", "@{0}", "@{1}", "work@{0}", "work@{1}", "work@{2}", "work@{3}", "work@{99}",
		"refs/heads/work@{1}", "heads/work@{1}", "@{-1}", "@{-2}", "@{-3}", "@{-4}", "@{-1}~1", "@{-40}", "HEAD@{-1}", "work@{-1}",
		"@{u}", "@{upstream}", "@{UPSTREAM}", "work@{u}", "work@{upstream}~1", "main@{u}", "HEAD@{u}", "local@{u}", "free@{u}", "lost@{u}", "nothing@{u}",
		"nothing@{0}", "origin/main@{u}", "@{}", "@{-0}",
	}
	r := g.open()
	checkResolve(t, g, r, names)
	// A reference without a reflog: versions of git differ here.
	a, errA := r.Resolve("v1@{0}")
	b, errB := r.Resolve("v1")
	if a.Hash != b.Hash || errA != nil || errB != nil {
		t.Errorf("v1@{0} is %q (%v), v1 %q (%v)", a.Hash, errA, b.Hash, errB)
	}
	// A reflog whose beginning was cut off still knows what came before.
	log := readFile(t, g.path(".git/logs/refs/heads/work"))
	_, cut, _ := strings.Cut(log, "\n")
	g.write(".git/logs/refs/heads/work", cut)
	checkResolve(t, g, g.open(), []string{"work@{0}", "work@{1}", "work@{2}", "work@{3}"})
	g.write(".git/logs/refs/heads/work", "rubbish\n")
	_, err := g.open().Resolve("work@{1}")
	wantClass(t, err, ErrCorrupt, "reflog", "refs/heads/work")
	g.git("checkout", "--quiet", "--detach")
	checkResolve(t, g, g.open(), []string{"@{0}", "@{1}", "@{u}", "HEAD@{u}", "@{-1}"})
}

// TestResolveWorktree: HEAD and some references belong to one worktree.
func TestResolveWorktree(t *testing.T) {
	t.Parallel()
	g := sample(t)
	linked := g.at(tempDir(t) + "/linked")
	g.git("worktree", "add", "--quiet", "-b", "there", linked.dir, "side")
	linked.git("update-ref", "refs/worktree/mine", "v1")
	linked.git("update-ref", "refs/bisect/bad", "v1")
	g.git("update-ref", "refs/worktree/mine", "v2")
	names := []string{"HEAD", "HEAD~1", "there", "refs/worktree/mine", "worktree/mine", "refs/bisect/bad", "main", "v1", "@{0}"}
	checkResolve(t, linked, linked.open(), names)
	checkResolve(t, g, g.open(), names)
	if a, b := linked.open().CommonDir(), g.open().CommonDir(); a != b || a != g.path(".git") {
		t.Errorf("common folders %q and %q", a, b)
	}
}
