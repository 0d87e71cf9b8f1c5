package revision

import (
	"errors"
	"io/fs"
	"os"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// walkNames gives the paths of everything that is no folder.
func walkNames(t testing.TB, fsys fs.FS) []string {
	t.Helper()
	var out []string
	err := fs.WalkDir(fsys, ".", func(name string, e fs.DirEntry, err error) error {
		if err == nil && !e.IsDir() {
			out = append(out, name)
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(out)
	return out
}

// onDisk says whether a file of the index is there as such, and not by way of a
// link or as a folder in its place.
func (g *gitRepo) onDisk(name string) bool {
	parts := strings.Split(name, "/")
	for i := range parts {
		info, err := os.Lstat(g.path(strings.Join(parts[:i+1], "/")))
		if err != nil || info.IsDir() != (i < len(parts)-1) {
			return false
		}
	}
	return true
}

var staged = regexp.MustCompile(`^[0-7]{6} [0-9a-f]{40} [0-3]\t`)

// checkWorking compares a folder of the working tree with git: the names by
// git ls-files, the hashes by git hash-object, the tree of all by git write-tree.
func checkWorking(t *testing.T, g *gitRepo, folder string) fs.FS {
	t.Helper()
	fsys, err := g.open().Working(folder)
	if err != nil {
		t.Error(err)
		return nil
	}
	var want []string
	for _, name := range split(g.git("ls-files", "--stage", "--cached", "--others", "--exclude-standard", "-z", "--", folder)) {
		// A tracked file has its mode, hash and stage before it.
		isModule := false
		if staged.MatchString(name) {
			mode, path := name[:6], name[len(staged.FindString(name)):]
			info, err := os.Lstat(g.path(path))
			isModule = mode == "160000" && err == nil && info.IsDir()
			name = path
		}
		rel := strings.TrimPrefix(name, folder+"/")
		if other, isOther := strings.CutSuffix(rel, "/"); isOther {
			want = append(want, other) // another repository
		} else if isModule || g.onDisk(name) {
			want = append(want, rel)
		}
	}
	slices.Sort(want)
	want = slices.Compact(want)
	got := walkNames(t, fsys)
	if !slices.Equal(got, want) {
		t.Errorf("%q: files\n got %q\nwant %q", folder, got, want)
	}
	checkIdentities(t, g, fsys, folder, got)
	return fsys
}

func checkIdentities(t *testing.T, g *gitRepo, fsys fs.FS, folder string, names []string) {
	t.Helper()
	var regular []string
	for _, name := range names {
		info, err := fs.Stat(fsys, name)
		if err != nil {
			t.Errorf("%q: %v", name, err)
			continue
		}
		if !info.Mode().IsRegular() {
			if _, err := fs.ReadFile(fsys, name); err == nil {
				t.Errorf("%q of mode %v was read", name, info.Mode())
			}
			continue
		}
		want := readFile(t, g.path(folder+"/"+name))
		checkContent(t, fsys, name, want)
		if info.Size() != int64(len(want)) {
			t.Errorf("%q has size %d, want %d", name, info.Size(), len(want))
		}
		regular = append(regular, name)
		if !strings.ContainsAny(name, "\n\"") && info.(Entry).Identity() != sumOf("blob", want) {
			t.Errorf("%q has identity %s", name, info.(Entry).Identity())
		}
	}
	if len(names) > 0 && len(regular) == 0 {
		t.Error("no regular file was compared")
	}
}

// dirty makes a working tree with every difference from the index that there is.
func dirty(t *testing.T) *gitRepo {
	g := newGit(t)
	for _, name := range []string{
		"data/kept.csv", "data/modified.csv", "data/deleted.csv", "data/staged.csv", "data/becomes-folder", "data/becomes-file/in.csv",
		"data/becomes-link/in.csv", "data/tracked-ignored.log", "data/ignored/tracked.csv", "data/ignored/deep/tracked.csv", "data/Vägar/ö 1.csv",
		"data/gone/only.csv", "data/renamed-from.csv", "outside.csv", "data/file-to-link",
	} {
		g.write(name, "content of "+name+"\n")
	}
	g.write("data/.gitignore", "")
	g.git("add", "--all")
	g.commit("tracked")
	g.write(".gitignore", "*.log\n/data/ignored/\n*.tmp\nbuild/\n!keep.tmp\n")
	g.write("data/.gitignore", "# local\n!special.log\nonly-here.csv\n/anchored.csv\nnested/*.bak\ndouble/**/x.csv\n")
	g.write("data/nested/.gitignore", "!again.bak\n*.csv\n!good.csv\n.gitignore\n")
	for _, name := range []string{
		"data/untracked.csv", "data/some.log", "data/special.log", "data/a.tmp", "data/keep.tmp", "data/build/out.csv", "data/build/keep.tmp", "data/build2/x.csv",
		"data/ignored/untracked.csv", "data/ignored/deep/untracked.csv", "data/only-here.csv", "data/nested/only-here.csv", "data/anchored.csv", "data/nested/anchored.csv",
		"data/nested/good.csv", "data/nested/bad.csv", "data/nested/one.bak", "data/nested/again.bak", "data/nested/deeper/one.bak",
		"data/double/x.csv", "data/double/a/b/x.csv", "data/double/a/b/y.csv", "data/Ny mapp/ä ö.csv", "data/-dash.csv", "data/.hidden", "data/trailing ",
	} {
		g.write(name, "new "+name+"\n")
	}
	g.write("data/modified.csv", "other\n")
	g.write("data/staged.csv", "staged\n")
	g.git("add", "data/staged.csv")
	g.write("data/staged.csv", "and changed again\n")
	for _, name := range []string{"data/deleted.csv", "data/becomes-folder", "data/becomes-file", "data/becomes-link", "data/gone", "data/file-to-link"} {
		if err := os.RemoveAll(g.path(name)); err != nil {
			t.Fatal(err)
		}
	}
	g.write("data/becomes-folder/now.csv", "x\n")
	g.write("data/becomes-file", "x\n")
	g.git("mv", "data/renamed-from.csv", "data/renamed-to.csv")
	if err := os.MkdirAll(g.path("data/nothing/in/here"), 0o755); err != nil {
		t.Fatal(err)
	}
	g.symlink("kept.csv", "data/link")
	g.symlink("nested", "data/folder-link")
	g.symlink("/nowhere", "data/dangling")
	g.symlink("nested", "data/becomes-link")
	g.symlink("kept.csv", "data/file-to-link")
	g.symlink("kept.csv", "data/ignored-link.log")
	// Other repositories inside: with a commit, without one, and one that is no
	// repository in spite of its name.
	for _, name := range []string{"data/other", "data/other-empty"} {
		g.git("init", "--quiet", name)
	}
	g.write("data/other/file.csv", "x\n")
	g.at(g.path("data/other")).commit("other")
	g.write("data/other-empty/file.csv", "x\n")
	g.write("data/no-repository/.git/HEAD", "x\n")
	g.write("data/no-repository/file.csv", "x\n")
	return g
}

// TestWorking checks the list of files against git ls-files.
func TestWorking(t *testing.T) {
	t.Parallel()
	g := dirty(t)
	for _, folder := range []string{".", "data", "data/nested", "data/ignored", "data/ignored/deep", "data/double", "data/becomes-folder", "data/Ny mapp"} {
		checkWorking(t, g, folder)
	}
	fsys := checkWorking(t, g, "data")
	for name, kind := range map[string]fs.FileMode{
		"link": fs.ModeSymlink, "folder-link": fs.ModeSymlink, "dangling": fs.ModeSymlink, "becomes-link": fs.ModeSymlink, "file-to-link": fs.ModeSymlink,
		"other": fs.ModeIrregular, "other-empty": fs.ModeIrregular, "nested": fs.ModeDir, "kept.csv": 0,
	} {
		info, err := fs.Stat(fsys, name)
		if err != nil || info.Mode().Type() != kind {
			t.Errorf("%q: %v (%v), want %v", name, info, err, kind)
		}
	}
	for _, name := range []string{"link/x", "folder-link/good.csv", "other/file.csv", "kept.csv/x"} {
		_, err := fs.ReadFile(fsys, name)
		wantClass(t, err, ErrNotFile)
	}
	for _, name := range []string{"some.log", "deleted.csv", "gone", "nothing", "ignored/untracked.csv", ".git"} {
		if _, err := fs.Stat(fsys, name); !errors.Is(err, fs.ErrNotExist) {
			t.Errorf("%q is there: %v", name, err)
		}
	}
	// Git's hash of what is on disk: add all of it and ask.
	os.RemoveAll(g.path("data/other"))
	os.RemoveAll(g.path("data/other-empty"))
	checkWrittenTree(t, g, "data")
}

// checkWrittenTree compares the identity of a folder with the tree that git makes
// of the same files.
func checkWrittenTree(t *testing.T, g *gitRepo, folder string) {
	t.Helper()
	fsys, err := g.open().Working(folder)
	if err != nil {
		t.Fatal(err)
	}
	root, err := fs.Stat(fsys, ".")
	if err != nil {
		t.Fatal(err)
	}
	g.git("add", "--all")
	tree := g.git("write-tree")
	if folder != "." {
		tree = g.git("rev-parse", tree+":"+folder)
	}
	if got := root.(Entry).Identity(); got != tree {
		t.Errorf("identity of %q is %s, git writes %s", folder, got, tree)
	}
}

// TestWorkingClean: in a clean checkout folder for folder the hash is that of the
// commit, so nothing needs to be read twice.
func TestWorkingClean(t *testing.T) {
	t.Parallel()
	g := sample(t)
	if err := os.Mkdir(g.path("network/vendored"), 0o755); err != nil && !os.IsExist(err) {
		t.Fatal(err)
	}
	r := g.open()
	c, err := r.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	committed, err := r.Snapshot(c.Hash, "network")
	if err != nil {
		t.Fatal(err)
	}
	disk := checkWorking(t, g, "network")
	n := 0
	err = fs.WalkDir(committed, ".", func(name string, e fs.DirEntry, err error) error {
		if err != nil || name == "." {
			return err
		}
		n++
		info, err := fs.Stat(disk, name)
		if err != nil {
			return err
		}
		was, err := e.Info()
		if err != nil {
			return err
		}
		if name == "vendored" {
			if got := info.(Entry).Identity(); got != "" || info.Mode() != was.Mode() {
				t.Errorf("a submodule on disk has identity %q and mode %v", got, info.Mode())
			}
			return nil
		}
		if info.(Entry).Identity() != e.(Entry).Identity() || info.Mode() != was.Mode() {
			t.Errorf("%q: %s %v on disk, %s %v committed", name, info.(Entry).Identity(), info.Mode(), e.(Entry).Identity(), was.Mode())
		}
		return nil
	})
	if err != nil || n < 12 {
		t.Error(n, "entries", err)
	}
}

// TestWorkingModes: the x permission comes from the disk, or from the index where
// core.fileMode is off.
func TestWorkingModes(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	g.write("plain", "1\n")
	g.write("program", "2\n")
	g.git("add", "--all")
	g.git("update-index", "--chmod=+x", "program")
	g.git("commit", "--quiet", "-m", "both")
	g.write("untracked", "3\n")
	if err := os.Chmod(g.path("plain"), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(g.path("untracked"), 0o755); err != nil {
		t.Fatal(err)
	}
	for _, setting := range []string{"true", "false"} {
		g.git("config", "core.fileMode", setting)
		fsys := checkWorking(t, g, ".")
		for name, want := range map[string]bool{
			"plain": setting == "true", "program": setting == "false", "untracked": setting == "true",
		} {
			info, err := fs.Stat(fsys, name)
			if err != nil || (info.Mode()&0o100 != 0) != want {
				t.Errorf("core.fileMode %s: %q has %v (%v)", setting, name, info.Mode(), err)
			}
		}
		copied := g.at(tempDir(t))
		if err := os.CopyFS(copied.dir, os.DirFS(g.dir)); err != nil {
			t.Fatal(err)
		}
		checkWrittenTree(t, copied, ".")
	}
}

// TestWorkingErrors has the folders that cannot be taken, and why.
func TestWorkingErrors(t *testing.T) {
	t.Parallel()
	g := dirty(t)
	r := g.open()
	for folder, part := range map[string]string{
		"absent": `"absent"`, "data/gone": `"gone"`, "data/nothing": "no file in it is tracked", "data/link": "symbolic link",
		"data/folder-link": "symbolic link", "data/folder-link/deeper": "symbolic link", "data/kept.csv": "is a file", "data/other": "another repository",
		"../x": "inside the repository", "/data": "inside the repository", "..": "inside the repository", "a\x00b": "inside the repository",
		".git": `".git"`, "data/build": "no file in it", "data/kept.csv/x": `"kept.csv"`,
	} {
		_, err := r.Working(folder)
		wantClass(t, err, ErrNoFolder, part, "--data", "the working tree has no data set folder")
	}
	for _, folder := range []string{"", ".", "data/", "./data", "data/../data"} {
		if _, err := r.Working(folder); err != nil {
			t.Errorf("%q: %v", folder, err)
		}
	}
	bare := g.at(tempDir(t))
	bare.git("init", "--quiet", "--bare")
	_, err := bare.open().Working(".")
	wantClass(t, err, ErrBare, bare.dir, "hint: name a revision")
	if dir, ok := bare.open().WorkTree(); ok || dir != "" {
		t.Errorf("a bare repository has the working tree %q", dir)
	}
}

// TestWorkingRace: what takes the place of a file after the list was made is not
// followed out of the folder.
func TestWorkingRace(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	g.write("secret/a.csv", "secret\n")
	g.write("data/in/a.csv", "1\n")
	g.write("data/b.csv", "2\n")
	g.write("data/c.csv", "3\n")
	fsys, err := g.open().Working("data")
	if err != nil {
		t.Fatal(err)
	}
	os.RemoveAll(g.path("data/in"))
	os.Remove(g.path("data/b.csv"))
	os.Remove(g.path("data/c.csv"))
	g.symlink("../secret", "data/in")
	g.symlink("../secret/a.csv", "data/b.csv")
	for _, name := range []string{"in/a.csv", "b.csv"} {
		data, err := fs.ReadFile(fsys, name)
		if string(data) != "" {
			t.Errorf("%q was followed: %q", name, data)
		}
		wantClass(t, err, ErrNotFile, "symbolic link")
	}
	if _, err := fs.ReadFile(fsys, "c.csv"); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("a file that is gone: %v", err)
	}
}
