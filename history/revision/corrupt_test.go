package revision

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"strings"
	"testing"
)

// readAll reads every file of a commit, at once and in pieces, and gives the
// first error. Both ways must find it.
func readAll(r *Repo, commit string) error {
	fsys, err := r.Snapshot(commit, ".")
	if err != nil {
		return err
	}
	return fs.WalkDir(fsys, ".", func(name string, e fs.DirEntry, err error) error {
		if err != nil || !e.Type().IsRegular() {
			return err
		}
		_, whole := fs.ReadFile(fsys, name)
		f, pieces := fsys.Open(name)
		if pieces == nil {
			defer f.Close()
			_, pieces = io.Copy(io.Discard, f)
		}
		if (whole == nil) != (pieces == nil) {
			return fmt.Errorf("%q: read at once %v, in pieces %v", name, whole, pieces)
		}
		return whole
	})
}

// TestCorruptLoose damages one loose object at a time.
func TestCorruptLoose(t *testing.T) {
	t.Parallel()
	damages := map[string]func(whole string) string{
		"empty":            func(string) string { return "" },
		"zeros":            func(w string) string { return strings.Repeat("\x00", len(w)) },
		"text":             func(string) string { return "this is no object\n" },
		"cut short":        func(w string) string { return w[:len(w)/2] },
		"last bytes":       func(w string) string { return w[:len(w)-2] + "xx" },
		"middle":           func(w string) string { return w[:len(w)/2] + "\xff\x00\xff" + w[len(w)/2+3:] },
		"other content":    func(string) string { return deflate("blob 2\x00y\n") },
		"no type":          func(string) string { return deflate("2\x00y\n") },
		"unknown type":     func(string) string { return deflate("blop 2\x00y\n") },
		"size too small":   func(string) string { return deflate("blob 1\x00y\n") },
		"size too large":   func(string) string { return deflate("blob 3\x00y\n") },
		"size negative":    func(string) string { return deflate("blob -2\x00y\n") },
		"size of a word":   func(string) string { return deflate("blob two\x00y\n") },
		"size enormous":    func(string) string { return deflate("blob 9999999999999\x00y\n") },
		"head without end": func(string) string { return deflate("blob 2" + strings.Repeat("2", 40)) },
		"nothing in it":    func(string) string { return deflate("") },
	}
	g := looseSample(t)
	tip := g.git("rev-parse", "main")
	for _, what := range []string{"main:network/speed.csv", "main:network/routes", "main^{tree}", "main"} {
		hash := g.git("rev-parse", what)
		whole := readFile(t, g.loose(hash))
		other := g.git("rev-parse", map[string]string{
			"main": "main~1", "main^{tree}": "main~1^{tree}", "main:network/routes": "main:network/tools",
			"main:network/speed.csv": "main:elsewhere.txt",
		}[what])
		damages["another object of its kind"] = func(string) string { return readFile(t, g.loose(other)) }
		for name, damage := range damages {
			writeFile(t, g.loose(hash), damage(whole))
			err := readAll(g.open(), tip)
			t.Run(what+", "+name, func(t *testing.T) {
				wantClass(t, err, ErrCorrupt, hash, "git fsck")
				if errors.Is(err, fs.ErrNotExist) {
					t.Errorf("a damaged object looks like an absent path: %v", err)
				}
			})
		}
		writeFile(t, g.loose(hash), whole)
		if err := readAll(g.open(), tip); err != nil {
			t.Errorf("mended: %v", err)
		}
	}
}

// TestCorruptPiecemeal: the bytes of a damaged file come before its end does, so
// the error stands in the place of io.EOF.
func TestCorruptPiecemeal(t *testing.T) {
	t.Parallel()
	g := looseSample(t)
	hash := g.git("rev-parse", "main:network/routes/r1/route.toml")
	writeFile(t, g.loose(hash), deflate("blob 10\x00id = \"R2\"\n"))
	fsys, err := g.open().Snapshot(g.git("rev-parse", "main"), "network/routes/r1")
	if err != nil {
		t.Fatal(err)
	}
	f, err := fsys.Open("route.toml")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	data, err := io.ReadAll(f)
	wantClass(t, err, ErrCorrupt, hash, "route.toml")
	if len(data) != 10 {
		t.Errorf("%q before the error", data)
	}
	if n, err := f.Read(make([]byte, 4)); n != 0 || !errors.Is(err, ErrCorrupt) {
		t.Errorf("after the error: %d, %v", n, err)
	}
}

// TestCorruptPack flips bytes of a pack and of its index, one at a time: whatever
// is read must be right or an error.
func TestCorruptPack(t *testing.T) {
	t.Parallel()
	g := shared(t, true)
	tip := g.git("rev-parse", "HEAD")
	sparse := g.at(tempDir(t))
	sparse.git("init", "--quiet", "--bare")
	sparse.git("fetch", "--quiet", "--depth=1", "file://"+g.dir, "HEAD:refs/heads/main")
	sparse.git("repack", "-adf", "--quiet")
	os.Remove(sparse.path("shallow"))
	packFile := glob(t, sparse.path("objects/pack/*.pack"))[0]
	idxFile := strings.TrimSuffix(packFile, ".pack") + ".idx"
	want := contents(t, openDir(t, sparse.dir), tip)
	for _, file := range []string{packFile, idxFile} {
		whole := []byte(readFile(t, file))
		found := 0
		check := func(what string, data []byte) {
			t.Helper()
			writeFile(t, file, string(data))
			r, err := Open(sparse.dir)
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			if err = readAll(r, tip); err == nil {
				if got := contents(t, r, tip); got != want {
					t.Errorf("%s of %s: other content without an error", what, file)
				}
				return
			}
			found++
			if !errors.Is(err, ErrCorrupt) && !errors.Is(err, ErrMissingObject) {
				t.Errorf("%s of %s: %v", what, file, err)
			}
			if errors.Is(err, fs.ErrNotExist) {
				t.Errorf("%s of %s looks like an absent path: %v", what, file, err)
			}
		}
		step := max(1, len(whole)/150)
		for i := 0; i < len(whole); i += step {
			data := bytes.Clone(whole)
			data[i] ^= 0x55
			check(fmt.Sprintf("byte %d", i), data)
		}
		for _, n := range []int{0, 1, 7, 8, 11, 12, 100, 1000, len(whole) / 2, len(whole) - 21} {
			check(fmt.Sprintf("%d bytes", n), whole[:n])
		}
		if found < 100 {
			t.Errorf("%s: only %d damages found", file, found)
		}
		writeFile(t, file, string(whole))
	}
	if got := contents(t, openDir(t, sparse.dir), tip); got != want {
		t.Error("mended, but other content")
	}
}

func contents(t testing.TB, r *Repo, commit string) string {
	t.Helper()
	fsys, err := r.Snapshot(commit, ".")
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	for _, name := range walkNames(t, fsys) {
		data, _ := fs.ReadFile(fsys, name) // not for links
		fmt.Fprintf(&b, "%s %q\n", name, data)
	}
	return b.String()
}

// TestPackIndexVersion: an index of version 1 (gitformat-pack(5)) is refused with
// the way out.
func TestPackIndexVersion(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("-c", "pack.indexVersion=1", "repack", "-adf", "--quiet")
	_, err := g.open().Resolve("main")
	wantClass(t, err, ErrUnsupported, "version 1", ".idx", "git repack -ad", "pack.indexVersion")
	g.follow(err)
	checkResolve(t, g, g.open(), []string{"main"})
	// What only looks like one is damaged.
	idx := glob(t, g.path(".git/objects/pack/*.idx"))[0]
	for _, data := range []string{strings.Repeat("\x00", 1024), strings.Repeat("\x00\x00\x00\x01", 256) + strings.Repeat("x", 63), strings.Repeat("\x01\x00", 600)} {
		writeFile(t, idx, data)
		_, err := g.open().Resolve("main")
		wantClass(t, err, ErrCorrupt, ".idx")
	}
}

// TestPackAlone: a pack without an index is not used, an index without its pack
// neither.
func TestPackAlone(t *testing.T) {
	t.Parallel()
	g := sample(t)
	g.git("repack", "-ad", "--quiet")
	pack := glob(t, g.path(".git/objects/pack/*.pack"))[0]
	idx := strings.TrimSuffix(pack, ".pack") + ".idx"
	main := g.git("rev-parse", "main")
	for _, file := range []string{pack, idx} {
		if err := os.Rename(file, file+".away"); err != nil {
			t.Fatal(err)
		}
		_, err := g.open().Resolve("main")
		wantClass(t, err, ErrMissingObject, main)
		if err := os.Rename(file+".away", file); err != nil {
			t.Fatal(err)
		}
	}
	checkResolve(t, g, g.open(), []string{"main"})
}

// TestCorruptIndex: the list of tracked files must be whole.
func TestCorruptIndex(t *testing.T) {
	t.Parallel()
	g := sample(t)
	whole := readFile(t, g.path(".git/index"))
	r := g.open()
	for name, data := range map[string]string{
		"empty": "", "text": "no index\n", "cut short": whole[:len(whole)/2], "a byte": whole[:100] + "\xff" + whole[101:], "without its sum": whole[:len(whole)-20],
	} {
		g.write(".git/index", data)
		_, err := r.Working("network")
		t.Run(name, func(t *testing.T) { wantClass(t, err, ErrCorrupt, "index") })
		_, err = r.Tracked(g.path("network/speed.csv"))
		t.Run(name, func(t *testing.T) { wantClass(t, err, ErrCorrupt, "index") })
	}
	os.Remove(g.path(".git/index"))
	if tracked, err := r.Tracked(g.path("network/speed.csv")); tracked || err != nil {
		t.Errorf("without an index: %v, %v", tracked, err)
	}
	checkWorking(t, g, "network")
}
