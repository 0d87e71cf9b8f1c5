// Package published keeps the JSON schemas under schema/json the same as the types
// that are written. It is for tests.
package published

import (
	"bytes"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	reflected "github.com/invopop/jsonschema"
	"github.com/santhosh-tekuri/jsonschema/v6"
)

// Form is a JSON form: the file of its schema, the constant that its member
// "format" has, a title, and a pointer to its type.
type Form struct {
	File, Format, Title string
	Type                any
}

// Check compares the schema of a form with the file; with update it writes it.
// root is the way to the module, packages are those whose comments describe the
// members.
func Check(t *testing.T, f Form, root string, update bool, packages ...string) {
	t.Helper()
	r := reflected.Reflector{}
	for _, dir := range packages {
		if err := comments(&r, root, dir); err != nil {
			t.Fatal(err)
		}
	}
	s := r.Reflect(f.Type)
	s.Title, s.ID = f.Title, reflected.ID("https://speedtrail.invalid/schema/"+f.File)
	format, ok := s.Definitions[strings.TrimPrefix(s.Ref, "#/$defs/")].Properties.Get("format")
	if !ok {
		t.Fatal("no member format")
	}
	format.Const = f.Format
	got, err := json.MarshalIndent(s, "", "  ")
	if err != nil {
		t.Fatal(err)
	}
	got = append(got, '\n')
	file := filepath.Join(root, "schema", "json", f.File)
	if update {
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

// comments takes the doc comments of a package as descriptions.
func comments(r *reflected.Reflector, root, dir string) error {
	old, err := os.Getwd()
	if err != nil {
		return err
	}
	if err := os.Chdir(root); err != nil {
		return err
	}
	defer os.Chdir(old)
	if err := r.AddGoComments("speedtrail", dir); err != nil {
		return err
	}
	// It names packages by file paths of the system that the test runs on.
	for name, text := range r.CommentMap {
		r.CommentMap[strings.ReplaceAll(name, `\`, "/")] = text
	}
	return nil
}

// Obey proves that an output obeys the schema of its form, and that with a member
// more or less it would not.
func Obey(t *testing.T, f Form, root string, output []byte) {
	t.Helper()
	s, err := jsonschema.NewCompiler().Compile(filepath.Join(root, "schema", "json", f.File))
	if err != nil {
		t.Fatal(err)
	}
	v, err := jsonschema.UnmarshalJSON(bytes.NewReader(output))
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Validate(v); err != nil {
		t.Errorf("%s: %v", f.File, err)
	}
	m := v.(map[string]any)
	m["surplus"] = true
	if s.Validate(m) == nil {
		t.Errorf("%s: an unknown member passes", f.File)
	}
	delete(m, "surplus")
	delete(m, "format")
	if s.Validate(m) == nil {
		t.Errorf("%s: a missing member passes", f.File)
	}
}
