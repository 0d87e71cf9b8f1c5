package schema

import (
	"testing"
	"testing/fstest"
	"time"
)

// A zone is one by the database that the program carries along, whatever the machine
// has beside it.
func TestTimeZoneNames(t *testing.T) {
	for name, want := range map[string]bool{
		"": true, "UTC": true, "Europe/Berlin": true, "Etc/GMT+5": true, "America/Argentina/Ushuaia": true,
		"Local": false, "localtime": false, "posixrules": false, "right/Europe/Berlin": false, "posix/UTC": false,
		"europe/berlin": false, "./UTC": false, "Europe//Berlin": false, "Europe": false, "tzdata.zi": false,
	} {
		files := fstest.MapFS{
			"dataset.toml":         {Data: []byte("format = 1\nname = \"N\"\ntime_zone = " + `"` + name + "\"\n")},
			"trains.toml":          {Data: []byte("[[train]]\nid = \"T\"\nname = \"T\"\ncant_deficiency_mm = 80\naxle_load = \"C2\"\nlength_m = 300\nmax_speed_kmh = 140\n")},
			"routes/r1/route.toml": {Data: []byte("id = \"R1\"\nname = \"R\"\nstart_km = 0\nend_km = 5\n")},
			"routes/r1/speed.csv":  {Data: []byte("from_km,to_km,basic\n0,5,100\n")},
		}
		if _, err := Load(t.Context(), files); (err == nil) != want {
			t.Errorf("time_zone %q: %v", name, err)
		}
	}
}

// Every zone can be read and keeps its name.
func TestZones(t *testing.T) {
	for name := range zoneFiles() {
		if zone, ok := Zone(name); !ok || zone.String() != name {
			t.Errorf("%s: %v, %v", name, zone, ok)
		}
	}
	// Directive 2000/84/EC, article 2 (from memory): summer time begins on the last Sunday of March at 01:00 UTC.
	berlin, _ := Zone("Europe/Berlin")
	for at, want := range map[string]string{"2026-03-29T00:59:59Z": "2026-03-29T01:59:59+01:00", "2026-03-29T01:00:00Z": "2026-03-29T03:00:00+02:00"} {
		instant, err := time.Parse(time.RFC3339, at)
		if got := instant.In(berlin).Format(time.RFC3339); err != nil || got != want {
			t.Errorf("%s in Berlin is %s, want %s (%v)", at, got, want, err)
		}
	}
}
