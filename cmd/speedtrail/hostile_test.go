package main

import (
	"encoding/csv"
	"encoding/json"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode"
	"unicode/utf8"

	"speedtrail/history/compose"
)

// invisible finds what may not stand in any output: a control code other than
// the line feed, a mark that is not seen, what is not UTF-8.
func invisible(s string) error {
	if !utf8.ValidString(s) {
		return errors.New("it is not UTF-8")
	}
	for i, r := range s {
		if r != '\n' && (unicode.IsControl(r) || unicode.Is(unicode.Cf, r) || r == '\u2028' || r == '\u2029') {
			return fmt.Errorf("it holds %U in %q", r, s[max(0, i-40):min(len(s), i+40)])
		}
	}
	if i := strings.Index(s, "%!"); i >= 0 {
		return fmt.Errorf("a printf has met data: %q", s[max(0, i-40):min(len(s), i+40)])
	}
	return nil
}

// where finds the first of some texts.
func where(s string, list ...string) error {
	for _, x := range list {
		if i := strings.Index(s, x); i >= 0 {
			return fmt.Errorf("it holds %q as it is: %q", x, s[max(0, i-60):min(len(s), i+60)])
		}
	}
	return nil
}

// number is what a cell that begins with a sign may be: a number or a position.
var number = regexp.MustCompile(`^-?[0-9]+(\.[0-9]+)?(#[0-9]+)?$`)

// inert checks an output by its format. The errors are that something is not
// seen, and that the form is broken.
func inert(format, s string) (list []error) {
	for _, err := range []error{invisible(s), whole(format, s)} {
		if err != nil {
			list = append(list, err)
		}
	}
	return list
}

func whole(format, s string) error {
	switch format {
	case "html":
		// The texts hold <zz, and both quotation marks after q=.
		return where(s, "<zz", `q="'`, `q='`, "{{1}}%!", "<script src", "javascript:")
	case "svg":
		if err := where(s, "<zz", `q="'`, "<script"); err != nil {
			return err
		}
		d := xml.NewDecoder(strings.NewReader(s))
		for {
			token, err := d.Token()
			if err == io.EOF {
				return nil
			}
			if err != nil {
				return err
			}
			if e, ok := token.(xml.StartElement); ok && !slices.Contains([]string{"svg", "title", "desc", "style", "defs", "g", "path", "rect", "line", "polyline", "text", "tspan", "circle", "polygon", "pattern"}, e.Name.Local) {
				return fmt.Errorf("element %s", e.Name.Local)
			}
		}
	case "markdown":
		if err := where(s, "<zz", "](", "`id`", "![", "zz<"); err != nil {
			return err
		}
		columns := 0
		for line := range strings.Lines(s) {
			bars := strings.Count(strings.ReplaceAll(strings.ReplaceAll(line, `\\`, ""), `\|`, ""), "|")
			if !strings.HasPrefix(line, "|") {
				bars = 0
			} else if columns != 0 && bars != columns {
				return fmt.Errorf("a row of %d bars in a table of %d: %s", bars, columns, line)
			}
			columns = bars
		}
	case "csv":
		rows, err := csv.NewReader(strings.NewReader(s)).ReadAll()
		if err != nil || len(rows) < 2 {
			return fmt.Errorf("%d rows, %v", len(rows), err)
		}
		for _, row := range rows {
			for _, cell := range row {
				if cell != "" && strings.ContainsRune("=+-@\t\r", rune(cell[0])) && !number.MatchString(cell) {
					return fmt.Errorf("the cell %q", cell)
				}
			}
		}
	case "json":
		var v any
		return json.Unmarshal([]byte(s), &v)
	case "jsonl":
		for line := range strings.Lines(s) {
			if err := whole("json", line); err != nil {
				return err
			}
		}
	}
	return nil
}

// Names and messages that try to do something stay text in every command and
// every format.
func TestHostileNames(t *testing.T) {
	keys := t.TempDir()
	repo := hostileRepo(t, keys)
	base, target := hostileTag("="), hostileTag("+")
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	reason := nasty("=")
	sign := func(role, by string) []string {
		return in("sign", "1", "--role", role, "--decision", "approve", "--reason", reason, "--key", key(by), "-y")
	}
	trains := []string{nasty("="), nasty("+"), nasty("-"), nasty("@")}

	type command struct {
		formats string // "" for text that --format does not choose
		status  int
		args    []string
	}
	list := []command{
		{"text json", 0, in("validate", base)},
		{"text json", 0, in("validate", hostileBranch("="))},
		{"text json", 2, in("validate", "faulty")},
		{"text json", 0, in("validate")},
		{"text", 2, in("validate", "no"+unseen+"thing")},
		{"text", 2, in("validate", "--data", "no"+unseen+"thing")},
		{"text", 2, in("validate", "--format", "no"+unseen+"thing")},
		{"text", 2, in("no" + unseen + "thing")},
		{"text", 2, in("validate", "--no"+unseen+"thing")},
		{"text", 2, in("profile", base, "--route", "no"+unseen, "--train", trains[0])},
		{"text", 2, in("profile", base, "--route", "-R", "--train", "no"+unseen)},
		{"text", 2, in("profile", base, "--route", "-R", "--train", trains[0], "--on", "no"+unseen)},
		{"text", 3, []string{"--repo", "no" + unseen + "thing", "validate"}},
		{"text", 3, in("--ledger", filepath.Join(keys, "no"+unseen), "register")},
		{"text chart csv json svg", 0, in("profile", target, "--route", "-R", "--train", trains[0], "--train", trains[2], "--direction", "nominal")},
		{"text chart csv json svg", 0, in("profile", hostileBranch("+"), "--route", "-R", "--train", trains[3], "--direction", "reverse")},
		{"text html markdown csv json", 1, in("assess", base, target, "--no-record")},
		{"text html markdown csv json", 1, in("assess", hostileBranch("="), hostileBranch("+"), "--no-record", "--request", nasty("="), "--rolling")},
		{"text html markdown csv json", 1, in("assess", base, target, "--no-record", "--request", "none")},
		{"text", 2, in("assess", base, target, "--no-record", "--request", "no"+unseen)},
		{"text", 2, in("assess", base, "faulty")},
		{"text json", 1, in("assess", base, target)},
		{"", 0, in("anchor", base, "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", reason, "-y")},
		{"", 2, in("anchor", base, "--sign", "ch"+unseen+"="+key("ada"), "--reason", reason, "-y")},
		{"", 2, in("sign", "1", "--role", "ch"+unseen, "--decision", "approve", "--reason", reason, "--key", key("ada"), "-y")},
		{"", 2, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "x"+unseen, "--key", key("ada"), "-y")},
		{"", 2, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", reason, "--key", key("no"+unseen), "-y")},
		{"", 0, sign("checker", "ada")},
		{"", 0, sign("approver", "bea")},
		{"", 0, in("inforce", "record", base, "--since", "2026-03-03T00:00:00Z", "--reason", reason, "--key", key("cem"), "-y")},
		{"", 0, in("inforce", "record", target, "--since", "2026-03-04T00:00:00Z", "--reason", nasty("-"), "--key", key("cem"), "-y")},
		{"", 2, in("inforce", "record", target, "--since", "2026"+unseen, "--reason", reason, "--key", key("cem"), "-y")},
		{"html text markdown csv json", 0, in("report", "1")},
		{"text json", 0, in("register")},
		{"text json", 1, in("inforce")},
		{"text json", 1, in("inforce", "--when", "2026-03-05T00:00:00Z")},
		{"text json", 1, in("inforce", "--when", "2026-03-05T00:00:00Z", "--route", "-R", "--at", "1.5")},
		{"text csv json html", 0, in("trace", target, "--route", "-R", "--at", "1.5")},
		{"text csv json html", 0, in("trace", hostileBranch("+"), "--route", "-R", "--at", "3.1", "--train", trains[0], "--train", trains[2], "--no-index")},
		{"text csv json html", 0, in("trace", target, "--route", "-R", "--from", "-0.5", "--to", "4.7#2", "--first-parent")},
		{"text", 2, in("trace", "faulty", "--route", "-R", "--at", "1")},
		{"text", 2, in("trace", target, "--route", "no"+unseen, "--at", "1")},
		{"text", 2, in("trace", target, "--route", "-R", "--at", "1"+unseen)},
		{"text json", 0, in("verify")},
		{"", 2, in("verify", "--against", "1:"+unseen)},
		{"jsonl", 0, in("export")},
	}
	for _, c := range list {
		for _, format := range strings.Fields(c.formats + " ") {
			args := c.args
			if format != "jsonl" && strings.Contains(c.formats, " ") {
				args = append(slices.Clone(args), "--format", format)
			}
			t.Run(args[2]+" "+format, func(t *testing.T) { check(t, format, c.status, args) })
		}
		if c.formats == "" {
			t.Run(c.args[2], func(t *testing.T) { check(t, "text", c.status, c.args) })
		}
	}
}

// check calls the command and holds both of its streams against inert.
func check(t *testing.T, format string, status int, args []string) {
	t.Helper()
	defer func() {
		if p := recover(); p != nil {
			t.Errorf("%q: panic: %v", args[2:], p)
		}
	}()
	got := call(t, args...)
	if got.status != status {
		t.Errorf("%q: status %d, want %d\n%.3000s", args[2:], got.status, status, got.errors)
		return
	}
	var list []error
	for _, err := range inert("text", got.errors) {
		list = append(list, fmt.Errorf("on standard error: %w", err))
	}
	if got.out != "" {
		list = append(list, inert(format, got.out)...)
	} else if status != 2 && format != "text" {
		list = append(list, errors.New("nothing on standard output"))
	}
	for _, err := range list {
		t.Errorf("%q: %v", args[2:], err)
	}
}

// What looks like a position and is none, in a cell that begins with a sign.
func TestHostileCell(t *testing.T) {
	keys := t.TempDir()
	for _, id := range []string{"-1#+1", "-1#cmd|' /C x'!A0", "-inf", "-0x1p1", "+1", "@x", "=1", "-1", "-1.5"} {
		files := plainFiles(t, keys, 60)
		files["trains.toml"] = strings.Replace(files["trains.toml"], `"T"`, quoted(id), 1)
		dir := filepath.Join(t.TempDir(), "repo")
		if err := compose.Write(t.Context(), dir, []compose.Commit{{Files: files, When: time.Unix(1_700_000_000, 0).UTC(), Message: "One\n"}}); err != nil {
			t.Fatal(err)
		}
		t.Run(id, func(t *testing.T) {
			got := call(t, "--repo", dir, "profile", "--route", "R1", "--train", id, "--format", "csv").want(t, 0)
			if err := whole("csv", got.out); err != nil {
				t.Error(err)
			}
		})
	}
}

// The folder of the demonstration is named as it is, and its name shown harmless.
func TestHostileFolder(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("the file system cannot hold such names")
	}
	dir := filepath.Join(t.TempDir(), "net\x1b[31m\u202e")
	got := call(t, "demo", dir).want(t, 0)
	for stream, text := range map[string]string{"output": got.out, "error": got.errors} {
		if err := invisible(text); err != nil {
			t.Errorf("standard %s of demo has the folder as it is: %v", stream, err)
		}
	}
	if got := call(t, "demo", dir).want(t, 2); invisible(got.errors) != nil {
		t.Error(invisible(got.errors))
	}
}
