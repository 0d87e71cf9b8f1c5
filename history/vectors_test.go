package history_test

import (
	"bytes"
	"context"
	"errors"
	"flag"
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"sync"
	"testing"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

var update = flag.Bool("update", false, "write what is found to testdata/vectors")

const vectorFolder = "../testdata/vectors"

// vector is a case: testdata/vectors/README.md describes the files.
type vector struct {
	file, name string
	head       string // the lines of the case, as they stand in the file
	breaks     string // the kind of failure
	say        bool
	steps      []string
	found      []string
	imported   []string
}

func readVector(t *testing.T, file string) *vector {
	t.Helper()
	content, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	v := &vector{file: file, name: strings.TrimSuffix(filepath.Base(file), ".txt")}
	part := "steps"
	for line := range strings.Lines(string(content)) {
		line = strings.TrimSuffix(line, "\n")
		word, rest, _ := strings.Cut(line, " ")
		switch {
		case line == "found" || line == "imported":
			part = line
		case line == "" || part == "steps" && strings.HasPrefix(line, "#"):
		case part == "found":
			v.found = append(v.found, line)
		case part == "imported":
			v.imported = append(v.imported, line)
		case word == "breaks":
			v.breaks = rest
		case line == "say":
			v.say = true
		default:
			v.steps = append(v.steps, line)
		}
		if part == "steps" {
			v.head += line + "\n"
		}
	}
	if v.breaks == "" || !strings.HasPrefix(v.head, "# ") {
		t.Fatal("a case begins with a comment that says what is done, and says what it breaks")
	}
	v.head = strings.TrimRight(v.head, "\n") + "\n"
	return v
}

func (v *vector) write(t *testing.T, found, imported []string) {
	t.Helper()
	text := v.head + "\nfound\n"
	for _, line := range found {
		text += line + "\n"
	}
	if imported != nil {
		text += "\nimported\n"
		for _, line := range imported {
			text += line + "\n"
		}
	}
	if err := os.WriteFile(v.file, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// good is the ledger before anything is done to it.
type good struct {
	file    string
	content []byte
	entries []chain.Entry
	states  map[int64]string
	names   []string // pairs for a strings.Replacer: value, {name}
}

func newGood(t *testing.T) *good {
	t.Helper()
	g := &good{file: baseLedger(t)}
	var err error
	if g.content, err = os.ReadFile(g.file); err != nil {
		t.Fatal(err)
	}
	l, err := ledger.Open(t.Context(), g.file, ledger.Options{ReadOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	g.entries = entriesOf(t, l.Entries(t.Context(), 1))
	r, err := history.Verify(t.Context(), l, history.VerifyOptions{Checker: newRepository()})
	if err != nil || len(r.Problems) > 0 {
		t.Fatal("the good ledger is not good: ", r, err)
	}
	g.states = statesOf(r.Line)
	name := func(value, format string, args ...any) {
		g.names = append(g.names, value, fmt.Sprintf(format, args...))
	}
	for _, e := range g.entries {
		name(e.Hash, "{hash %d}", e.Seq)
		if s, err := signedOf(e); err == nil {
			name(hexOf(s.Statement), "{statement %d}", e.Seq)
		}
	}
	for _, a := range r.Line.Assessments() {
		name(a.Digest, "{digest %d}", a.Number)
	}
	repo := newRepository()
	for _, c := range slices.Sorted(maps.Keys(repo.commits)) {
		name(commitOf(c), "{commit %s}", c)
		name(treeOf(c), "{tree %s}", c)
	}
	for _, p := range []string{"P1", "P2", "own", "lax", "two"} {
		name(policyHash(p), "{policy %s}", p)
	}
	for _, k := range []string{"ada", "ada2", "bea", "bea2", "cem", "dan", "fay", "gus", "hal", "mal", "nan"} {
		name(fingerprint(k), "{key %s}", k)
	}
	name(ledgerID, "{ledger}")
	return g
}

// statesOf describes every assessment in one line.
func statesOf(line *approval.Line) map[int64]string {
	states := map[int64]string{}
	for _, a := range line.Assessments() {
		s := line.State(a.Number)
		text := s.Word
		for _, part := range []struct {
			word string
			list []string
		}{{"missing", s.Missing}, {"blocked by", s.Blocks}} {
			if len(part.list) > 0 {
				text += "; " + part.word + " " + strings.Join(part.list, ", ")
			}
		}
		if s.Superseded > 0 {
			text += fmt.Sprintf("; superseded by %d", s.Superseded)
		}
		states[a.Number] = text
	}
	return states
}

// look verifies a ledger and lists what is found.
func (g *good) look(ctx context.Context, file string, o history.VerifyOptions, say bool) (list []string, l *ledger.Ledger) {
	l, err := ledger.Open(ctx, file, ledger.Options{ReadOnly: true})
	if err != nil {
		return []string{g.named(file, "error: "+err.Error())}, nil
	}
	defer func() {
		if p := recover(); p != nil {
			list = append(list, g.named(file, fmt.Sprintf("panic: %v", p)))
			l.Close()
			l = nil
		}
	}()
	r, err := history.Verify(ctx, l, o)
	if err != nil {
		l.Close()
		return []string{g.named(file, "error: "+err.Error())}, nil
	}
	for _, p := range r.Problems {
		list = append(list, g.named(file, p.String()))
	}
	states := statesOf(r.Line)
	numbers := slices.Sorted(maps.Keys(states))
	for n := range g.states {
		if _, ok := states[n]; !ok {
			numbers = append(numbers, n)
		}
	}
	slices.Sort(numbers)
	for _, n := range numbers {
		if state := states[n]; state != g.states[n] {
			if state == "" {
				state = "is not there"
			}
			list = append(list, g.named(file, fmt.Sprintf("state %d: %s", n, state)))
		}
	}
	if say {
		for _, s := range r.Proved {
			list = append(list, g.named(file, "proved: "+s))
		}
		for _, s := range r.Unproved {
			list = append(list, g.named(file, "left open: "+s))
		}
	}
	return list, l
}

var nameless = regexp.MustCompile(`\b[0-9a-f]{64}\b`)

// named writes names for the values that the tests know, and one line for several.
func (g *good) named(file, s string) string {
	s = strings.NewReplacer(g.names...).Replace(s)
	if file != "" {
		s = strings.ReplaceAll(s, file, "{file}")
	}
	// A hash of something that was made up has no name; which one it is does not
	// matter.
	s = nameless.ReplaceAllString(s, "{another}")
	// The JSON library picks one of two words for each run of a program.
	s = strings.ReplaceAll(s, "json: unable to unmarshal", "json: cannot unmarshal")
	return strings.ReplaceAll(s, "\n", " | ")
}

// values writes the values of names.
func (g *good) values(s string) string {
	back := slices.Clone(g.names)
	for i := 0; i < len(back); i += 2 {
		back[i], back[i+1] = back[i+1], back[i]
	}
	return strings.NewReplacer(back...).Replace(s)
}

// roundTrip exports a ledger, imports it elsewhere and lists what is found there.
func (g *good) roundTrip(t *testing.T, l *ledger.Ledger, o history.VerifyOptions) (list []string) {
	t.Helper()
	var b bytes.Buffer
	if err := history.Export(t.Context(), l, &b); err != nil {
		return []string{g.named("", "error: "+err.Error())}
	}
	file := filepath.Join(quickDir(t), "imported.db")
	head, err := func() (head chain.Head, err error) {
		defer func() {
			if p := recover(); p != nil {
				err = fmt.Errorf("panic: %v", p)
			}
		}()
		return history.Import(t.Context(), file, &b)
	}()
	if err != nil {
		if _, statErr := os.Lstat(file); !errors.Is(statErr, os.ErrNotExist) {
			t.Errorf("a refused import leaves a file behind: %v", statErr)
		}
		return []string{g.named("", "refused: "+err.Error())}
	}
	if was, err := l.Head(t.Context()); err != nil || was != head {
		t.Errorf("the head of the import is %s, that of the export %s, %v", head, was, err)
	}
	list, again := g.look(t.Context(), file, o, false)
	if again == nil {
		t.Fatal("what was imported cannot be read:", list)
	}
	again.Close()
	return append([]string{"taken"}, list...)
}

// The kinds of failure, each found with its own message.
func TestVectors(t *testing.T) {
	files, err := filepath.Glob(filepath.Join(vectorFolder, "*.txt"))
	if err != nil {
		t.Fatal(err)
	}
	g := newGood(t)
	var lock sync.Mutex
	messages := map[string]map[string][]string{} // message -> kind of failure -> cases
	tampered := 0
	t.Run("cases", func(t *testing.T) {
		for _, file := range files {
			v := readVector(t, file)
			if v.breaks != "nothing" {
				tampered++
			}
			t.Run(v.name, func(t *testing.T) {
				t.Parallel()
				found, imported := g.run(t, v)
				v.compare(t, found, imported)
				if v.breaks == "nothing" {
					return
				}
				m := message(found)
				lock.Lock()
				defer lock.Unlock()
				if messages[m] == nil {
					messages[m] = map[string][]string{}
				}
				messages[m][v.breaks] = append(messages[m][v.breaks], v.name)
			})
		}
	})
	for m, kinds := range messages {
		if len(kinds) > 1 {
			t.Errorf("these kinds of failure give the same message %q: %v", m, kinds)
		}
	}
	if tampered < 70 {
		t.Errorf("%d cases of tampering, at least 70 are wanted", tampered)
	}
}

// compare holds what was found against what the case wants.
func (v *vector) compare(t *testing.T, found, imported []string) {
	t.Helper()
	failed := slices.ContainsFunc(found, isFailure)
	if (v.breaks == "nothing") == failed {
		t.Errorf("it breaks %s, and this is found:\n  %s", v.breaks, strings.Join(found, "\n  "))
	}
	if broken := func(s string) bool { return strings.HasPrefix(s, "chain:") }; slices.ContainsFunc(found, broken) && (len(imported) != 1 || !strings.HasPrefix(imported[0], "refused: ")) {
		t.Errorf("a broken chain is imported: %s", strings.Join(imported, "\n"))
	}
	// An import makes the rows and the file anew: nothing can be wrong with them.
	if slices.ContainsFunc(imported, ofFile) {
		t.Errorf("an import gives wrong rows: %s", strings.Join(imported, "\n"))
	}
	if slices.Equal(found, v.found) && slices.Equal(imported, v.imported) {
		return
	}
	if *update {
		v.write(t, found, imported)
		return
	}
	t.Errorf("found\n  %s\nwant\n  %s\nimported\n  %s\nwant\n  %s", strings.Join(found, "\n  "), strings.Join(v.found, "\n  "), strings.Join(imported, "\n  "), strings.Join(v.imported, "\n  "))
}

// isFailure tells a line that something is wrong from one about a state, and from
// what was proved.
func isFailure(s string) bool {
	return !strings.HasPrefix(s, "state ") && !strings.HasPrefix(s, "proved: ") && !strings.HasPrefix(s, "left open: ")
}

var particular = regexp.MustCompile(`\{[A-Za-z0-9 ]+\}|[0-9]+`)

// message is what is found without the numbers and names of a case.
func message(found []string) string {
	return particular.ReplaceAllString(strings.Join(found, "\n"), "N")
}

func (g *good) run(t *testing.T, v *vector) (found, imported []string) {
	t.Helper()
	file := filepath.Join(quickDir(t), "ledger.db")
	if err := os.WriteFile(file, g.content, 0o600); err != nil {
		t.Fatal(err)
	}
	x := &tamperer{t: t, g: g, file: file, repo: newRepository()}
	x.o.Checker = x.repo
	for _, step := range v.steps {
		x.step(step)
	}
	found, l := g.look(t.Context(), file, x.o, v.say)
	if l == nil {
		return found, nil
	}
	defer l.Close()
	imported = g.roundTrip(t, l, x.o)
	if imported[0] == "taken" && slices.Equal(imported[1:], slices.DeleteFunc(slices.Clone(found), ofFile)) {
		imported = []string{"taken, the same is found"}
	}
	return found, imported
}

// ofFile tells what an import cannot take over from what it takes over.
func ofFile(s string) bool {
	for _, prefix := range []string{"rows:", "file:", "proved:", "left open:"} {
		if strings.HasPrefix(s, prefix) {
			return true
		}
	}
	return false
}
