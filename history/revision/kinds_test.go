package revision

import (
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/go-git/go-git/v5/plumbing"
)

// TestKinds reads the same history from repositories that are laid out in every
// way that git has (git-repack(1), git-pack-objects(1), git-worktree(1),
// gitrepository-layout(5)).
func TestKinds(t *testing.T) {
	// Those that need objects in files of their own, and those that only read.
	loose := []string{"several packs", "several packs and one index", "packs and loose", "packed and loose twice"}
	read := []string{
		"loose", "bare", "linked worktree of a bare repository", "bare inside a working tree", "git folder itself", "folder below", "reached by a link",
		"alternates, absolute", "alternates, relative", "alternates, quoted", "alternates of alternates",
	}
	for name, build := range map[string]func(t *testing.T, g *gitRepo) *gitRepo{
		"loose": func(t *testing.T, g *gitRepo) *gitRepo { return g },
		"packed, offset deltas": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("-c", "repack.useDeltaBaseOffset=true", "repack", "-adf", "--quiet")
			wantKind(t, g, plumbing.OFSDeltaObject)
			return g
		},
		"packed, reference deltas": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("-c", "repack.useDeltaBaseOffset=false", "repack", "-adf", "--quiet")
			wantKind(t, g, plumbing.REFDeltaObject)
			return g
		},
		"packed without deltas":        func(t *testing.T, g *gitRepo) *gitRepo { g.git("repack", "-adf", "--quiet", "--depth=0"); return g },
		"several packs":                severalPacks,
		"several packs and one index":  multiIndex,
		"packs and loose":              packsAndLoose,
		"packed and loose twice":       func(t *testing.T, g *gitRepo) *gitRepo { g.git("repack", "-a", "--quiet"); return g },
		"index with long offsets":      longOffsets,
		"after gc":                     func(t *testing.T, g *gitRepo) *gitRepo { g.git("gc", "--quiet", "--prune=now"); return g },
		"after gc, aggressive":         func(t *testing.T, g *gitRepo) *gitRepo { g.git("gc", "--quiet", "--aggressive"); return g },
		"commit graph":                 func(t *testing.T, g *gitRepo) *gitRepo { g.git("commit-graph", "write", "--reachable"); return g },
		"packed references":            func(t *testing.T, g *gitRepo) *gitRepo { g.git("pack-refs", "--all", "--prune"); return g },
		"packed references, loose new": packedRefsLooseNew,
		"stored uncompressed": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("-c", "pack.compression=0", "repack", "-adfF", "--quiet")
			return g
		},
		"linked worktree": func(t *testing.T, g *gitRepo) *gitRepo {
			dir := filepath.Join(tempDir(t), "linked tree")
			g.git("worktree", "add", "--quiet", "--detach", dir, "main~2")
			return g.at(dir)
		},
		"linked worktree of a bare repository": func(t *testing.T, g *gitRepo) *gitRepo {
			dir := tempDir(t)
			g.git("clone", "--quiet", "--mirror", g.dir, filepath.Join(dir, "bare"))
			g.at(filepath.Join(dir, "bare")).git("worktree", "add", "--quiet", filepath.Join(dir, "linked"), "side")
			return g.at(filepath.Join(dir, "linked"))
		},
		"bare": func(t *testing.T, g *gitRepo) *gitRepo {
			dir := filepath.Join(tempDir(t), "bare.git")
			g.git("clone", "--quiet", "--mirror", g.dir, dir)
			return g.at(dir)
		},
		"bare inside a working tree": func(t *testing.T, g *gitRepo) *gitRepo {
			outer := newGit(t)
			outer.commit("outer")
			g.git("clone", "--quiet", "--mirror", g.dir, outer.path("inner/bare"))
			return g.at(outer.path("inner/bare"))
		},
		"git folder itself": func(t *testing.T, g *gitRepo) *gitRepo { return g.at(g.path(".git")) },
		"folder below":      func(t *testing.T, g *gitRepo) *gitRepo { return g.at(g.path("network/routes/r1")) },
		"git folder elsewhere": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("init", "--quiet", "--separate-git-dir="+filepath.Join(tempDir(t), "apart"))
			return g
		},
		"reached by a link": func(t *testing.T, g *gitRepo) *gitRepo {
			link := filepath.Join(tempDir(t), "link")
			if err := os.Symlink(g.path("network"), link); err != nil {
				t.Skip(err)
			}
			return g.at(link)
		},
		"alternates, absolute": func(t *testing.T, g *gitRepo) *gitRepo {
			dir := filepath.Join(tempDir(t), "copy")
			g.git("clone", "--quiet", "--mirror", "--shared", g.dir, dir)
			return g.at(dir)
		},
		"alternates, relative": func(t *testing.T, g *gitRepo) *gitRepo {
			return alternate(t, g, func(rel, _ string) string { return rel })
		},
		"alternates, quoted": func(t *testing.T, g *gitRepo) *gitRepo {
			return alternate(t, g, func(_, abs string) string {
				return "# a comment\n\n\"" + strings.ReplaceAll(filepath.ToSlash(abs), "o", `\157`) + "\""
			})
		},
		"alternates of alternates": func(t *testing.T, g *gitRepo) *gitRepo {
			middle := alternate(t, g, func(rel, _ string) string { return rel })
			dir := filepath.Join(tempDir(t), "copy")
			g.git("clone", "--quiet", "--mirror", "--shared", middle.dir, dir)
			return g.at(dir)
		},
		"sparse checkout": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("sparse-checkout", "set", "network/routes")
			if g.git("config", "--worktree", "core.sparseCheckout") != "true" {
				t.Fatal("no configuration of the worktree")
			}
			return g
		},
		"detached": func(t *testing.T, g *gitRepo) *gitRepo { g.git("checkout", "--quiet", "--detach", "v1"); return g },
		"replaced": func(t *testing.T, g *gitRepo) *gitRepo {
			g.git("replace", "main~1", "apart")
			g.git("replace", g.git("rev-parse", "main:network/speed.csv"), g.git("rev-parse", "main:elsewhere.txt"))
			if n := len(lines(g.git("for-each-ref", "refs/replace/"))); n != 2 {
				t.Fatal(n, "replace refs")
			}
			return g
		},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			from := sample
			switch {
			case slices.Contains(loose, name):
				from = looseSample
			case slices.Contains(read, name):
				from = func(t testing.TB) *gitRepo { return shared(t, name == "bare") }
			}
			g := build(t, from(t))
			checkAll(t, &gitRepo{t, g.dir}, openDir(t, g.dir))
		})
	}
}

// wantKind makes sure that a pack really holds entries of a kind.
func wantKind(t *testing.T, g *gitRepo, kind plumbing.ObjectType) {
	t.Helper()
	r := g.open()
	packs, err := r.store.current(true)
	if err != nil || len(packs) != 1 {
		t.Fatal(len(packs), "packs", err)
	}
	f, err := packs[0].open()
	if err != nil {
		t.Fatal(err)
	}
	kinds := map[plumbing.ObjectType]int{}
	for i := range packs[0].index.count() {
		h, err := packs[0].index.hashAt(i)
		if err != nil {
			t.Fatal(err)
		}
		offset, _, err := packs[0].index.offset(h)
		if err != nil {
			t.Fatal(err)
		}
		e, err := packs[0].entry(f, offset)
		if err != nil {
			t.Fatal(err)
		}
		kinds[e.kind]++
	}
	if kinds[kind] == 0 {
		t.Fatalf("the pack holds no %s: %v", kind, kinds)
	}
}

// pack writes the objects that some revisions reach into a pack of their own.
func (g *gitRepo) pack(revisions ...string) {
	g.t.Helper()
	g.feed(strings.Join(revisions, "\n")+"\n", "pack-objects", "--quiet", "--revs", "--delta-base-offset", g.path(".git/objects/pack/pack"))
}

func severalPacks(t *testing.T, g *gitRepo) *gitRepo {
	g.pack("v1")
	g.pack("main~3", "^v1")
	g.git("prune-packed", "--quiet")
	g.git("repack", "-d", "--quiet") // what is loose still
	if n := len(glob(t, g.path(".git/objects/pack/*.pack"))); n != 3 {
		t.Fatal(n, "packs")
	}
	return g
}

func multiIndex(t *testing.T, g *gitRepo) *gitRepo {
	severalPacks(t, g).git("multi-pack-index", "write")
	return g
}

func packsAndLoose(t *testing.T, g *gitRepo) *gitRepo {
	g.pack("v1")
	g.git("prune-packed", "--quiet")
	return g
}

// longOffsets writes the index so that nearly every offset takes the table of
// eight bytes, as in a pack of more than 2 GiB.
func longOffsets(t *testing.T, g *gitRepo) *gitRepo {
	g.git("repack", "-adf", "--quiet")
	pack := glob(t, g.path(".git/objects/pack/*.pack"))[0]
	idx := strings.TrimSuffix(pack, ".pack") + ".idx"
	before := len(readFile(t, idx))
	os.Chmod(idx, 0o644)
	g.git("index-pack", "--index-version=2,0x40", "-o", idx, pack)
	if after := len(readFile(t, idx)); after < before+8*10 {
		t.Fatal("the index has no long offsets:", before, after)
	}
	return g
}

func packedRefsLooseNew(t *testing.T, g *gitRepo) *gitRepo {
	g.git("pack-refs", "--all", "--prune")
	g.git("branch", "--force", "side", "main~1")
	g.git("tag", "--force", "light", "main")
	g.git("branch", "-D", "--quiet", "topic/deep")
	return g
}

// alternate makes a bare repository that borrows all objects from g, with a path
// written as given.
func alternate(t *testing.T, g *gitRepo, write func(relative, absolute string) string) *gitRepo {
	t.Helper()
	dir := filepath.Join(tempDir(t), "borrower")
	g.git("clone", "--quiet", "--mirror", "--shared", g.dir, dir)
	objects := g.path(".git/objects")
	if g.git("rev-parse", "--is-bare-repository") == "true" {
		objects = g.path("objects")
	}
	rel, err := filepath.Rel(filepath.Join(dir, "objects"), objects)
	if err != nil {
		t.Fatal(err)
	}
	writeFile(t, filepath.Join(dir, "objects/info/alternates"), write(filepath.ToSlash(rel), objects)+"\n")
	return g.at(dir)
}

func glob(t testing.TB, pattern string) []string {
	t.Helper()
	names, err := filepath.Glob(pattern)
	if err != nil {
		t.Fatal(err)
	}
	if len(names) == 0 {
		t.Fatalf("nothing matches %q", pattern)
	}
	return names
}
