package render

import (
	"bytes"
	"encoding/json"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	reflected "github.com/invopop/jsonschema"
	"github.com/santhosh-tekuri/jsonschema/v6"
)

var update = flag.Bool("update", false, "write the schemas into schema/json")

const schemaDir = "../../../../schema/json"

// published are the JSON forms with the file of their schema and the constant
// that their member "format" has.
var published = []struct {
	file, format, title string
	form                any
}{
	{"report.schema.json", jsonFormat, "A change report of speedtrail", &report{}},
	{"profile.schema.json", profileJSONFormat, "Effective speed profiles of speedtrail", &profiles{}},
}

// The published schemas are those of the types that are written.
func TestSchemasAreCurrent(t *testing.T) {
	for _, p := range published {
		r := reflected.Reflector{RequiredFromJSONSchemaTags: false, DoNotReference: false}
		for _, dir := range []string{"cmd/speedtrail/internal/render", "history/assessment"} {
			if err := commentsOf(&r, dir); err != nil {
				t.Fatal(err)
			}
		}
		s := r.Reflect(p.form)
		s.Title, s.ID = p.title, reflected.ID("https://speedtrail.invalid/schema/"+p.file)
		name := strings.TrimPrefix(s.Ref, "#/$defs/")
		format, ok := s.Definitions[name].Properties.Get("format")
		if !ok {
			t.Fatal("no member format")
		}
		format.Const = p.format
		got, err := json.MarshalIndent(s, "", "  ")
		if err != nil {
			t.Fatal(err)
		}
		got = append(got, '\n')
		file := filepath.Join(schemaDir, p.file)
		if *update {
			if err := os.WriteFile(file, got, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s is not the schema of what is written; -update writes it", file)
		}
	}
}

// commentsOf takes the doc comments of a package as descriptions.
func commentsOf(r *reflected.Reflector, dir string) error {
	old, err := os.Getwd()
	if err != nil {
		return err
	}
	if err := os.Chdir("../../../.."); err != nil {
		return err
	}
	defer os.Chdir(old)
	return r.AddGoComments("speedtrail", dir)
}

// What is written obeys the published schemas.
func TestOutputObeysSchemas(t *testing.T) {
	c := jsonschema.NewCompiler()
	for _, p := range published {
		files, err := filepath.Glob("../../../../testdata/changes/*/" + map[string]string{jsonFormat: "want.json", profileJSONFormat: "profile.json"}[p.format])
		if err != nil || len(files) == 0 {
			t.Fatal("no examples of", p.file, err)
		}
		s, err := c.Compile(filepath.Join(schemaDir, p.file))
		if err != nil {
			t.Fatal(err)
		}
		for _, file := range files {
			data, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			v, err := jsonschema.UnmarshalJSON(bytes.NewReader(data))
			if err != nil {
				t.Fatal(err)
			}
			if err := s.Validate(v); err != nil {
				t.Errorf("%s: %v", file, err)
			}
			// A member more or less is refused.
			m := v.(map[string]any)
			m["surplus"] = true
			if s.Validate(m) == nil {
				t.Errorf("%s: an unknown member passes the schema", file)
			}
			delete(m, "surplus")
			delete(m, "caution")
			if s.Validate(m) == nil {
				t.Errorf("%s: a missing member passes the schema", file)
			}
		}
	}
}
