package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"go/ast"
	"go/parser"
	"go/token"
	"go/types"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// listed is what `go list` tells of a package, as far as type checking needs it.
type listed struct {
	Dir, ImportPath   string
	GoFiles, CgoFiles []string
	ImportMap         map[string]string
	Module            *struct{ Main bool }
	Error             *struct{ Err string }
}

// The program and its tests compile for the systems that it is promised for. They
// are type-checked from source, since a C compiler for each of them is seldom at
// hand; what C declares is taken as it is used.
func TestOtherSystems(t *testing.T) {
	for _, system := range []string{"windows/amd64", "windows/arm64", "darwin/arm64", "linux/arm64"} {
		t.Run(system, func(t *testing.T) {
			t.Parallel()
			goos, goarch, _ := strings.Cut(system, "/")
			cmd := exec.CommandContext(t.Context(), "go", "list", "-deps", "-test", "-json=Dir,ImportPath,GoFiles,CgoFiles,ImportMap,Module,Error", "./...")
			cmd.Dir = filepath.Join("..", "..")
			cmd.Env = append(os.Environ(), "GOOS="+goos, "GOARCH="+goarch, "CGO_ENABLED=1")
			var stderr bytes.Buffer
			cmd.Stderr = &stderr
			out, err := cmd.Output()
			if err != nil {
				t.Fatal(err, stderr.String())
			}
			checked := map[string]*types.Package{"unsafe": types.Unsafe}
			ours := 0
			for decoder := json.NewDecoder(bytes.NewReader(out)); ; {
				var p listed
				if err := decoder.Decode(&p); errors.Is(err, io.EOF) {
					break
				} else if err != nil {
					t.Fatal(err)
				}
				if p.ImportPath == "unsafe" {
					continue
				}
				var faults []error
				if checked[p.ImportPath], faults = p.check(checked, goarch); p.Module != nil && p.Module.Main {
					ours++
					for _, fault := range faults {
						t.Errorf("%s: %v", p.ImportPath, fault)
					}
				}
			}
			if ours < 60 {
				t.Errorf("%d packages of this module", ours)
			}
		})
	}
}

// check type-checks a package whose imports are checked. Of what is not ours the
// declarations are enough.
func (p listed) check(checked map[string]*types.Package, goarch string) (*types.Package, []error) {
	var faults []error
	fail := func(err error) { faults = append(faults, err) }
	if p.Error != nil {
		fail(errors.New(p.Error.Err))
	}
	files := token.NewFileSet()
	var parsed []*ast.File
	for _, name := range append(p.GoFiles, p.CgoFiles...) {
		if !filepath.IsAbs(name) {
			name = filepath.Join(p.Dir, name)
		}
		f, err := parser.ParseFile(files, name, nil, parser.SkipObjectResolution)
		if err != nil {
			fail(err)
			continue
		}
		parsed = append(parsed, f)
	}
	conf := types.Config{
		FakeImportC: true, IgnoreFuncBodies: p.Module == nil || !p.Module.Main, Sizes: types.SizesFor("gc", goarch), Error: fail,
		Importer: importer(func(path string) (*types.Package, error) {
			if mapped := p.ImportMap[path]; mapped != "" {
				path = mapped
			}
			if q := checked[path]; q != nil {
				return q, nil
			}
			return nil, errors.New(path + " was not listed before what imports it")
		}),
	}
	path, _, _ := strings.Cut(p.ImportPath, " ")
	q, _ := conf.Check(path, files, parsed, nil)
	return q, faults
}

type importer func(string) (*types.Package, error)

func (f importer) Import(path string) (*types.Package, error) { return f(path) }
