package schema

import (
	"errors"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"
	"testing/fstest"
	"unicode/utf8"

	"golang.org/x/crypto/ssh"
	"golang.org/x/tools/txtar"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
	"speedtrail/schema/unit"
)

// FuzzAllowedSigners: a line is a key or a fault; a key is one that the line
// writes out, of one principal.
func FuzzAllowedSigners(f *testing.F) {
	content, err := os.ReadFile(datasets + "/full/allowed_signers")
	if err != nil {
		f.Fatal(err)
	}
	f.Add(content)
	for line := range strings.Lines(string(content)) {
		f.Add([]byte(strings.TrimSpace(line)))
	}
	for _, s := range []string{"", "#", "a cert-authority ssh-ed25519 AAAA", "a@b namespaces=\"x,y\",valid-after=\"20260301Z\" ssh-rsa AAAA", "*@b ssh-ed25519 AAAA\r\n\r\n#x\n", "a\x00 \xff"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, content []byte) {
		r, p := &reader{}, &Policy{}
		r.allowedSigners(p, content)
		lines := strings.Split(string(content), "\n")
		if !utf8.Valid(content) {
			if r.faults.Count() == 0 || len(p.Keys) > 0 {
				t.Fatalf("%d keys of a file that is not UTF-8, %d faults", len(p.Keys), r.faults.Count())
			}
			return
		}
		if _, merge := table.MergeMarker(content); merge {
			if r.faults.Count() != 1 || len(p.Keys) > 0 {
				t.Fatalf("%d keys of a file that holds two, %d faults", len(p.Keys), r.faults.Count())
			}
			return
		}
		told := map[int]bool{}
		most := len(lines) // up to which line all faults are listed
		if faults, ok := r.faults.Err().(*source.Faults); ok {
			for _, fault := range faults.List {
				if fault.File != signersFile || fault.Line < 1 || fault.Line > len(lines) || told[fault.Line] {
					t.Fatalf("%v of %d lines", fault, len(lines))
				}
				told[fault.Line] = true
			}
			if faults.Count > len(faults.List) {
				most = faults.List[len(faults.List)-1].Line
			}
		}
		owners := map[string]string{}
		for _, k := range p.Keys {
			line := strings.TrimSpace(lines[k.Pos.Line-1])
			if told[k.Pos.Line] || !strings.HasPrefix(line, k.Principal+" ") || k.Principal != strings.ToLower(k.Principal) || strings.ContainsAny(k.Principal, "*?!,\"") {
				t.Fatalf("key of %q from %q", k.Principal, line)
			}
			if k.Fingerprint != ssh.FingerprintSHA256(k.Public) || strings.Contains(k.Public.Type(), "cert") || !strings.Contains(line, k.Public.Type()) {
				t.Fatalf("key %s of type %s from %q", k.Fingerprint, k.Public.Type(), line)
			}
			if owner, ok := owners[k.Fingerprint]; ok && owner != k.Principal {
				t.Fatalf("one key of %q and %q", owner, k.Principal)
			}
			owners[k.Fingerprint] = k.Principal
			if lower := strings.ToLower(line); k.ValidBefore.IsZero() && strings.Contains(lower, "valid-before") && strings.Index(lower, "valid-before") < strings.Index(lower, k.Public.Type()) &&
				!strings.Contains(lower, "namespaces") {
				t.Fatalf("a bound of %q is lost", line)
			}
			told[k.Pos.Line] = true
		}
		for i, line := range lines[:most] {
			if s := strings.TrimSpace(line); s != "" && !strings.HasPrefix(s, "#") && !told[i+1] {
				t.Fatalf("nothing is said of line %d: %q", i+1, line)
			}
		}
	})
}

// usable tells whether an archive can stand for a folder.
func usable(m fstest.MapFS) bool {
	for name := range m {
		if !fs.ValidPath(name) || name == "." {
			return false
		}
		for other := range m {
			if strings.HasPrefix(other, name+"/") {
				return false
			}
		}
	}
	return true
}

// FuzzLoad loads a data set given as a txtar archive. Either it gives faults
// that stand in the archive's files, or a data set that keeps the laws of its
// types; twice the same.
func FuzzLoad(f *testing.F) {
	for _, name := range datasetNames(f) {
		a := &txtar.Archive{}
		m := open(f, name)
		for _, p := range slices.Sorted(maps.Keys(m)) {
			a.Files = append(a.Files, txtar.File{Name: p, Data: m[p].Data})
		}
		f.Add(txtar.Format(a))
	}
	paths, err := filepath.Glob("../testdata/faulty/*.txtar")
	if err != nil {
		f.Fatal(err)
	}
	for _, path := range paths {
		content, err := os.ReadFile(path)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Fuzz(func(t *testing.T, content []byte) {
		a := txtar.Parse(content)
		a.Comment = nil
		m := files(a)
		if !usable(m) {
			t.Skip("no folder")
		}
		d, err := Load(t.Context(), m)
		again, err2 := Load(t.Context(), m)
		if (err == nil) != (err2 == nil) || err != nil && err.Error() != err2.Error() {
			t.Fatalf("two results: %v, %v", err, err2)
		}
		if err != nil {
			checkFaults(t, m, err)
			return
		}
		if !reflect.DeepEqual(plain(d), plain(again)) {
			t.Fatal("two data sets")
		}
		checkLaws(t, d)
		b, a2, err := LoadPair(t.Context(), m, m)
		if err != nil || !reflect.DeepEqual(plain(b), plain(d)) || !reflect.DeepEqual(plain(a2), plain(d)) {
			t.Fatalf("a pair of the same is another: %v", err)
		}
	})
}

func checkFaults(t *testing.T, m fstest.MapFS, err error) {
	var faults *source.Faults
	if !errors.As(err, &faults) {
		t.Fatalf("no fault, but %v", err)
	}
	if faults.Count == 0 || len(faults.List) != min(faults.Count, source.FaultLimit) {
		t.Fatalf("%d faults, %d listed", faults.Count, len(faults.List))
	}
	for _, fault := range faults.List {
		if fault.Problem == "" || fault.File == "" || strings.ContainsAny(fault.Error(), "\n\x00\x1b") {
			t.Fatalf("fault %q", fault.Error())
		}
		file, ok := m[fault.File]
		if fault.Line == 0 {
			continue
		}
		lines := 0
		if ok {
			lines = strings.Count(string(file.Data), "\n") + 1
		}
		if fault.Line > lines {
			t.Fatalf("%v, the file has %d lines", fault, lines)
		}
	}
}

// checkLaws checks what the comments of the types say.
func checkLaws(t *testing.T, d *Dataset) {
	if d.Name == "" || d.TimeZone == nil || len(d.Trains) == 0 || len(d.Routes) == 0 {
		t.Fatalf("incomplete: %+v", d)
	}
	ids := map[string]bool{}
	for _, r := range d.Routes {
		if ids[r.ID] || !isRouteID(r.ID) {
			t.Fatalf("route id %q", r.ID)
		}
		ids[r.ID] = true
		length := r.Track.Length()
		check := func(row *Row) {
			if row.Start < 0 || row.End > length || row.Start > row.End || row.Directions == 0 {
				t.Fatalf("row %+v on %d mm", row, length)
			}
			for want, p := range map[unit.Distance]chainage.Point{row.Start: row.From, row.End: row.To} {
				if s, err := r.Track.Locate(p); s != want && row.Start != row.End || err != nil {
					t.Fatalf("%s is at %d (%v), want %d", p, s, err, want)
				}
			}
		}
		for i := range r.AxleLoad {
			check(&r.AxleLoad[i].Row)
		}
		for i := range r.Temporary {
			check(&r.Temporary[i].Row)
		}
		for i := range r.Places {
			check(&r.Places[i].Row)
		}
		// Each direction of travel has one row everywhere.
		for _, dir := range codes.AllDirections {
			var covered unit.Distance
			for i := range r.Speed {
				check(&r.Speed[i].Row)
				if r.Speed[i].Basic < unit.SpeedStep || r.Speed[i].Basic > unit.MaxSpeed {
					t.Fatalf("basic speed %d", r.Speed[i].Basic)
				}
				if r.Speed[i].Directions.Has(dir) {
					covered += r.Speed[i].End - r.Speed[i].Start
				}
			}
			if r.Directions.Has(dir) && covered != length {
				t.Fatalf("%s: %d of %d mm are covered", dir, covered, length)
			}
		}
	}
}
