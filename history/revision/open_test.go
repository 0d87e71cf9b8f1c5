package revision

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"testing"
)

// TestOpenNothing has the places where there is no repository.
func TestOpenNothing(t *testing.T) {
	t.Parallel()
	dir := tempDir(t)
	writeFile(t, filepath.Join(dir, "file"), "x")
	for name, make := range map[string]func(dir string){
		"a git folder without anything": func(dir string) { os.MkdirAll(filepath.Join(dir, ".git"), 0o755) },
		"a git file with rubbish":       func(dir string) { writeFile(t, filepath.Join(dir, ".git"), "rubbish") },
		"a git file to nowhere":         func(dir string) { writeFile(t, filepath.Join(dir, ".git"), "gitdir: nowhere\n") },
		"HEAD alone":                    func(dir string) { writeFile(t, filepath.Join(dir, ".git/HEAD"), "ref: refs/heads/main\n") },
	} {
		at := filepath.Join(dir, name)
		make(at)
		_, err := Open(at)
		t.Run(name, func(t *testing.T) { wantClass(t, err, ErrNoRepository, at, "--repo") })
	}
	for _, path := range []string{dir, filepath.Join(dir, "absent"), filepath.Join(dir, "file")} {
		_, err := Open(path)
		wantClass(t, err, ErrNoRepository, path, "--repo")
	}
}

// TestOpenAt: where the working tree and the common folder are, compared with git
// rev-parse.
func TestOpenAt(t *testing.T) {
	t.Parallel()
	g := sample(t)
	check := func(t *testing.T, g *gitRepo) {
		t.Helper()
		r := g.open()
		dir, ok := r.WorkTree()
		want, err := g.try("rev-parse", "--show-toplevel")
		if err != nil {
			want = ""
		}
		if dir != filepath.FromSlash(want) || ok != (want != "") {
			t.Errorf("working tree %q, git has %q (%v)", dir, want, err)
		}
		common := g.git("rev-parse", "--path-format=absolute", "--git-common-dir")
		if r.CommonDir() != filepath.FromSlash(common) {
			t.Errorf("common folder %q, git has %q", r.CommonDir(), common)
		}
	}
	t.Run("root", func(t *testing.T) { check(t, g) })
	t.Run("below", func(t *testing.T) { check(t, g.at(g.path("network/routes"))) })
	t.Run("linked worktree", func(t *testing.T) {
		linked := g.at(filepath.Join(tempDir(t), "linked"))
		g.git("worktree", "add", "--quiet", "--detach", linked.dir)
		check(t, linked)
		check(t, linked.at(linked.path("network")))
	})
	t.Run("linked worktree inside", func(t *testing.T) {
		g.git("worktree", "add", "--quiet", "--detach", g.path("inside"))
		check(t, g.at(g.path("inside/network")))
		check(t, g)
	})
	t.Run("bare", func(t *testing.T) {
		bare := g.at(filepath.Join(tempDir(t), "bare.git"))
		g.git("clone", "--quiet", "--bare", g.dir, bare.dir)
		check(t, bare)
		check(t, bare.at(bare.path("refs/heads")))
	})
	t.Run("core.worktree", func(t *testing.T) {
		away := filepath.Join(tempDir(t), "away")
		if err := os.Mkdir(away, 0o755); err != nil {
			t.Fatal(err)
		}
		other := g.at(filepath.Join(tempDir(t), "other"))
		g.git("clone", "--quiet", g.dir, other.dir)
		other.git("config", "core.worktree", away)
		if dir, ok := other.open().WorkTree(); dir != away || !ok {
			t.Errorf("working tree %q", dir)
		}
	})
	t.Run("a repository inside another", func(t *testing.T) {
		g.git("init", "--quiet", "inner")
		check(t, g.at(g.path("inner")))
	})
	t.Run("a submodule", func(t *testing.T) {
		outer := newGit(t)
		outer.git("-c", "protocol.file.allow=always", "submodule", "--quiet", "add", g.dir, "sub")
		check(t, outer.at(outer.path("sub/network")))
	})
}

// TestFormats: what this package cannot read is refused by name.
func TestFormats(t *testing.T) {
	t.Parallel()
	t.Run("sha256", func(t *testing.T) {
		needGit(t)
		g := &gitRepo{t, tempDir(t)}
		if _, err := g.try("init", "--quiet", "--object-format=sha256"); err != nil {
			t.Skip("this git makes no sha256 repository:", err)
		}
		g.write("a", "1\n")
		g.commit("x")
		_, err := Open(g.dir)
		wantClass(t, err, ErrUnsupported, g.dir, `"sha256"`, "git init --object-format=sha1")
	})
	t.Run("reftable", func(t *testing.T) {
		needGit(t)
		g := &gitRepo{t, tempDir(t)}
		if _, err := g.try("init", "--quiet", "--ref-format=reftable"); err != nil {
			t.Skip("this git makes no reftable repository")
		}
		g.commit("x")
		_, err := Open(g.dir)
		wantClass(t, err, ErrUnsupported, g.dir, `"reftable"`, "--ref-format=files")
	})
	g := newGit(t)
	// The same by their configuration alone, for versions of git without them. A
	// reftable repository has a HEAD that leads nowhere (gitrepository-layout(5)).
	for name, c := range map[string]struct {
		config string
		parts  []string // none: it is read
	}{
		"reftable":           {"[core]\nrepositoryformatversion = 1\n[extensions]\nrefStorage = reftable\n", []string{"reftable", "git refs migrate"}},
		"sha256, version 0":  {"[core]\nrepositoryformatversion = 0\n[extensions]\nobjectFormat = sha256\n", []string{"sha256"}},
		"unknown extension":  {"[core]\nrepositoryformatversion = 1\n[extensions]\nteleport = true\n", []string{`"teleport"`}},
		"compat hash":        {"[core]\nrepositoryformatversion = 1\n[extensions]\ncompatObjectFormat = sha256\n", []string{"compatobjectformat"}},
		"version 2":          {"[core]\nrepositoryformatversion = 2\n", []string{`version "2"`}},
		"version of a word":  {"[core]\nrepositoryformatversion = new\n", []string{`"new"`}},
		"version 1, nothing": {"[core]\nrepositoryformatversion = 1\n", nil},
		"version 0, unknown": {"[core]\nrepositoryformatversion = 0\n[extensions]\nteleport = true\n", nil},
		"sha1 and files":     {"[core]\nrepositoryformatversion = 1\n[extensions]\nobjectFormat = SHA1\nRefStorage = files\npreciousObjects = true\nnoop = 1\n", nil},
	} {
		t.Run(name+" by its configuration", func(t *testing.T) {
			g.write(".git/config", c.config)
			r, err := Open(g.dir)
			if c.parts == nil {
				if err != nil {
					t.Error(err)
				} else {
					r.Close()
				}
				return
			}
			wantClass(t, err, ErrUnsupported, append(c.parts, g.dir, "hint: ")...)
		})
	}
	t.Run("broken configuration", func(t *testing.T) {
		g.write(".git/config", "[core\nx")
		_, err := Open(g.dir)
		wantClass(t, err, ErrCorrupt, "configuration", g.dir)
	})
	t.Run("configuration in a circle", func(t *testing.T) {
		g.write(".git/config", "[include]\n\tpath = config\n")
		_, err := Open(g.dir)
		wantClass(t, err, ErrCorrupt, "include one another")
	})
}

// TestIndexFormats: split and sparse index files are refused with what to do,
// and doing that helps. The other versions of the file are read.
func TestIndexFormats(t *testing.T) {
	t.Parallel()
	t.Run("split", func(t *testing.T) {
		g := sample(t)
		g.git("update-index", "--split-index")
		_, err := g.open().Working("network")
		wantClass(t, err, ErrUnsupported, "split", "git update-index --no-split-index")
		g.git("update-index", "--no-split-index")
		checkWorking(t, g, "network")
	})
	t.Run("sparse", func(t *testing.T) {
		g := sample(t)
		if _, err := g.try("sparse-checkout", "set", "--cone", "--sparse-index", "network/routes"); err != nil {
			t.Skip("this git has no sparse index:", err)
		}
		r := g.open()
		if _, err := r.Working("network"); err != nil {
			wantClass(t, err, ErrUnsupported, "sparse", "--no-sparse-index")
		} else {
			t.Error("a sparse index was read")
		}
		g.git("sparse-checkout", "reapply", "--no-sparse-index")
		checkWorking(t, g, "network")
	})
	for _, version := range []string{"2", "3", "4"} {
		t.Run("version "+version, func(t *testing.T) {
			g := sample(t)
			if version == "3" { // an extended flag makes it so
				g.write("network/intended.csv", "x\n")
				g.git("add", "--intent-to-add", "network/intended.csv")
			} else {
				g.git("update-index", "--index-version", version)
			}
			if got := readFile(t, g.path(".git/index"))[4:8]; got != "\x00\x00\x00"+string(version[0]-'0') {
				t.Fatalf("the index has version %q", got)
			}
			g.write("network/more.csv", "x\n")
			checkWorking(t, g, "network")
		})
	}
	t.Run("extensions", func(t *testing.T) {
		g := sample(t)
		g.git("update-index", "--force-untracked-cache")
		g.git("config", "feature.manyFiles", "true")
		g.git("config", "index.skipHash", "true")
		g.git("rerere")
		g.write("network/more.csv", "x\n")
		g.git("add", "--all")
		g.git("status", "--porcelain")
		checkWorking(t, g, "network")
	})
	t.Run("conflict", func(t *testing.T) {
		g := sample(t)
		g.git("checkout", "--quiet", "-b", "ours")
		g.write("network/speed.csv", "ours\n")
		g.commit("ours")
		g.git("checkout", "--quiet", "-b", "theirs", "main")
		g.write("network/speed.csv", "theirs\n")
		g.commit("theirs")
		if _, err := g.try("merge", "--quiet", "ours"); err == nil {
			t.Fatal("no conflict")
		}
		checkWorking(t, g, "network")
		if tracked, err := g.open().Tracked(g.path("network/speed.csv")); !tracked || err != nil {
			t.Errorf("a file in conflict: %v, %v", tracked, err)
		}
	})
}

// TestSparse: a sparse checkout has its settings in a file of the worktree, and
// files that the index tracks are not on disk.
func TestSparse(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("sparse-checkout", "set", "network/routes")
	fsys := checkWorking(t, g, "network/routes")
	if len(walkNames(t, fsys)) != 3 {
		t.Error(walkNames(t, fsys))
	}
	checkWorking(t, g, ".")
	if tracked, err := g.open().Tracked(g.path("network/tools/check")); !tracked || err != nil {
		t.Errorf("a file outside the sparse checkout: %v, %v", tracked, err)
	}
}

// TestUnreadable: what may not be read is neither absent nor damaged.
func TestUnreadable(t *testing.T) {
	t.Parallel()
	if os.Getuid() <= 0 {
		t.Skip("permissions do not hold back this user")
	}
	g := looseSample(t)
	hash, tip := g.git("rev-parse", "main:network/speed.csv"), g.git("rev-parse", "main")
	g.write(".git/info/exclude", "*.tmp\n")
	packed := sample(t)
	packed.git("update-ref", "--create-reflog", "-m", "x", "refs/heads/side", "main")
	disk := func(name string) error {
		fsys, err := g.open().Working("network")
		if err == nil {
			_, err = fs.ReadFile(fsys, name)
		}
		return err
	}
	for what, c := range map[string]struct {
		path string
		read func() error
	}{
		"an object":                {g.loose(hash), func() error { return readAll(g.open(), tip) }},
		"a folder of objects":      {filepath.Dir(g.loose(hash)), func() error { _, err := g.open().Resolve(hash[:6]); return err }},
		"a folder on disk":         {g.path("network/routes"), func() error { return disk("speed.csv") }},
		"a file on disk":           {g.path("network/speed.csv"), func() error { return disk("speed.csv") }},
		"the objects":              {g.path(".git/objects"), func() error { _, err := Open(g.dir); return err }},
		"the references":           {g.path(".git/refs/heads"), func() error { _, err := g.open().Resolve("main"); return err }},
		"a reference":              {g.path(".git/refs/heads/main"), func() error { _, err := g.open().Resolve("main"); return err }},
		"the packs":                {g.path(".git/objects/pack"), func() error { return readAll(g.open(), tip) }},
		"a pack":                   {glob(t, packed.path(".git/objects/pack/*.pack"))[0], func() error { return readAll(packed.open(), tip) }},
		"a pack index":             {glob(t, packed.path(".git/objects/pack/*.idx"))[0], func() error { return readAll(packed.open(), tip) }},
		"a reflog":                 {packed.path(".git/logs/refs/heads/side"), func() error { _, err := packed.open().Resolve("side@{0}"); return err }},
		"the list of files":        {g.path(".git/index"), func() error { return disk("speed.csv") }},
		"the configuration":        {g.path(".git/config"), func() error { _, err := Open(g.dir); return err }},
		"the git folder":           {g.path(".git"), func() error { _, err := Open(g.dir); return err }},
		"the folder":               {g.dir, func() error { _, err := Open(g.dir); return err }},
		"the folder above":         {g.dir, func() error { _, err := Open(g.path("network")); return err }},
		"the user's own exclusion": {g.path(".git/info"), func() error { return disk("speed.csv") }},
	} {
		info, err := os.Stat(c.path)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.Chmod(c.path, 0); err != nil {
			t.Fatal(err)
		}
		err = c.read()
		os.Chmod(c.path, info.Mode())
		t.Run(what, func(t *testing.T) {
			wantClass(t, err, ErrUnreadable, "permission denied", "hint: see to it")
			if !errors.Is(err, fs.ErrPermission) || errors.Is(err, fs.ErrNotExist) {
				t.Errorf("error %v", err)
			}
		})
	}
	checkAll(t, g, g.open())
}

// TestUnreadableClass is for users whom no permissions hold back.
func TestUnreadableClass(t *testing.T) {
	t.Parallel()
	refusal := &fs.PathError{Op: "open", Path: "x", Err: fs.ErrPermission}
	at := &node{path: "in/x.csv"}
	for name, err := range map[string]error{
		"corrupt": corrupt("reference", refusal), "no repository": noRepository("x", refusal), "on disk": diskError("open", at, refusal),
		"other": orUnreadable("folder", refusal), "classed already": orUnreadable("folder", unreadable("file", refusal)),
	} {
		t.Run(name, func(t *testing.T) { wantClass(t, err, ErrUnreadable, "permission denied", "hint: see to it") })
	}
	for name, err := range map[string]error{"on disk": diskError("open", at, fs.ErrNotExist), "other": orUnreadable("folder", fs.ErrNotExist)} {
		if err != fs.ErrNotExist {
			t.Errorf("%s: %v", name, err)
		}
	}
}
