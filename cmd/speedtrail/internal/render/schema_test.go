package render

import (
	"flag"
	"os"
	"path/filepath"
	"testing"

	"speedtrail/cmd/speedtrail/internal/published"
)

var update = flag.Bool("update", false, "write the schemas into schema/json")

const root = "../../../.."

// forms are the JSON forms of this package, with the example under
// testdata/changes.
var forms = map[string]published.Form{
	"want.json":    {File: "report.schema.json", Format: jsonFormat, Title: "A change report of speedtrail", Type: &report{}},
	"profile.json": {File: "profile.schema.json", Format: profileJSONFormat, Title: "Effective speed profiles of speedtrail", Type: &profiles{}},
}

// The published schemas are those of the types that are written, and what is
// written obeys them.
func TestSchemas(t *testing.T) {
	for name, f := range forms {
		published.Check(t, f, root, *update, "cmd/speedtrail/internal/render", "history/assessment")
		files, err := filepath.Glob(filepath.Join(root, "testdata", "changes", "*", name))
		if err != nil || len(files) == 0 {
			t.Fatal("no examples of", f.File, err)
		}
		for _, file := range files {
			data, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			published.Obey(t, f, root, data)
		}
	}
	published.Check(t, published.Form{File: "trace.schema.json", Format: traceJSONFormat, Title: "A trace of speedtrail", Type: &Trace{}}, root, *update,
		"cmd/speedtrail/internal/render", "history/assessment")
}
