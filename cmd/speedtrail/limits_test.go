package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// A check that is off, as its limit is not set, looks like one that found nothing:
// every form of the report says so, and validate does.
func TestChecksThatAreOff(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{100}, []time.Time{at})
	write := func(name, content string) {
		t.Helper()
		if err := os.WriteFile(filepath.Join(repo, name), []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	write("routes/r1/speed.csv", "from_km,to_km,basic\n0,1,100\n1,2,350\n2,5,100\n")
	const plain = "format = 1\nname = \"Plain\"\n"
	for _, x := range []struct {
		name, limits string
		off          string // as text has it
		on           string
	}{
		{"none is set", "", "Not looked for, as dataset.toml sets no limit in either revision: cant-excess (cant_excess_mm), short-stretch (shortest_stretch_m), step-size (largest_step_kmh).", ""},
		{"two are set", "[limits]\nlargest_step_kmh = 60\nshortest_stretch_m = 120\n", "in either revision: cant-excess (cant_excess_mm).", "of each the stricter of both revisions: a stretch of 120 m (short-stretch), a step of 60 km/h (step-size)."},
		{"all are set", "[limits]\nlargest_step_kmh = 60\nshortest_stretch_m = 120\ncant_excess_mm = 110\n", "", "a cant excess of 110 mm (cant-excess), a stretch of 120 m (short-stretch), a step of 60 km/h (step-size)."},
	} {
		t.Run(x.name, func(t *testing.T) {
			write("dataset.toml", plain+x.limits)
			for _, format := range []string{"text", "markdown", "html", "json"} {
				out := oneLine(call(t, "--repo", repo, "assess", "HEAD", "--format", format).want(t, 1).out)
				plain := strings.ReplaceAll(out, `\`, "")
				if has := strings.Contains(plain, "Not looked for, as"); format != "json" && (has != (x.off != "") || !strings.Contains(plain, x.off)) {
					t.Errorf("%s: %q is said: %t", format, x.off, has)
				}
				if (format == "markdown" || format == "html") && !strings.Contains(plain, x.on) {
					t.Errorf("%s does not say %q", format, x.on)
				}
				if format == "json" && strings.Contains(out, `"unchecked": []`) != (x.off == "") {
					t.Error("json has no such list")
				}
			}
			remark := "remark: dataset.toml: not looked for, as [limits] sets no limit: "
			if got := call(t, "--repo", repo, "validate").want(t, 0); strings.Contains(got.errors, remark) != (x.off != "") {
				t.Errorf("validate: %s", got.errors)
			}
		})
	}
}
