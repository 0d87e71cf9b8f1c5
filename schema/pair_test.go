package schema

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"io/fs"
	"path"
	"reflect"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"pgregory.net/rapid"

	"speedtrail/schema/source"
)

// identified is a file system whose folders have the hash of their content as
// identity, as those of a Git tree have.
type identified struct{ fstest.MapFS }

type identifiedEntry struct {
	fs.DirEntry
	identity string
}

func (e identifiedEntry) Identity() string { return e.identity }

func (m identified) ReadDir(name string) ([]fs.DirEntry, error) {
	entries, err := m.MapFS.ReadDir(name)
	for i, e := range entries {
		if e.IsDir() {
			entries[i] = identifiedEntry{e, m.identity(path.Join(name, e.Name()) + "/")}
		}
	}
	return entries, err
}

func (m identified) identity(prefix string) string {
	var names []string
	for name := range m.MapFS {
		if strings.HasPrefix(name, prefix) {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	h := sha256.New()
	for _, name := range names {
		content := sha256.Sum256(m.MapFS[name].Data)
		h.Write([]byte(strings.TrimPrefix(name, prefix) + "\x00"))
		h.Write(content[:])
	}
	return hex.EncodeToString(h.Sum(nil))
}

// without gives a loaded data set as LoadPair gives it where the folders were
// left unread.
func without(d *Dataset, unread []Folder) *Dataset {
	c := *d
	c.Unread, c.Routes, c.Files = unread, nil, nil
	skip := func(p string) bool {
		return slices.ContainsFunc(unread, func(f Folder) bool { return p == f.Path || strings.HasPrefix(p, f.Path+"/") })
	}
	for _, r := range d.Routes {
		if !skip(r.Folder) {
			c.Routes = append(c.Routes, r)
		}
	}
	for _, f := range d.Files {
		if !skip(f.Path) {
			c.Files = append(c.Files, f)
		}
	}
	return &c
}

// several is a data set of four routes.
func several() fstest.MapFS {
	m := small()
	for _, id := range []string{"R2", "R3", "R4"} {
		folder := "routes/" + strings.ToLower(id) + "/"
		m = with(m, folder+"route.toml", strings.ReplaceAll(string(m["routes/r1/route.toml"].Data), "R1", id))
		m = with(m, folder+"speed.csv", string(m["routes/r1/speed.csv"].Data))
	}
	return m
}

func folders(list []Folder) string {
	var paths []string
	for _, f := range list {
		paths = append(paths, f.Path)
	}
	return strings.Join(paths, " ")
}

// TestLoadPair compares LoadPair with Load on both sides.
func TestLoadPair(t *testing.T) {
	base := several()
	edited := func(name, content string) fstest.MapFS { return with(base, name, content) }
	const speed = "from_km,to_km,basic\n0,10,95\n"
	tests := []struct {
		name           string
		base, target   fs.FS
		before, behind string // folders that are left unread
	}{
		{"equal", identified{base}, identified{clone(base)}, "routes/r1 routes/r2 routes/r3 routes/r4", "routes/r1 routes/r2 routes/r3 routes/r4"},
		{"one table", identified{base}, identified{edited("routes/r2/speed.csv", speed)}, "routes/r1 routes/r3 routes/r4", "routes/r1 routes/r3 routes/r4"},
		{"a file that is not read", identified{base}, identified{edited("routes/r2/drawing.txt", "new")}, "routes/r1 routes/r3 routes/r4", "routes/r1 routes/r3 routes/r4"},
		{"the frame", identified{base}, identified{edited("dataset.toml", "format = 1\nname = \"Other\"\n")}, "routes/r1 routes/r2 routes/r3 routes/r4", "routes/r1 routes/r2 routes/r3 routes/r4"},
		{"a route more", identified{with(with(base, "routes/r4/route.toml", ""), "routes/r4/speed.csv", "")}, identified{base}, "routes/r1 routes/r2 routes/r3", "routes/r1 routes/r2 routes/r3"},
		{"a route less", identified{base}, identified{with(with(base, "routes/r4/route.toml", ""), "routes/r4/speed.csv", "")}, "routes/r1 routes/r2 routes/r3", "routes/r1 routes/r2 routes/r3"},
		{"another id", identified{base}, identified{edited("routes/r2/route.toml", "id = \"R9\"\nname = \"Nine\"\nstart_km = 0\nend_km = 10\n")}, "routes/r1 routes/r3 routes/r4", "routes/r1 routes/r3 routes/r4"},
		{"folders without identity", base, clone(base), "", ""},
		{"identity on one side", identified{base}, clone(base), "", ""},
		{"identity on the other side", base, identified{clone(base)}, "", ""},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			b, a, err := LoadPair(t.Context(), c.base, c.target)
			if err != nil {
				t.Fatal(err)
			}
			equal(t, "unread of the base", folders(b.Unread), c.before)
			equal(t, "unread of the target", folders(a.Unread), c.behind)
			equal(t, "base", plain(b), plain(without(load(t, c.base), b.Unread)))
			equal(t, "target", plain(a), plain(without(load(t, c.target), a.Unread)))
			equal(t, "files of the base", b.Files, without(load(t, c.base), b.Unread).Files)
			equal(t, "files of the target", a.Files, without(load(t, c.target), a.Unread).Files)
			checkUnreadRoutes(t, c.base, b.Unread)
			checkUnreadRoutes(t, c.target, a.Unread)
		})
	}
}

// checkUnreadRoutes wants what Load gives of each unread route, but its tables.
func checkUnreadRoutes(t *testing.T, fsys fs.FS, unread []Folder) {
	t.Helper()
	for _, r := range load(t, fsys).Routes {
		i := slices.IndexFunc(unread, func(f Folder) bool { return f.Path == r.Folder })
		if i < 0 {
			continue
		}
		got, err := UnreadRoute(fsys, unread[i])
		if err != nil {
			t.Errorf("%s: %v", r.Folder, err)
			continue
		}
		want := *r
		want.Speed, want.AxleLoad, want.Temporary, want.Curves, want.Gradients, want.Places = nil, nil, nil, nil, nil, nil
		equal(t, r.Folder, *got, want)
	}
}

func TestUnreadRouteFaults(t *testing.T) {
	m := with(small(), "routes/r1/route.toml", "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 0\n")
	r, err := UnreadRoute(m, Folder{Path: "routes/r1"})
	if r != nil || err == nil || err.Error() != "routes/r1/route.toml:4:1: end_km 0.000 does not lie after start_km 0.000" {
		t.Errorf("%+v, %v", r, err)
	}
	if r, err := UnreadRoute(m, Folder{Path: "routes/nowhere"}); r != nil || err == nil {
		t.Errorf("%+v, %v", r, err)
	}
	if r, err := UnreadRoute(failing{m, "routes/r1/route.toml"}, Folder{Path: "routes/r1"}); r != nil || !errors.Is(err, errDisk) {
		t.Errorf("%+v, %v", r, err)
	}
}

// TestLoadPairMoved: an equal folder with another name is another folder.
func TestLoadPairMoved(t *testing.T) {
	base := several()
	target := with(with(base, "routes/r4/route.toml", ""), "routes/r4/speed.csv", "")
	target = with(target, "routes/x/route.toml", string(base["routes/r4/route.toml"].Data))
	target = with(target, "routes/x/speed.csv", string(base["routes/r4/speed.csv"].Data))
	b, a, err := LoadPair(t.Context(), identified{base}, identified{target})
	if err != nil {
		t.Fatal(err)
	}
	if len(b.Routes) != 1 || len(a.Routes) != 1 || a.Routes[0].ID != "R4" || a.Routes[0].Folder != "routes/x" {
		t.Errorf("base %v, target %v", b.Routes, a.Routes)
	}
}

// TestLoadPairFaults checks that a fault is told for the side that has it.
func TestLoadPairFaults(t *testing.T) {
	good := several()
	bad := func(basic string) fstest.MapFS {
		return with(good, "routes/r2/speed.csv", "from_km,to_km,basic\n0,10,"+basic+"\n")
	}
	taken := with(good, "routes/r2/route.toml", "id = \"R3\"\nname = \"Two\"\nstart_km = 0\nend_km = 10\n")
	added := with(with(good, "routes/a/route.toml", string(good["routes/r3/route.toml"].Data)), "routes/a/speed.csv", string(good["routes/r3/speed.csv"].Data))
	tests := []struct {
		name         string
		base, target fstest.MapFS
		want         string
	}{
		{"base", bad("47"), good, `base: routes/r2/speed.csv:2:6: basic "47" is not a multiple of 5 from 5 to 600 (km/h), in digits alone`},
		{"target", good, bad("0"), `target: routes/r2/speed.csv:2:6: basic "0" is not a multiple of 5 from 5 to 600 (km/h), in digits alone`},
		{"both", bad("47"), bad("0"), `base: routes/r2/speed.csv:2:6: basic "47" is not a multiple of 5 from 5 to 600 (km/h), in digits alone
target: routes/r2/speed.csv:2:6: basic "0" is not a multiple of 5 from 5 to 600 (km/h), in digits alone`},
		{"frame", with(good, "dataset.toml", ""), with(good, "trains.toml", ""), "base: dataset.toml: the file is missing\ntarget: trains.toml: the file is missing"},
		{"folder without route", good, with(good, "routes/r2/route.toml", ""), "target: routes/r2/route.toml: the file is missing, every folder in routes/ is a route"},
		{"id of an unread route", good, taken, `target: routes/r2/route.toml:1:6: route id "R3" is that of routes/r3, too; ids are unique`},
		{"new folder with the id of an unread one", good, added, `target: routes/a/route.toml:1:6: route id "R3" is that of routes/r3, too; ids are unique`},
		{"id of an unread route in the base", taken, good, `base: routes/r2/route.toml:1:6: route id "R3" is that of routes/r3, too; ids are unique`},
		{"old folder with the id of an unread one", added, good, `base: routes/a/route.toml:1:6: route id "R3" is that of routes/r3, too; ids are unique`},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			b, a, err := LoadPair(t.Context(), identified{c.base}, identified{c.target})
			var pair *PairError
			if !errors.As(err, &pair) {
				t.Fatalf("error %v", err)
			}
			if b != nil || a != nil {
				t.Error("data beside an error")
			}
			equal(t, "error", err.Error(), c.want)
			for name, side := range map[string]error{"base: ": pair.Base, "target: ": pair.Target} {
				if has := strings.Contains("\n"+c.want, "\n"+name); has != (side != nil) {
					t.Errorf("%s%v", name, side)
				}
			}
			var faults *source.Faults
			if !errors.As(err, &faults) || faults.Count != 1 {
				t.Errorf("faults %v", faults)
			}
		})
	}
}

// TestLoadPairLeavesUnread: route.toml of an equal folder is not even opened
// where the folders that differ have the same ids on both sides.
func TestLoadPairLeavesUnread(t *testing.T) {
	base := several()
	edited := with(base, "routes/r2/speed.csv", "from_km,to_km,basic\n0,10,95\n")
	renamed := with(base, "routes/r2/route.toml", "id = \"R9\"\nname = \"Nine\"\nstart_km = 0\nend_km = 10\n")
	for _, c := range []struct {
		name         string
		base, target fstest.MapFS
		opened       bool
	}{
		{"a table", base, edited, false},
		{"another id", base, renamed, true},
		{"another id in the base", renamed, base, true},
	} {
		guard := func(m fstest.MapFS) fs.FS { return unopened{identified{m}, "routes/r3/route.toml"} }
		if _, _, err := LoadPair(t.Context(), guard(c.base), guard(c.target)); errors.Is(err, errDisk) != c.opened || (err != nil) != c.opened {
			t.Errorf("%s: %v", c.name, err)
		}
	}
}

// unopened is a file system with identities in which one file must not be
// opened.
type unopened struct {
	identified
	path string
}

func (u unopened) Open(name string) (fs.File, error) {
	if name == u.path {
		return nil, errDisk
	}
	return u.identified.Open(name)
}

// TestLoadPairFailing wants the error of the file system on its side.
func TestLoadPairFailing(t *testing.T) {
	base := several()
	target := with(base, "routes/r2/speed.csv", "from_km,to_km,basic\n0,10,95\n")
	_, _, err := LoadPair(t.Context(), base, failing{target, "routes/r2/speed.csv"})
	var pair *PairError
	if !errors.As(err, &pair) || pair.Base != nil || !errors.Is(pair.Target, errDisk) {
		t.Errorf("error %v", err)
	}
}

// TestLoadPairRandomEdits: whatever is edited, a pair is what Load gives, but
// for the folders that hold the same on both sides, and those are left out.
func TestLoadPairRandomEdits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base := several()
		target := clone(base)
		for range rapid.IntRange(0, 4).Draw(t, "edits") {
			folder := "routes/r" + rapid.StringMatching(`[1-6]`).Draw(t, "route")
			side := target
			if rapid.Bool().Draw(t, "in the base") {
				side = base
			}
			speed := rapid.SampledFrom([]string{"80", "90"}).Draw(t, "speed")
			id := strings.ToUpper(path.Base(folder))
			switch rapid.SampledFrom([]string{"edit", "remove", "note"}).Draw(t, "what") {
			case "edit":
				side[folder+"/route.toml"] = &fstest.MapFile{Data: []byte("id = \"" + id + "\"\nname = \"One\"\nstart_km = 0\nend_km = 10\n")}
				side[folder+"/speed.csv"] = &fstest.MapFile{Data: []byte("from_km,to_km,basic\n0,10," + speed + "\n")}
			case "remove":
				if folder != "routes/r1" {
					delete(side, folder+"/route.toml")
					delete(side, folder+"/speed.csv")
					delete(side, folder+"/note.txt")
				}
			case "note":
				if side[folder+"/route.toml"] != nil {
					side[folder+"/note.txt"] = &fstest.MapFile{Data: []byte(speed)}
				}
			}
		}
		b, a, err := LoadPair(t.Context(), identified{base}, identified{target})
		if err != nil {
			t.Fatal(err)
		}
		for side, d := range map[string]*Dataset{"base": b, "target": a} {
			files := map[string]fstest.MapFS{"base": base, "target": target}[side]
			whole, err := Load(t.Context(), files)
			if err != nil {
				t.Fatal(err)
			}
			if want := without(whole, d.Unread); !reflect.DeepEqual(plain(d), plain(want)) || !reflect.DeepEqual(d.Files, want.Files) {
				t.Errorf("%s: %+v, want %+v", side, d, want)
			}
			for _, r := range whole.Routes {
				same := identified{base}.identity(r.Folder+"/") == identified{target}.identity(r.Folder+"/")
				if unread := strings.Contains(folders(d.Unread)+" ", r.Folder+" "); unread != same {
					t.Errorf("%s: %s unread %v, equal on both sides %v", side, r.Folder, unread, same)
				}
			}
		}
	})
}
