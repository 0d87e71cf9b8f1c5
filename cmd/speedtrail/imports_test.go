package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// Imports run one way, cmd -> history -> diff -> schema, and some modules have
// one importer only. Tests may import more.
func TestImports(t *testing.T) {
	floors := []string{"schema", "diff", "history", "cmd"}
	owners := map[string]string{
		"github.com/sergi/go-diff": "diff/lines", "github.com/mattn/go-sqlite3": "history/ledger history/index", "github.com/spf13/cobra": "cmd/speedtrail",
		"github.com/go-git/": "history/revision history/compose",
	}
	files := 0
	err := filepath.WalkDir("../..", func(path string, e fs.DirEntry, err error) error {
		if err != nil || e.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") {
			return err
		}
		files++
		f, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		rel, err := filepath.Rel("../..", path)
		if err != nil {
			return err
		}
		dir := filepath.ToSlash(filepath.Dir(rel))
		floor := slices.Index(floors, strings.Split(dir, "/")[0])
		for _, spec := range f.Imports {
			name, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				return err
			}
			for module, owner := range owners {
				if strings.HasPrefix(name, module) && !slices.Contains(strings.Fields(owner), dir) {
					t.Errorf("%s imports %s, which is for %s", rel, name, owner)
				}
			}
			if inner, ok := strings.CutPrefix(name, "speedtrail/"); ok {
				if of := slices.Index(floors, strings.Split(inner, "/")[0]); of > floor || of < 0 {
					t.Errorf("%s imports %s, which lies above it", rel, name)
				}
			}
		}
		return nil
	})
	if err != nil || files < 40 {
		t.Fatal(files, err)
	}
}
