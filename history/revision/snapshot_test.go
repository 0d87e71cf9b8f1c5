package revision

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"strings"
	"testing"
	"testing/fstest"
	"unicode/utf8"

	"github.com/go-git/go-git/v5/plumbing"
)

// TestSnapshotFS has the standard library's own test of a file system. Links and
// submodules cannot be opened, which that test does not allow, so the folders
// under test have none.
func TestSnapshotFS(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	r := g.open()
	main := g.git("rev-parse", "main")
	for folder, files := range map[string][]string{
		"network/routes": {"r1/route.toml", "r1.csv", "r1-2"}, "network/tools": {"check"}, "network/Vägar": {"smal bro.csv"},
	} {
		fsys, err := r.Snapshot(main, folder)
		if err != nil {
			t.Fatal(err)
		}
		if err := fstest.TestFS(fsys, files...); err != nil {
			t.Errorf("%s: %v", folder, err)
		}
		disk, err := r.Working(folder)
		if err != nil {
			t.Fatal(err)
		}
		if err := fstest.TestFS(disk, files...); err != nil {
			t.Errorf("%s on disk: %v", folder, err)
		}
	}
}

// TestSnapshotFolder has the ways to write a folder and those that are refused.
func TestSnapshotFolder(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	r := g.open()
	main := g.git("rev-parse", "main")
	for _, folder := range []string{"network", "network/", "./network", "network/../network", "network//routes/.."} {
		fsys, err := r.Snapshot(main, folder)
		if err != nil {
			t.Errorf("%q: %v", folder, err)
			continue
		}
		info, err := fs.Stat(fsys, ".")
		if err != nil || info.Name() != "." || info.(Entry).Identity() != g.git("rev-parse", "main:network") {
			t.Errorf("%q: %v (%v)", folder, info, err)
		}
	}
	for _, folder := range []string{"", "."} {
		if fsys, err := r.Snapshot(main, folder); err != nil {
			t.Errorf("%q: %v", folder, err)
		} else if _, err := fs.Stat(fsys, "network/speed.csv"); err != nil {
			t.Errorf("%q: %v", folder, err)
		}
	}
	for folder, part := range map[string]string{
		"absent": `"absent"`, "network/absent/x": `"absent"`, "network/speed.csv": "is a file", "network/speed.csv/x": `"speed.csv"`,
		"network/latest": "symbolic link", "network/latest/route.toml": "symbolic link", "network/vendored": "submodule",
		"..": "inside the repository", "/network": "inside the repository", "../x": "inside the repository", "a\x00b": "inside the repository",
		"Network": `"Network"`, "network/routes/r": `"r"`,
	} {
		_, err := r.Snapshot(main, folder)
		wantClass(t, err, ErrNoFolder, main, part, "--data")
	}
	for _, commit := range []string{"", "main", main[:12], main + "0", "HEAD"} {
		_, err := r.Snapshot(commit, ".")
		wantClass(t, err, ErrUnknown, "full commit hash")
	}
	_, err := r.Snapshot(strings.Repeat("12", 20), ".")
	wantClass(t, err, ErrMissingObject, strings.Repeat("12", 20))
	_, err = r.Snapshot(g.git("rev-parse", "main^{tree}"), ".")
	wantClass(t, err, ErrCorrupt, "is a tree, a commit is needed")
}

// TestSnapshotPaths: a path that is not there, that is no file, or that fs.FS
// does not allow.
func TestSnapshotPaths(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	fsys, err := g.open().Snapshot(g.git("rev-parse", "main"), "network")
	if err != nil {
		t.Fatal(err)
	}
	for name, class := range map[string]error{
		"absent.csv": fs.ErrNotExist, "routes/absent/x": fs.ErrNotExist, "speed.csv/x": ErrNotFile, "latest": ErrNotFile, "latest/route.toml": ErrNotFile,
		"vendored": ErrNotFile, "vendored/x": ErrNotFile, "": fs.ErrInvalid, "/speed.csv": fs.ErrInvalid, "../elsewhere.txt": fs.ErrInvalid, "routes/": fs.ErrInvalid,
		"./speed.csv": fs.ErrInvalid, "routes//r1": fs.ErrInvalid, "bad\xff": fs.ErrInvalid,
	} {
		_, err := fsys.Open(name)
		var at *fs.PathError
		if !errors.Is(err, class) || !errors.As(err, &at) || at.Path != name {
			t.Errorf("open %q: %v, want %v", name, err, class)
		}
		if _, err := fs.ReadFile(fsys, name); !errors.Is(err, class) {
			t.Errorf("read %q: %v, want %v", name, err, class)
		}
		if _, err := fs.ReadDir(fsys, name); !errors.Is(err, class) {
			t.Errorf("read folder %q: %v, want %v", name, err, class)
		}
		_, err = fs.Stat(fsys, name)
		if name == "latest" || name == "vendored" {
			class = nil
		}
		if !errors.Is(err, class) {
			t.Errorf("stat %q: %v, want %v", name, err, class)
		}
	}
	if _, err := fs.ReadFile(fsys, "routes"); !errors.Is(err, ErrNotFile) {
		t.Errorf("a folder was read: %v", err)
	}
	if _, err := fs.ReadDir(fsys, "speed.csv"); !errors.Is(err, ErrNotFile) {
		t.Errorf("a file was listed: %v", err)
	}
	f, err := fsys.Open("speed.csv")
	if err != nil {
		t.Fatal(err)
	}
	if n, err := f.Read(nil); n != 0 || err != nil {
		t.Errorf("nothing asked for: %d, %v", n, err)
	}
	if err := f.Close(); err != nil {
		t.Error(err)
	}
	if _, err := f.Read(make([]byte, 1)); !errors.Is(err, fs.ErrClosed) {
		t.Errorf("read after close: %v", err)
	}
	if err := f.Close(); !errors.Is(err, fs.ErrClosed) {
		t.Errorf("closed twice: %v", err)
	}
}

// mktree writes a tree from lines of "mode hash name", in the order given and
// without any check.
func (g *gitRepo) mktree(lines ...string) string {
	g.t.Helper()
	var b strings.Builder
	for _, line := range lines {
		f := strings.SplitN(line, " ", 3)
		raw := make([]byte, 20)
		if _, err := fmt.Sscanf(f[1], "%x", &raw); err != nil {
			g.t.Fatal(err)
		}
		fmt.Fprintf(&b, "%s %s\x00%s", f[0], f[2], raw)
	}
	return g.object("tree", b.String())
}

// commitTree writes a commit with a tree, whatever the tree is.
func (g *gitRepo) commitTree(tree string) string {
	g.t.Helper()
	return g.object("commit", "tree "+tree+"\nauthor A <a@fernway.example> 1767000000 +0000\ncommitter A <a@fernway.example> 1767000000 +0000\n\nx\n")
}

// TestTrees: a tree that Git would not write is refused, as one path in it could
// mean two things.
func TestTrees(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	blob := g.object("blob", "x\n")
	empty := g.mktree()
	read := func(tree string) ([]fs.DirEntry, error) {
		fsys, err := g.open().Snapshot(g.commitTree(tree), ".")
		if err != nil {
			return nil, err
		}
		return fs.ReadDir(fsys, ".")
	}
	for name, tree := range map[string]string{
		"out of order":             g.mktree("100644 "+blob+" b", "100644 "+blob+" a"),
		"folder out of order":      g.mktree("40000 "+empty+" a", "100644 "+blob+" a.txt"),
		"twice":                    g.mktree("100644 "+blob+" a", "100644 "+blob+" a"),
		"twice, file and folder":   g.mktree("100644 "+blob+" a", "100644 "+blob+" a.txt", "40000 "+empty+" a"),
		"empty name":               g.mktree("100644 " + blob + " "),
		"dot":                      g.mktree("40000 " + empty + " ."),
		"two dots":                 g.mktree("40000 " + empty + " .."),
		"git folder":               g.mktree("40000 " + empty + " .git"),
		"git folder, upper case":   g.mktree("40000 " + empty + " .GIT"),
		"slash":                    g.mktree("100644 " + blob + " a/b"),
		"mode of a device":         g.mktree("20644 " + blob + " a"),
		"mode of nothing":          g.mktree("0 " + blob + " a"),
		"mode with a letter":       g.mktree("10x644 " + blob + " a"),
		"mode too long":            g.mktree("00100644 " + blob + " a"),
		"hash cut short":           g.object("tree", "100644 a\x00short"),
		"mode only":                g.object("tree", "100644"),
		"no end of the name":       g.object("tree", "100644 abc"),
		"rubbish behind the entry": g.object("tree", "100644 a\x00"+strings.Repeat("h", 20)+"x"),
	} {
		_, err := read(tree)
		t.Run(name, func(t *testing.T) { wantClass(t, err, ErrCorrupt, tree, "git fsck") })
	}
	good := g.mktree("100664 "+blob+" a", "100644 "+blob+" a.txt", "40000 "+empty+" a0", "100755 "+blob+" b")
	entries, err := read(good)
	if err != nil || len(entries) != 4 {
		t.Fatal(entries, err)
	}
	for i, name := range []string{"a", "a.txt", "a0", "b"} {
		if entries[i].Name() != name {
			t.Errorf("entry %d is %q, want %q", i, entries[i].Name(), name)
		}
	}
	checkTree(t, g, g.open(), g.commitTree(good), ".")
	if entries, err := read(sumOf("tree", "")); err != nil || len(entries) != 0 {
		t.Errorf("the empty tree, which need not be stored: %v, %v", entries, err)
	}
	_, err = g.open().Snapshot(g.commitTree(blob), ".")
	wantNotDir := g.commitTree(g.mktree("40000 " + blob + " a"))
	if err == nil {
		fsys, _ := g.open().Snapshot(g.commitTree(blob), ".")
		_, err = fs.ReadDir(fsys, ".")
	}
	wantClass(t, err, ErrCorrupt, "is a blob, a tree is needed")
	fsys, err := g.open().Snapshot(wantNotDir, ".")
	if err != nil {
		t.Fatal(err)
	}
	_, err = fs.ReadDir(fsys, "a")
	wantClass(t, err, ErrCorrupt, "is a blob")
	fsys, err = g.open().Snapshot(g.commitTree(g.mktree("100644 "+empty+" a")), ".")
	if err != nil {
		t.Fatal(err)
	}
	_, err = fs.ReadFile(fsys, "a")
	wantClass(t, err, ErrCorrupt, "is a tree")
}

// TestNamesNotUTF8: fs.FS has no path that is not UTF-8. Such a file or folder is
// listed and cannot be opened, which is an error that has the name escaped; it is
// not passed over.
func TestNamesNotUTF8(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	blob := g.object("blob", "x\n")
	inner := g.mktree("100644 " + blob + " a")
	fsys, err := g.open().Snapshot(g.commitTree(g.mktree("40000 "+inner+" b\xffr", "100644 "+blob+" v\xe4g.csv")), ".")
	if err != nil {
		t.Fatal(err)
	}
	entries, err := fs.ReadDir(fsys, ".")
	if err != nil || len(entries) != 2 || entries[0].Name() != "b\xffr" || entries[1].Name() != "v\xe4g.csv" {
		t.Fatal(entries, err)
	}
	g.write("v\xe4g.csv", "x\n")
	disk, err := g.open().Working(".")
	if err != nil {
		t.Fatal(err)
	}
	for name, call := range map[string]func(fs.FS, string) error{
		"open":    func(f fs.FS, name string) error { _, err := f.Open(name); return err },
		"read":    func(f fs.FS, name string) error { _, err := fs.ReadFile(f, name); return err },
		"stat":    func(f fs.FS, name string) error { _, err := fs.Stat(f, name); return err },
		"readdir": func(f fs.FS, name string) error { _, err := fs.ReadDir(f, name); return err },
	} {
		for _, f := range []fs.FS{fsys, disk} {
			for path, escaped := range map[string]string{"v\xe4g.csv": `"v\xe4g.csv"`, "b\xffr": `"b\xffr"`, "b\xffr/a": `"b\xffr/a"`} {
				err := call(f, path)
				wantClass(t, err, ErrNotFile, name, escaped, "not UTF-8", "hint: rename")
				var at *fs.PathError
				if !errors.Is(err, fs.ErrInvalid) || !errors.As(err, &at) || at.Path != path || !utf8.ValidString(err.Error()) {
					t.Errorf("%s: %v", name, err)
				}
			}
			if err := call(f, "/\xff"); !errors.Is(err, fs.ErrInvalid) || errors.Is(err, ErrNotFile) {
				t.Errorf("%s of a path that no spelling makes valid: %v", name, err)
			}
		}
	}
}

// TestReadEnd: a reader that is asked for one byte at a time ends with io.EOF
// and keeps to it.
func TestReadEnd(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	fsys, err := g.open().Snapshot(g.git("rev-parse", "main"), "network")
	if err != nil {
		t.Fatal(err)
	}
	for name, size := range map[string]int{"empty.csv": 0, "bytes.bin": 5} {
		f, err := fsys.Open(name)
		if err != nil {
			t.Fatal(err)
		}
		n := 0
		for {
			k, err := f.Read(make([]byte, 1))
			n += k
			if err == io.EOF {
				break
			}
			if err != nil || n > size {
				t.Fatal(n, err)
			}
		}
		if k, err := f.Read(make([]byte, 9)); n != size || k != 0 || err != io.EOF {
			t.Errorf("%q: %d bytes, then %d, %v", name, n, k, err)
		}
		f.Close()
	}
}

// TestLarge reads a file of more than 1 MiB, whose size is not believed before
// its bytes have come, from each way in which objects are stored.
func TestLarge(t *testing.T) {
	t.Parallel()
	g := newGit(t)
	contents := []string{strings.Repeat("0.000,1.000,60\n", 75_000)}
	contents = append(contents, contents[0]+"1.000,2.000,70\n")
	for _, content := range contents {
		g.write("large.csv", content)
		g.commit("large")
	}
	check := func(g *gitRepo) {
		t.Helper()
		r := g.open()
		for i, rev := range []string{"HEAD~1", "HEAD"} {
			c, err := r.Resolve(rev)
			if err != nil {
				t.Fatal(err)
			}
			fsys, err := r.Snapshot(c.Hash, ".")
			if err != nil {
				t.Fatal(err)
			}
			checkContent(t, fsys, "large.csv", contents[i])
		}
	}
	check(g)
	g.git("repack", "-adf", "--quiet")
	wantKind(t, g, plumbing.OFSDeltaObject)
	check(g)
}
