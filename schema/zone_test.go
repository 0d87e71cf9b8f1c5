package schema

import (
	"archive/zip"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
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

// The list of names is that of the database, which a newer Go can have more of.
func TestZones(t *testing.T) {
	if !slices.IsSorted(zoneNames()) {
		t.Error("the names are not in order")
	}
	for _, name := range zoneNames() {
		if _, err := time.LoadLocation(name); err != nil {
			t.Error(err)
		}
	}
	root, err := exec.Command("go", "env", "GOROOT").Output()
	if err != nil {
		t.Skipf("the go command cannot be asked where its database is: %v", err)
	}
	database, err := zip.OpenReader(filepath.Join(strings.TrimSpace(string(root)), "lib", "time", "zoneinfo.zip"))
	if err != nil {
		t.Skipf("this Go has no database of time zones: %v", err)
	}
	defer database.Close()
	for _, f := range database.File {
		if !strings.HasSuffix(f.Name, "/") && !knownZone(f.Name) {
			t.Errorf("zones.txt lacks %s", f.Name)
		}
	}
}
