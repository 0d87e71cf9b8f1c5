package revision

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// ignoreLines are lines of an ignore file: each form of gitignore(5), and what
// people and accidents write.
var ignoreLines = []string{
	"*.csv", "!a.csv", "/a.csv", "a", "a/", "/a/", "a/b", "a/*", "a/**", "**/a", "**/a/b", "a/**/b", "a/**/b.csv", "**", "*", "/*", "/**", "**/", "*/",
	"*/b", "*/*", "a*b", "a?b", "?", "??", "[ab]", "[!ab]", "[^ab]*", "[a-c]*", "[a-]", "[]a]", "[!]a]", "[[:alpha:]]", "[[:digit:]x]*", "[[:nope:]]", "[[:space:]]",
	"[[:upper:]]", "[a", "[", "]", "a[", "a]b", "[z-a]", "[\\]]", "[\\a-c]", "[a-\\c]", "[[a]", "[[:alpha:]", "[-a]", "[a-c-e]", "[a\\-c]",
	"\\#a", "#a", "\\!a", "!", "!!a", "\\ a", "a\\ ", "a\\  ", "a ", "a   ", " a", "a\t", "\\a", "a\\", "a\\b", "\\\\", "\\*", "a\\*", "*\\", "\\",
	"", " ", "/", "//", "//a", "a//b", "a//", ".", "..", "./a", "../a", "./", "a/.", "a/..", ".*", "*.", "*.*", "**.csv", "a**", "a**b", "***", "**a", "a/***/b", "**/**/a",
	"**/b/**", "/**/b", "a/**/", "*a**/b", "**b/a", "*/**/b", "**/*", "é", "[é]", "?.csv", "a\r", "a/\r", "A", "*.CSV", "a,b", "a.csv/", "!a/", "!/a/b",
}

var ignoreNames = []string{
	"a", "b", "c", "e", "A", "a.csv", "b.csv", "A.CSV", "ab", "axb", "abc", "a b", "a ", " a", "#a", "!a", "a\\", "\\", "a\\b", "a*", "*", "-", "]", "[", "[a", "a[", "a]b", "x1", "z",
	"é", "1", ".a", "a.", "x", "a/a", "a/b", "a/b.csv", "a/x/b", "a/x/y/b", "a/x/y/b.csv", "b/a", "b/b", "b/a/b", "x/a", "x/y/a", "x/a/b", "a/ab", "a/a b", "x/.a", "a,b", "a\t",
}

// TestIgnorePatterns gives each line a folder of its own and asks git check-ignore
// about every name below it, as file and as folder.
func TestIgnorePatterns(t *testing.T) {
	t.Parallel()
	checkPatterns(t, ignoreLines, ignoreNames, false)
}

// patternPieces are what chance puts together to lines of an ignore file.
var patternPieces = []string{"a", "b", "a", "/", "/", "*", "**", "**/", "/**", "?", "[ab]", "[!a]", "[", "]", "-", "\\", "!", " ", "[a-b]", "."}

// draw puts together up to n pieces.
func draw(random *rand.Rand, pieces []string, n int) string {
	var b strings.Builder
	for range 1 + random.IntN(n) {
		b.WriteString(pieces[random.IntN(len(pieces))])
	}
	return b.String()
}

// TestIgnoreRandom does the same with lines that chance put together.
func TestIgnoreRandom(t *testing.T) {
	t.Parallel()
	random := rand.New(rand.NewPCG(7, 7))
	var patterns, names []string
	for len(patterns) < 300 {
		patterns = append(patterns, draw(random, patternPieces, 7))
	}
	seen := map[string]bool{}
	for len(names) < 60 {
		name := path.Clean(draw(random, []string{"a", "b", "ab", "/", "/", "-", "]", ".", "\\", " "}, 6))
		if name = strings.Trim(name, "/"); name == "" || name == "." || strings.HasPrefix(name, "..") || seen[name] {
			continue
		}
		seen[name] = true
		names = append(names, name)
	}
	checkPatterns(t, patterns, names, false)
}

// TestIgnoreStarsAfterText: git compares the text before the first special
// character by itself and begins to match behind it. So "**/" right after the
// text crosses folders as at the start of a pattern, against gitignore(5).
func TestIgnoreStarsAfterText(t *testing.T) {
	t.Parallel()
	checkPatterns(t, []string{
		"a**/b", "a/x**/b", "a/b**", "]**/*", "x/a**", "/a**", "/**a/b", "a**/**/b", "a***/b", "a\\**/b", "a?**/b", "a/**b", "a**b/", "!a**/b", "/a**/x", "A**/b",
		`**\/b`, `a\/**/b`, `*\/**/b`, `x/**\/b`, `?\/**`,
	}, ignoreNames, false)
	checkPatterns(t, []string{"A**/b", "a/X**/B", "a/B**"}, ignoreNames, true)
}

// TestIgnoreListed lays out real files beside lines that chance put together, and
// compares what is listed with git ls-files.
func TestIgnoreListed(t *testing.T) {
	t.Parallel()
	random := rand.New(rand.NewPCG(9, 9))
	g := newGit(t)
	for i := range 60 {
		for _, name := range []string{"a/a", "a/b/a", "a/b/ab", "a/]/b", "ab/b/b.a", "b/a/a", "b/b", "]/a", "c"} {
			g.write(fmt.Sprintf("d%d/%s", i, name), "")
		}
		var rules string
		for range 1 + random.IntN(3) {
			rules += draw(random, patternPieces, 6) + "\n"
		}
		g.write(fmt.Sprintf("d%d/.gitignore", i), rules)
	}
	fsys, err := g.open().Working(".")
	if err != nil {
		t.Fatal(err)
	}
	want := split(g.git("ls-files", "--others", "--exclude-standard", "-z"))
	slices.Sort(want)
	got := walkNames(t, fsys)
	if len(got) < 100 || len(got) > 500 {
		t.Errorf("%d files listed are no test", len(got))
	}
	for _, name := range got {
		if _, ok := slices.BinarySearch(want, name); !ok {
			dir, _, _ := strings.Cut(name, "/")
			t.Errorf("%q is listed here and not by git: %q", name, readFile(t, g.path(dir+"/.gitignore")))
		}
	}
	for _, name := range want {
		if _, ok := slices.BinarySearch(got, name); !ok {
			dir, _, _ := strings.Cut(name, "/")
			t.Errorf("%q is listed by git and not here: %q", name, readFile(t, g.path(dir+"/.gitignore")))
		}
	}
}

// TestIgnoreCase has core.ignoreCase on.
func TestIgnoreCase(t *testing.T) {
	t.Parallel()
	checkPatterns(t, []string{"A", "*.CSV", "[A-C]*", "[[:upper:]]", "[[:lower:]]", "a/B", "É"}, ignoreNames, true)
}

func checkPatterns(t *testing.T, patterns, names []string, fold bool) {
	g := newGit(t)
	g.git("config", "core.ignoreCase", fmt.Sprint(fold))
	var paths []string
	for i, p := range patterns {
		g.write(fmt.Sprintf("d%d/.gitignore", i), p+"\n")
		for _, n := range names {
			// A name with something below it is a folder to git.
			paths = append(paths, fmt.Sprintf("d%d/%s", i, n), fmt.Sprintf("d%d/%s/zz9", i, n))
		}
	}
	out, err := g.run(strings.Join(paths, "\x00"), "check-ignore", "--no-index", "--stdin", "-z")
	if err != nil && out == "" {
		t.Fatal(err)
	}
	ignored := map[string]bool{}
	for _, name := range split(out) {
		ignored[name] = true
	}
	if len(ignored) < len(patterns)/2 {
		t.Fatal("only", len(ignored), "of the names are ignored")
	}
	wrong, last := 0, ""
	var rules ignores
	for _, name := range paths {
		dir, _, _ := strings.Cut(name, "/")
		if dir != last {
			last = dir
			if rules, err = (ignores{fold: fold}).with(g.dir, dir); err != nil {
				t.Fatal(err)
			}
		}
		if got := ignoredBy(rules, name); got != ignored[name] {
			t.Errorf("pattern %q: %q is ignored here: %v, by git: %v", readFile(t, g.path(dir+"/.gitignore")), name, got, ignored[name])
			if wrong++; wrong > 30 {
				t.Fatal("and more")
			}
		}
	}
}

// ignoredBy judges a path as the lister does: folder by folder from the top.
func ignoredBy(rules ignores, name string) bool {
	parts := strings.Split(name, "/")
	for i := range parts {
		if rules.excluded(strings.Join(parts[:i+1], "/"), i < len(parts)-1) {
			return true
		}
	}
	return false
}

// TestIgnoreTime: a line of many stars must not take for ever.
func TestIgnoreTime(t *testing.T) {
	t.Parallel()
	if wildmatch(strings.Repeat("*a", 60), strings.Repeat("a", 200)+"b", true, false) {
		t.Error("matched")
	}
	if !wildmatch(strings.Repeat("*", 5000)+"b", strings.Repeat("a", 200)+"b", true, false) {
		t.Error("did not match")
	}
}

// TestIgnoreSources: core.excludesFile, info/exclude and .gitignore, each with
// its rank, as git ls-files has them. Not parallel: it sets the environment.
func TestIgnoreSources(t *testing.T) {
	g := newGit(t)
	home := tempDir(t)
	t.Setenv("HOME", home)
	t.Setenv("XDG_CONFIG_HOME", "")
	os.Unsetenv("XDG_CONFIG_HOME")
	t.Setenv("GIT_CONFIG_GLOBAL", "")
	os.Unsetenv("GIT_CONFIG_GLOBAL")
	for _, name := range []string{"a.x", "a.y", "a.z", "a.own", "keep.x", "in/a.x", "in/a.y", "in/keep.y", "in/a.own", "a.sys"} {
		g.write(name, "1\n")
	}
	step := func(what string, do func()) {
		t.Helper()
		do()
		if !t.Failed() {
			checkWorking(t, g, ".")
			checkWorking(t, g, "in")
		}
		if t.Failed() {
			t.Fatal("at the step:", what)
		}
	}
	step("nothing", func() {})
	step("the user's file at its default place", func() { writeFile(t, filepath.Join(home, ".config/git/ignore"), "*.x\n") })
	step("info/exclude takes back", func() { g.write(".git/info/exclude", "!keep.x\n*.y\n") })
	step(".gitignore takes back", func() { g.write(".gitignore", "!keep.y\n*.z\n") })
	step("a folder's own", func() { g.write("in/.gitignore", "!a.y\na.x\n") })
	step("XDG_CONFIG_HOME", func() {
		t.Setenv("XDG_CONFIG_HOME", filepath.Join(home, "other"))
		writeFile(t, filepath.Join(home, "other/git/ignore"), "*.own\n")
	})
	step("core.excludesFile of the user, ~ in it", func() {
		writeFile(t, filepath.Join(home, ".gitconfig"), "[core]\n\texcludesFile = ~/mine\n")
		writeFile(t, filepath.Join(home, "mine"), "*.x\n!a.own\n")
	})
	step("the user's other configuration", func() {
		writeFile(t, filepath.Join(home, "other/git/config"), "[core]\n\texcludesFile = ~/not-this\n")
		writeFile(t, filepath.Join(home, "not-this"), "*\n!in/\n!a.sys\n")
	})
	step("an included file", func() {
		writeFile(t, filepath.Join(home, ".gitconfig"), "[core]\n\texcludesFile = ~/not-this\n[include]\n\tpath = more\n")
		writeFile(t, filepath.Join(home, "more"), "[core]\n\texcludesFile = ~/mine\n")
	})
	step("included for this repository", func() {
		writeFile(t, filepath.Join(home, "more"), "[includeIf \"gitdir:"+g.dir+"/\"]\n\tpath = here\n")
		writeFile(t, filepath.Join(home, "here"), "[core]\n\texcludesFile = ~/here-only\n")
		writeFile(t, filepath.Join(home, "here-only"), "a.z\n")
	})
	step("included for another repository", func() {
		writeFile(t, filepath.Join(home, "more"), "[includeIf \"gitdir:/elsewhere/\"]\n\tpath = here\n[core]\n\texcludesFile = ~/mine\n")
	})
	step("the repository's own", func() {
		g.git("config", "core.excludesFile", filepath.Join(home, "not-this"))
	})
	step("none", func() { g.git("config", "core.excludesFile", "") })
	step("GIT_CONFIG_SYSTEM", func() {
		g.git("config", "--unset", "core.excludesFile")
		os.Remove(filepath.Join(home, ".gitconfig"))
		os.Remove(filepath.Join(home, "other/git/config"))
		os.Unsetenv("GIT_CONFIG_NOSYSTEM")
		t.Setenv("GIT_CONFIG_NOSYSTEM", "0")
		t.Setenv("GIT_CONFIG_SYSTEM", filepath.Join(home, "system"))
		writeFile(t, filepath.Join(home, "system"), "[core]\n\texcludesFile = "+filepath.Join(home, "of-system")+"\n")
		writeFile(t, filepath.Join(home, "of-system"), "*.sys\n")
	})
	step("no system file", func() { t.Setenv("GIT_CONFIG_NOSYSTEM", "true") })
	step("GIT_CONFIG_GLOBAL", func() {
		t.Setenv("GIT_CONFIG_GLOBAL", filepath.Join(home, "global"))
		writeFile(t, filepath.Join(home, "global"), "[core]\n\texcludesFile = ~/of-system\n")
	})
	step("a linked worktree", func() {
		g.commit("all")
		linked := g.at(filepath.Join(tempDir(t), "linked"))
		g.git("worktree", "add", "--quiet", "--detach", linked.dir)
		for _, name := range []string{"new.x", "new.y", "new.z", "new.sys"} {
			linked.write(name, "1\n")
		}
		checkWorking(t, linked, ".")
	})
}

// TestIgnoreFileForms: a byte order mark, no newline at the end, a link in place
// of a file, a folder in place of a file.
func TestIgnoreFileForms(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	for _, d := range []string{"bom", "cut", "link", "folder", "crlf", "plain"} {
		g.write(d+"/a.csv", "1\n")
		g.write(d+"/b.csv", "1\n")
	}
	g.write("bom/.gitignore", "\xef\xbb\xbfa.csv\n")
	g.write("cut/.gitignore", "# x\n\nb.csv")
	g.write("crlf/.gitignore", "a.csv\r\nb.csv\r\n")
	g.write("folder/.gitignore/a.csv", "1\n")
	g.write("rules", "*.csv\n")
	g.symlink("../rules", "link/.gitignore")
	checkWorking(t, g, ".")
	g.git("add", "--all", "--force")
	os.Remove(g.path("plain/a.csv"))
	checkWorking(t, g, ".")
}
