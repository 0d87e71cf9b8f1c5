// Package demo holds an invented railway network with a history of a year, on
// which speedtrail shows what it does.
//
// The last release, from release-2025.4 to release-2026.1, holds five changes
// that a text diff shows side by side. What they mean:
//
//	route  rows                            what it does
//	BW1    speed.csv, Priors Wood curve    raises by 5 to 10 km/h as CR-2601 declares, and, by run-out, up to
//	                                       one train length past the curve
//	BW2    speed.csv, Sallow sidings       freight in P from 100 to 120 as CR-2603 declares
//	       speed.csv, embankment           a raise that TSR-31 hides today; nobody declares it
//	       speed.csv, Heron curve          a speed for cant deficiency 300 that no reference train has
//	BW3    axle-load.csv, Ferrow bridge    "no change of speeds": the cell for E4 was lost when the row was
//	                                       split. Towards Saddle Junction the ore train runs over span 3 at 80
//	                                       instead of 30, towards Tolden it is let go 110 m early
//	       temporary.csv, TSR-36           longer, yet expired at the release
//	BW4    speed.csv, Pit Lane             lowered to 60 as CR-2604 declares
//	       speed.csv, from 118             faster, but not for ENG, which CR-2604 names: it runs at 80 at most
//	BW5    speed.csv, flyover              250 m at 100 between two pieces at 60: too short to be used
package demo

import (
	"context"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"strings"

	"speedtrail/history/compose"
	"speedtrail/schema/unit"
)

//go:embed network
var network embed.FS

// Repository is a written demonstration.
type Repository struct {
	Base, Target string // tags of the last two releases
	Look         []Hint
}

// Hint is something to look at, with a command to try.
type Hint struct{ Text, Command string }

// Write writes the network with its history into dir. A folder that is not
// empty is refused with compose.ErrNotEmpty.
func Write(ctx context.Context, dir string) (Repository, error) {
	history, err := History()
	if err != nil {
		return Repository{}, err
	}
	if err := compose.Write(ctx, dir, history); err != nil {
		return Repository{}, err
	}
	return Repository{Base: "release-2025.4", Target: "release-2026.1", Look: look}, nil
}

var look = []Hint{
	{"BW3: the commit says \"no change of speeds\". See the ore train ORE on the Ferrow bridge, km 12.390 to 12.500, towards Saddle Junction: 30 becomes 80 km/h, because a cell was lost when a row was split.",
		"speedtrail profile release-2026.1 --route BW3 --train ORE --direction reverse"},
	{"BW1: the recanted curve lets trains go faster, and one train length past it as well (run-out).",
		"speedtrail profile release-2026.1 --route BW1 --train IC --format chart"},
	{"Every change, one row a train and stretch, for a spreadsheet.", "speedtrail report 4 --format csv"},
	{"The register: two releases approved, one half signed, and this one, which cannot be signed because its base is not approved.", "speedtrail register"},
	{"What was in force on a day, and the speed at a point then; without options, the log and what is wrong with it.",
		"speedtrail inforce --when 2025-09-01T12:00:00Z --route BW1 --at 34"},
	{"When the speed at a point changed, by which commit and row, and who signed that.", "speedtrail trace --route BW1 --at 34 --train IC"},
	{"Everything computed anew and every signature checked.", "speedtrail verify"},
	{"Sign the missing approval yourself, with a test key that stands beside the ledger.",
		"speedtrail sign 3 --role approver --decision approve --reason \"looked at it\" --key .git/speedtrail/demo-keys/brand"},
	{"Alter a cell in a table, then ask what it does before you commit it.", "speedtrail assess HEAD"},
}

// History makes the commits of the demonstration.
func History() ([]compose.Commit, error) {
	first := map[string]string{}
	err := fs.WalkDir(network, "network", func(path string, e fs.DirEntry, err error) error {
		if err != nil || e.IsDir() {
			return err
		}
		content, err := fs.ReadFile(network, path)
		// A checkout may have turned the line ends; the data set has its own.
		first[strings.TrimPrefix(path, "network/")] = strings.ReplaceAll(string(content), "\r\n", "\n")
		return err
	})
	if err != nil {
		return nil, err
	}
	first["allowed_signers"] = allowedSigners(false)
	first[".gitignore"] = "/change-report.html\n"
	b := builder{branches: map[string]*branch{"main": {files: first, tip: -1}}}
	for _, s := range steps {
		if err := b.add(s); err != nil {
			return nil, fmt.Errorf("%s, %q: %w", s.when, s.text, err)
		}
	}
	return b.commits, nil
}

// branch is a line of commits: its files, its newest commit, and the edits made
// since it left main.
type branch struct {
	files map[string]string
	tip   int
	edits []edit
}

type builder struct {
	branches map[string]*branch
	commits  []compose.Commit
}

func (b *builder) add(s step) error {
	on := b.branches[s.branch]
	if on == nil {
		main := b.branches["main"]
		on = &branch{files: maps.Clone(main.files), tip: main.tip}
		b.branches[s.branch] = on
	}
	c := compose.Commit{Author: s.who, When: at(s.when), Message: s.text + "\n", Tag: s.tag, TagText: "Release of the Brackwater network\n"}
	if on.tip >= 0 {
		c.Parents = []int{on.tip}
	}
	edits := s.edits
	if s.merge != "" {
		other := b.branches[s.merge]
		c.Parents = append(c.Parents, other.tip)
		edits = other.edits
	}
	for _, e := range edits {
		if err := e.apply(on.files); err != nil {
			return err
		}
	}
	on.edits = append(on.edits, s.edits...)
	c.Files = maps.Clone(on.files)
	on.tip = len(b.commits)
	b.commits = append(b.commits, c)
	return nil
}

func (e edit) apply(files map[string]string) error {
	switch {
	case e.rename != "":
		for path, content := range maps.Clone(files) {
			if rest, ok := strings.CutPrefix(path, e.file+"/"); ok {
				delete(files, path)
				files[e.rename+"/"+rest] = content
			}
		}
	case e.old == "":
		files[e.file] = e.now
		if e.made != nil {
			files[e.file] = e.made()
		}
	case strings.Count(files[e.file], e.old) != 1:
		return fmt.Errorf("%s: %w: %q", e.file, errors.New("the text to replace does not occur exactly once"), e.old)
	default:
		files[e.file] = strings.Replace(files[e.file], e.old, e.now, 1)
	}
	return nil
}

// request writes a change request.
func request(id, title, reason string, declares ...string) string {
	return fmt.Sprintf("id = %q\ntitle = %q\nreason = %q\n%s", id, title, reason, strings.Join(declares, ""))
}

// declare writes a declaration; trains is a TOML array, or empty for all.
func declare(route string, from, to float64, effect, trains string) string {
	s := fmt.Sprintf("\n[[declares]]\nroute = %q\nfrom_km = %s\nto_km = %s\neffect = %q\n", route, kilometres(from), kilometres(to), effect)
	if trains != "" {
		s += "trains = " + trains + "\n"
	}
	return s
}

// kilometres writes a number of kilometres with three decimals.
func kilometres(km float64) string {
	return unit.Distance(km*1e6 + 0.5).KM()
}
