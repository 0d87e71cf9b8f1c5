package schema

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"io/fs"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"
	"testing/fstest"

	"speedtrail/schema/source"
)

// versionFiles gives the entries of a file system identities.
type versionFiles struct{ fstest.MapFS }

type versionEntry struct {
	fs.DirEntry
	files fstest.MapFS
	path  string
}

func (e versionEntry) Identity() string {
	if e.IsDir() {
		return ""
	}
	return fmt.Sprintf("%x", sha256.Sum256(e.files[e.path].Data))
}

func (f versionFiles) ReadDir(name string) ([]fs.DirEntry, error) {
	list, err := f.MapFS.ReadDir(name)
	for i, e := range list {
		list[i] = versionEntry{e, f.MapFS, name + "/" + e.Name()}
	}
	return list, err
}

// editLines alters a text as an editor does, and sometimes as a careless one.
func editLines(rnd *rand.Rand, text string) string {
	lines := strings.SplitAfter(text, "\n")
	for range 1 + rnd.IntN(2) {
		i := rnd.IntN(len(lines))
		switch rnd.IntN(14) {
		case 0:
			lines = append(lines[:i:i], lines[i+1:]...)
			if len(lines) == 0 {
				lines = []string{""}
			}
		case 1:
			lines = append(lines[:i:i], append([]string{lines[i]}, lines[i:]...)...)
		case 2:
			lines = append(lines[:i:i], append([]string{"# a remark\n"}, lines[i:]...)...)
		case 3:
			lines = append(lines[:i:i], append([]string{"\n", ",,\r\n"}, lines[i:]...)...)
		case 4:
			k := rnd.IntN(len(lines))
			lines[i], lines[k] = lines[k], lines[i]
		case 5:
			lines[i] = strings.TrimSuffix(lines[i], "\n")
		case 6:
			lines[i] = strings.Replace(lines[i], ",", "\",\"", 1)
		case 7:
			lines[i] = strings.Replace(lines[i], "\n", "\r\n", 1)
		default:
			cells := strings.Split(lines[i], ",")
			k := rnd.IntN(len(cells))
			cells[k] = [...]string{"80", "85", "90", "", "both", "nominal", "1.000", "T-9", "\xff", "no"}[rnd.IntN(10)] + cells[k][len(strings.TrimRight(cells[k], "\r\n")):]
			lines[i] = strings.Join(cells, ",")
		}
	}
	return strings.Join(lines, "")
}

// Law: version after version, Versions gives the route or the faults that Load
// gives, whatever it has read before, and alters no route that it gave, or no
// Clone of one where it reuses them.
func TestVersionsEqualLoad(t *testing.T) {
	routes, faulty := 0, 0
	for seed := range uint64(300) {
		rnd := rand.New(rand.NewPCG(seed, 5))
		m := versioned()
		v := NewVersions(nil, 1_000)
		if seed%2 == 0 {
			v.Reusing()
		}
		var given []*Route
		var copies []string
		for step := range 20 {
			var files fs.FS = versionFiles{m}
			if seed%3 == 0 {
				files = m
			}
			got, err := v.Read(files, "routes/r")
			data, wantErr := Load(t.Context(), m)
			var faults, wantFaults *source.Faults
			if errors.As(err, &faults) != errors.As(wantErr, &wantFaults) || !reflect.DeepEqual(faults, wantFaults) {
				t.Fatalf("seed %d step %d: %v, Load says %v", seed, step, err, wantErr)
			}
			if err == nil {
				routes++
				if want := data.Routes[0]; !reflect.DeepEqual(got, want) {
					t.Fatalf("seed %d step %d:\n%+v\nLoad says\n%+v", seed, step, got, want)
				}
				if seed%2 == 0 {
					got = got.Clone()
				}
				given = append(given, got)
				copies = append(copies, fmt.Sprintf("%+v", *got))
			} else {
				faulty++
			}
			next := clone(m)
			names := []string{"speed.csv", "speed.csv", "axle-load.csv", "temporary.csv", "curves.csv", "gradients.csv", "places.csv", "route.toml"}
			name := "routes/r/" + names[rnd.IntN(len(names))]
			if err != nil && rnd.IntN(2) == 0 {
				next = versioned()
			}
			next[name] = &fstest.MapFile{Data: []byte(editLines(rnd, string(next[name].Data)))}
			m = next
		}
		for i := range given {
			if fmt.Sprintf("%+v", *given[i]) != copies[i] {
				t.Fatalf("seed %d: route %d was altered later", seed, i)
			}
		}
	}
	if routes < 500 || faulty < 500 {
		t.Errorf("%d sound and %d faulty versions were tried", routes, faulty)
	}
}

// versioned is a data set with one route that has every table.
func versioned() fstest.MapFS {
	m := fstest.MapFS{}
	for name, text := range map[string]string{
		"dataset.toml":           "format = 1\nname = \"n\"\n",
		"trains.toml":            "[[train]]\nid = \"T\"\nname = \"t\"\ncant_deficiency_mm = 80\naxle_load = \"A\"\nlength_m = 100\nmax_speed_kmh = 100\n",
		"routes/r/route.toml":    "id = \"R\"\nname = \"r\"\nstart_km = 0\nend_km = 10\n",
		"routes/r/speed.csv":     "from_km,to_km,direction,basic,cd130,freight_p,freight_p_rule,train_length_delay,note\n0,1,,80,,,,,\n1,2.5,,90,100,,,,a\n# here\n2.5,4,,100,110,80,replaces,no,\n\n4,5,,90,,,,,\n5,8,nominal,80,,,,,\n5,8,reverse,85,,,,,\n8,10,,60,,,,,\n",
		"routes/r/axle-load.csv": "from_km,to_km,direction,A,D4\n1,1.1,,80,60\n3,3.2,both,70,\n",
		"routes/r/temporary.csv": "id,from_km,to_km,speed,valid_from,valid_to\nT-1,1,2,40,2026-01-01,2026-02-01\nT-2,2,3,50,,\nT-3,4,5,50,2026-01-01T06:00:00Z,\n",
		"routes/r/curves.csv":    "from_km,to_km,radius_m,cant_mm\n1,1.5,900,80\n3,3.5,800,100\n6,7,1200,50\n",
		"routes/r/gradients.csv": "from_km,to_km,permille\n0,4,2.5\n4,10,-1\n",
		"routes/r/places.csv":    "km,to_km,kind,name\n0.5,,station,A\n3,,crossing,B\n4,4.1,bridge,C\n",
	} {
		m[name] = &fstest.MapFile{Data: []byte(text)}
	}
	return m
}

// The cells of a row are found by the place of their column in the definition.
func TestColumnPlaces(t *testing.T) {
	for _, c := range []struct {
		columns []string
		at      int
		name    string
	}{
		{speedColumns, basicAt, "basic"}, {speedColumns, cantAt, "cd80"}, {speedColumns, otherAt - 1, "cd300"},
		{speedColumns, otherAt, "freight_p"}, {speedColumns, otherAt + 5, "passenger_rule"}, {speedColumns, otherAt + 6, "train_length_delay"},
		{axleLoadColumns, limitAt, "A"}, {axleLoadColumns, limitAt + 12, "E5"},
		{temporaryColumns, idAt, "id"}, {temporaryColumns, speedAt, "speed"}, {temporaryColumns, validFromAt, "valid_from"},
		{temporaryColumns, validToAt, "valid_to"}, {temporaryColumns, reasonAt, "reason"},
		{curveColumns, radiusAt, "radius_m"}, {curveColumns, cantMMAt, "cant_mm"}, {curveColumns, handAt, "hand"},
		{gradientColumns, permilleAt, "permille"},
		{placeColumns, kindAt, "kind"}, {placeColumns, nameAt, "name"}, {placeColumns, strikeInAt, "strike_in_m"}, {placeColumns, warningAt, "warning_s"},
	} {
		if c.columns[c.at] != c.name {
			t.Errorf("%s stands at the place of %s", c.columns[c.at], c.name)
		}
	}
}
