package schema

import (
	"errors"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"testing/fstest"

	"golang.org/x/tools/txtar"

	"speedtrail/schema/source"
)

var update = flag.Bool("update", false, "rewrite the expected faults of testdata/faulty")

// TestFaulty loads every broken data set of testdata/faulty and wants exactly
// the faults that its last file lists.
func TestFaulty(t *testing.T) {
	paths, err := filepath.Glob("../testdata/faulty/*.txtar")
	if err != nil {
		t.Fatal(err)
	}
	if len(paths) < 75 {
		t.Fatalf("%d archives in testdata/faulty", len(paths))
	}
	for _, path := range paths {
		t.Run(strings.TrimSuffix(filepath.Base(path), ".txtar"), func(t *testing.T) {
			a, err := txtar.ParseFile(path)
			if err != nil {
				t.Fatal(err)
			}
			testFaulty(t, path, a)
		})
	}
}

func testFaulty(t *testing.T, path string, a *txtar.Archive) {
	fsys := files(a)
	last := len(a.Files) - 1
	if last < 0 || a.Files[last].Name != faultsFile {
		t.Fatalf("the last file is not %s", faultsFile)
	}
	got, want := "", string(a.Files[last].Data)
	_, err := Load(t.Context(), fsys)
	if err != nil {
		got = err.Error() + "\n"
	}
	if err == nil {
		t.Fatal("no fault found")
	}
	if *update && got != want {
		a.Files[last].Data = []byte(got)
		if err := os.WriteFile(path, txtar.Format(a), 0o644); err != nil {
			t.Fatal(err)
		}
		t.Logf("rewrote %s", path)
	} else if got != want {
		t.Errorf("faults differ\n--- got\n%s--- want\n%s", got, want)
	}
	var faults *source.Faults
	if !errors.As(err, &faults) {
		t.Fatalf("the error is a %T, want *source.Faults", err)
	}
	if faults.Count != len(faults.List) {
		t.Errorf("%d faults counted, %d listed", faults.Count, len(faults.List))
	}
	for _, f := range faults.List {
		if problem := placeProblem(fsys, f); problem != "" {
			t.Errorf("%v\n\t%s", f, problem)
		}
	}
}

// quotedInput finds the input that a problem begins with: basic "47" is not...
var quotedInput = regexp.MustCompile(`^[a-zA-Z0-9_. -]+ ("(?:[^"\\]|\\.)*")`)

// placeProblem says why a fault does not point at what it is about: a table's
// fault that quotes a cell stands where the cell does, any other place is at
// least one of the file.
func placeProblem(fsys fstest.MapFS, f source.Fault) string {
	file, ok := fsys[f.File]
	if f.Line == 0 {
		return ""
	}
	if !ok {
		return "there is no such file"
	}
	content := strings.TrimPrefix(string(file.Data), "\xEF\xBB\xBF")
	lines := strings.Split(content, "\n")
	if f.Line > len(lines) {
		return fmt.Sprintf("the file has %d lines", len(lines))
	}
	line := lines[f.Line-1]
	if f.Column == 0 {
		return ""
	}
	if f.Column > len(line)+1 {
		return fmt.Sprintf("the line has %d bytes", len(line))
	}
	if !strings.HasSuffix(f.File, ".csv") {
		return ""
	}
	if before := strings.TrimRight(line[:f.Column-1], " \t"); !strings.Contains(f.Problem, "UTF-8") && !strings.Contains(f.Problem, "quote") &&
		!strings.Contains(f.Problem, "NUL") && before != "" && !strings.HasSuffix(before, ",") {
		return fmt.Sprintf("no cell begins behind %q", before)
	}
	m := quotedInput.FindStringSubmatch(f.Problem)
	if m == nil {
		return ""
	}
	want, err := strconv.Unquote(m[1])
	if err != nil {
		return "the input is not quoted: " + err.Error()
	}
	rest := strings.Join(append([]string{line[f.Column-1:]}, lines[f.Line:]...), "\n")
	if have := strings.TrimPrefix(rest, `"`); !strings.HasPrefix(have, want) {
		return fmt.Sprintf("the cell there is %.40q", have)
	}
	return ""
}
