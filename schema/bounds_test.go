package schema

import (
	"fmt"
	"strings"
	"testing"
	"testing/fstest"

	schematable "speedtrail/schema/table"
)

// TestBounds goes to each bound of a data set and past it.
func TestBounds(t *testing.T) {
	const train = "[[train]]\nid = \"T%d\"\nname = \"One\"\ncant_deficiency_mm = 150\naxle_load = \"C2\"\nlength_m = 200\nmax_speed_kmh = 160\n"
	const request = "id = \"CR-%d\"\ntitle = \"Raise\"\nreason = \"Renewed\"\n"
	repeated := func(n int, format string) string {
		var b strings.Builder
		for i := range n {
			fmt.Fprintf(&b, format, i)
		}
		return b.String()
	}
	jumps := func(n int) string {
		var b strings.Builder
		fmt.Fprintf(&b, "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = %d\n", 10*n+10)
		for i := range n {
			fmt.Fprintf(&b, "[[jump]]\narriving_km = %d\nleaving_km = %d.5\n", 10*i+5, 10*i+5)
		}
		return b.String()
	}
	speed := func(n int) string { return fmt.Sprintf("from_km,to_km,basic\n0,%d,100\n", 10*n+10) }
	padded := func(content string, size int) string { return content + strings.Repeat("#", size-len(content)) }
	requests := func(n int) fstest.MapFS {
		m := small()
		for i := range n {
			m[fmt.Sprintf("requests/r%05d.toml", i)] = &fstest.MapFile{Data: fmt.Appendf(nil, request, i)}
		}
		return m
	}
	text := string(small()["trains.toml"].Data)
	table := "from_km,to_km,basic\n0,10,100\n"
	tests := []struct {
		name string
		data fstest.MapFS
		want string // empty: no fault
	}{
		{"trains", with(small(), "trains.toml", repeated(MaxTrains, train)), ""},
		{"trains+1", with(small(), "trains.toml", repeated(MaxTrains+1, train)), "trains.toml:1:3: 1001 reference trains, at most 1000 are allowed"},
		{"jumps", with(with(small(), "routes/r1/route.toml", jumps(MaxJumps)), "routes/r1/speed.csv", speed(MaxJumps)), ""},
		{"jumps+1", with(with(small(), "routes/r1/route.toml", jumps(MaxJumps+1)), "routes/r1/speed.csv", speed(MaxJumps+1)), "routes/r1/route.toml:5:3: 1001 chainage jumps, at most 1000 are allowed"},
		{"requests", requests(MaxRequests), ""},
		{"requests+1", requests(MaxRequests + 1), "requests: more than 10000 requests"},
		{"TOML size", with(small(), "trains.toml", padded(text, schematable.MaxTOMLSize)), ""},
		{"TOML size+1", with(small(), "trains.toml", padded(text, schematable.MaxTOMLSize+1)), "trains.toml: 1048577 bytes, at most 1048576 are allowed"},
		{"table size", with(small(), "routes/r1/speed.csv", padded(table, schematable.MaxTableSize)), ""},
		{"table size+1", with(small(), "routes/r1/speed.csv", padded(table, schematable.MaxTableSize+1)), "routes/r1/speed.csv: 16777217 bytes, at most 16777216 are allowed"},
		{"policy size+1", with(with(small(), "allowed_signers", padded("", schematable.MaxTOMLSize+1)), "signoff.toml", "format = 1\n[[person]]\nprincipal = \"a\"\n[[role]]\nname = \"r\"\nneeded = 1\nindependent_of = [\"preparer\"]\n"),
			"allowed_signers: 1048577 bytes, at most 1048576 are allowed"},
		{"role size+1", with(with(small(), "allowed_signers", "# none yet\n"), "signoff.toml", padded("", schematable.MaxTOMLSize+1)),
			"signoff.toml: 1048577 bytes, at most 1048576 are allowed"},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			got := ""
			if _, err := Load(t.Context(), c.data); err != nil {
				got = err.Error()
			}
			if got == c.want {
				return
			}
			t.Errorf("got\n%.2000s\nwant\n%s", got, c.want)
		})
	}
}

// TestBoundRoutes lists route folders to their bound and past it, without
// reading them.
func TestBoundRoutes(t *testing.T) {
	m := fstest.MapFS{}
	for i := range MaxRoutes {
		m[fmt.Sprintf("routes/x%d/route.toml", i)] = &fstest.MapFile{}
	}
	l := &loading{fsys: m}
	if err := l.list(); err != nil || len(l.folders) != MaxRoutes || l.faults.Count() != 0 {
		t.Errorf("%d folders, %d faults, %v", len(l.folders), l.faults.Count(), err)
	}
	m["routes/more/route.toml"] = &fstest.MapFile{}
	l = &loading{fsys: m}
	if err := l.list(); err != nil || len(l.folders) != MaxRoutes {
		t.Errorf("%d folders, %v", len(l.folders), err)
	}
	if err := l.faults.Err(); err == nil || err.Error() != "routes: 20001 route folders, at most 20000 are allowed" {
		t.Errorf("faults %v", err)
	}
}
