package history_test

import (
	"bytes"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/go-json-experiment/json"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

func openLedger(t testing.TB, file string) *ledger.Ledger {
	t.Helper()
	l, err := ledger.Open(t.Context(), file, ledger.Options{ReadOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

func export(t testing.TB, l *ledger.Ledger) string {
	t.Helper()
	var b bytes.Buffer
	if err := history.Export(t.Context(), l, &b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// dump writes all rows of all tables, in the order of their keys.
func dump(t testing.TB, file string) string {
	t.Helper()
	db, err := sql.Open("sqlite3", "file:"+filepath.ToSlash(file)+"?mode=ro")
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	var b strings.Builder
	for _, table := range append([]string{"entry"}, ledger.Tables...) {
		rows, err := db.Query("SELECT * FROM " + table + " ORDER BY 1, 2")
		if err != nil {
			t.Fatal(err)
		}
		columns, err := rows.Columns()
		if err != nil {
			t.Fatal(err)
		}
		n := 0
		for rows.Next() {
			values, into := make([]any, len(columns)), make([]any, len(columns))
			for i := range values {
				into[i] = &values[i]
			}
			if err := rows.Scan(into...); err != nil {
				t.Fatal(err)
			}
			fmt.Fprintf(&b, "%s %v\n", table, values)
			n++
		}
		if err := rows.Err(); err != nil || n == 0 {
			t.Fatalf("table %s has %d rows, %v", table, n, err)
		}
		rows.Close()
	}
	return b.String()
}

// An export and import give the same head, the same rows and the same export.
func TestExportImport(t *testing.T) {
	file := baseLedger(t)
	l := openLedger(t, file)
	head, err := l.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	text := export(t, l)
	if n := strings.Count(text, "\n"); int64(n) != head.Seq || !strings.HasSuffix(text, "\n") {
		t.Errorf("%d lines for %d entries", n, head.Seq)
	}
	copied := filepath.Join(quickDir(t), "a folder", "copy.db")
	got, err := history.Import(t.Context(), copied, strings.NewReader(text))
	if err != nil || got != head {
		t.Fatalf("the head is %s, want %s, %v", got, head, err)
	}
	if have, want := dump(t, copied), dump(t, file); have != want {
		t.Errorf("the rows differ\n%s\nwant\n%s", have, want)
	}
	again := openLedger(t, copied)
	if export(t, again) != text {
		t.Error("the export of the import is another one")
	}
	if again.ID() != ledgerID {
		t.Errorf("the id is %s", again.ID())
	}
	if _, err := history.Import(t.Context(), copied, strings.NewReader(text)); !errors.Is(err, ledger.ErrExists) {
		t.Errorf("an import over a ledger: %v", err)
	}
	if dump(t, copied) != dump(t, file) {
		t.Error("the refused import has altered the ledger")
	}
}

// What an import refuses, with the line where it stands; nothing is left behind.
func TestImportRefuses(t *testing.T) {
	lines := strings.SplitAfter(strings.TrimSuffix(export(t, openLedger(t, baseLedger(t))), "\n"), "\n")
	lines[len(lines)-1] += "\n"
	edit := func(n int, old, replacement string) []string {
		list := append([]string{}, lines...)
		list[n-1] = strings.Replace(list[n-1], old, replacement, 1)
		if list[n-1] == lines[n-1] {
			t.Fatalf("line %d does not hold %q: %s", n, old, list[n-1])
		}
		return list
	}
	without := func(n int) []string { return append(append([]string{}, lines[:n-1]...), lines[n:]...) }
	for name, c := range map[string]struct {
		lines []string
		line  int
		text  string
	}{
		"a body altered":     {edit(5, "looked at it", "looked it at"), 5, "entry 5 does not have the hash of its content"},
		"a time altered":     {edit(6, "T13:", "T12:"), 6, "entry 6 does not have the hash of its content"},
		"a kind altered":     {edit(14, `"kind":"revocation"`, `"kind":"note"`), 14, "entry 14 does not have the hash of its content"},
		"a hash altered":     {edit(4, `"hash":"`, `"hash":"0`), 4, "entry 4 does not have the hash of its content"},
		"a number altered":   {edit(4, `"seq":4`, `"seq":5`), 4, "entry 5 is not the next number"},
		"a line less":        {without(7), 7, "entry 8 is not the next number"},
		"the first one less": {without(1), 1, "entry 2 is not the next number"},
		"two lines changed":  {append(append(append([]string{}, lines[:5]...), lines[6], lines[5]), lines[7:]...), 6, "entry 7 is not the next number"},
		"a line twice":       {append(append([]string{}, lines[:5]...), lines[4:]...), 6, "entry 5 is not the next number"},
		"a member more":      {edit(3, `{"body"`, `{"note":"x","body"`), 3, "note"},
		"a member twice":     {edit(3, `"seq":3`, `"seq":3,"seq":3`), 3, "duplicate"},
		"a blank line":       {append([]string{lines[0], "\n"}, lines[1:]...), 2, "it is blank, and entries follow it"},
		"no JSON":            {append([]string{"entries\n"}, lines...), 1, ""},
		"half a line":        {append(append([]string{}, lines[:16]...), lines[16][:100]), 17, ""},
		"nothing":            {nil, 1, "no entry was given"},
	} {
		t.Run(name, func(t *testing.T) {
			file := filepath.Join(quickDir(t), "copy.db")
			_, err := history.Import(t.Context(), file, strings.NewReader(strings.Join(c.lines, "")))
			var at *history.ImportError
			if err == nil || !strings.Contains(err.Error(), c.text) || !errors.As(err, &at) || at.Line != c.line {
				t.Errorf("got %v, want line %d and %q", err, c.line, c.text)
			}
			if _, err := os.Lstat(file); !errors.Is(err, os.ErrNotExist) {
				t.Error("a file is left behind")
			}
		})
	}
	if _, err := history.Import(t.Context(), filepath.Join(quickDir(t), "copy.db"), strings.NewReader(strings.TrimSuffix(strings.Join(lines, ""), "\n"))); err != nil {
		t.Errorf("a last line without its end is refused: %v", err)
	}
}

// The same for entries that follow each other as they should and make no ledger.
func TestImportRefusesEntries(t *testing.T) {
	first := `ledger 2026-03-01T08:00:00Z {"format":1,"id":"` + ledgerID + `"}`
	signed := ""
	for e, err := range openLedger(t, baseLedger(t)).Entries(t.Context(), 1) {
		if err != nil {
			t.Fatal(err)
		}
		if e.Kind == chain.SignOff {
			signed = string(e.Kind) + " " + e.Time + " " + string(e.Body)
		}
	}
	for name, c := range map[string]struct {
		entries []string
		line    int
		text    string
	}{
		"a first one of another kind":   {[]string{signed}, 1, "it is of kind sign-off"},
		"a first one without an id":     {[]string{`ledger 2026-03-01T08:00:00Z {"format":1}`}, 1, "the first entry has no id"},
		"a first one of a new version":  {[]string{`ledger 2026-03-01T08:00:00Z {"format":9}`}, 1, "entries of form 9"},
		"a second ledger":               {[]string{first, first}, 2, "it is of kind ledger"},
		"a body that is not canonical":  {[]string{first, `note 2026-03-01T08:00:00Z {"b":1, "a":2}`}, 2, "the body is"},
		"a sign-off of what is missing": {[]string{first, signed}, 2, "it does not go with those before it"},
	} {
		t.Run(name, func(t *testing.T) {
			file := filepath.Join(quickDir(t), "copy.db")
			_, err := history.Import(t.Context(), file, bytes.NewReader(chainedLines([]byte(strings.Join(c.entries, "\n")))))
			var at *history.ImportError
			if !errors.As(err, &at) || at.Line != c.line || !strings.Contains(err.Error(), c.text) {
				t.Errorf("got %v, want line %d and %q", err, c.line, c.text)
			}
			if _, err := os.Lstat(file); !errors.Is(err, os.ErrNotExist) {
				t.Error("a file is left behind")
			}
		})
	}
}

// needs skips a test without an outside program; where CI is set it fails.
func needs(t *testing.T, programs ...string) {
	t.Helper()
	for _, p := range programs {
		if _, err := exec.LookPath(p); err != nil {
			if os.Getenv("CI") == "true" {
				t.Fatal(err)
			}
			t.Skip(p + " is not installed")
		}
	}
}

// byHand checks an export by the formula of package chain with nothing but a
// shell, jq and sha256sum.
const byHand = `
set -eu
previous=$(printf '%064d' 0)
number=0
while IFS= read -r line; do
  number=$((number + 1))
  field() { printf '%s' "$line" | jq -j ".$1"; }
  body=$(field body | sha256sum | cut -d' ' -f1)
  hash=$(printf 'speedtrail-entry 1\n%s\n%s\n%s\n%s\n%s\n' "$number" "$(field time)" "$(field kind)" "$body" "$previous" | sha256sum | cut -d' ' -f1)
  [ "$(field seq)" = "$number" ] && [ "$(field previous)" = "$previous" ] && [ "$(field hash)" = "$hash" ] || { echo "entry $number is wrong"; exit 1; }
  previous=$hash
done
echo "$number:$previous"
`

func TestChainByHand(t *testing.T) {
	needs(t, "sh", "jq", "sha256sum", "cut")
	l := openLedger(t, baseLedger(t))
	head, err := l.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	text := export(t, l)
	run := func(text string) string {
		c := exec.Command("sh", "-c", byHand)
		c.Stdin = strings.NewReader(text)
		out, _ := c.CombinedOutput()
		return strings.TrimSpace(string(out))
	}
	if got := run(text); got != head.String() {
		t.Errorf("by hand: %s, the head is %s", got, head)
	}
	if got := run(strings.Replace(text, "looked at it", "looked it at", 1)); got != "entry 3 is wrong" {
		t.Errorf("an altered body: %s", got)
	}
	// A statement can be checked with ssh-keygen alone; cmd/speedtrail's stories do.
}

// Every table answers a question that is asked with the sqlite3 program alone.
func TestTablesByHand(t *testing.T) {
	needs(t, "sqlite3")
	file := baseLedger(t)
	g := strings.NewReplacer(commitOf("a"), "A", commitOf("b"), "B", commitOf("c"), "C", commitOf("d"), "D", commitOf("e"), "E", treeOf("b"), "tb", treeOf("c"), "tc", treeOf("a"), "ta",
		fingerprint("bea2"), "BEA2", fingerprint("ada"), "ADA", policyHash("P1"), "P1")
	for _, c := range []struct{ table, query, want string }{
		{"entry", "SELECT seq, time, kind FROM entry WHERE kind IN ('ledger', 'anchor', 'revocation') ORDER BY seq", "1|2026-03-01T08:00:00Z|ledger\n3|2026-03-01T10:00:00Z|anchor\n14|2026-03-01T21:00:00Z|revocation"},
		{"entry", "SELECT count(*) FROM entry e JOIN entry n ON n.previous = e.hash AND n.seq = e.seq + 1", "16"},
		{"entry", "SELECT json_extract(CAST(body AS TEXT), '$.id') FROM entry WHERE seq = 1", ledgerID},
		{"assessment", "SELECT number, entry, base, target, dataset, rules_version, speed_changes, findings FROM assessment ORDER BY number", "1|2|A|B|Tarn|2|3|3\n2|8|B|C|Tarn|2|3|1\n3|15|C|D|Tarn|2|3|0\n4|17|A|E|Tarn|2|3|0"},
		{"request", "SELECT a.number, r.id, r.title FROM request r JOIN assessment a ON a.number = r.assessment WHERE a.number < 3 ORDER BY 1", "1|CR-b|Request b\n2|CR-c|Request c"},
		{"preparer", "SELECT place, email FROM preparer WHERE assessment = 4 ORDER BY place", "1|dan@users.example\n2|eva@fell.example"},
		{"finding", "SELECT id, count(*), sum(accepted <> '') FROM finding WHERE assessment = 1 GROUP BY id ORDER BY id", "masked|2|1\noutside|1|0"},
		{"speed_change", "SELECT direction, train, from_km, to_km, length_mm, before_kmh, after_kmh, run_out, before_source, after_source FROM speed_change WHERE assessment = 3 ORDER BY place", "nominal|T1|1|2|1000000|60|80|0|routes/r1/speed.csv:3 basic 60|routes/r1/speed.csv:3 basic 80\nnominal|T2|1|2|1000000|60|80|0|routes/r1/speed.csv:3 basic 60|routes/r1/speed.csv:3 basic 80\nreverse|T1|2|1|1000000|60|80|1|routes/r1/speed.csv:3 basic 60|routes/r1/speed.csv:3 basic 80"},
		{"anchor", "SELECT place, folder, revision, content, policy, role, signer FROM anchor ORDER BY place", "1|.|A|ta|P1|checker|ada@tarn.example\n2|.|A|ta|P1|approver|bea@tarn.example\n3|.|A|ta|P1|in-service|cem@tarn.example"},
		{"sign_off", "SELECT s.entry, s.role, s.decision, s.signer FROM sign_off s JOIN assessment a ON a.number = s.assessment AND a.digest = s.digest WHERE a.number = 1 ORDER BY s.entry", "5|checker|approve|ada@tarn.example\n6|approver|reject|bea@tarn.example\n7|approver|approve|bea@tarn.example"},
		{"sign_off", "SELECT count(*) FROM sign_off WHERE key = '" + fingerprint("ada") + "'", "2"},
		{"in_force", "SELECT entry, revision, content, routes, since, corrects FROM in_force ORDER BY entry", "4|A|ta|all|2026-03-01T03:00:00Z|nothing\n11|B|tb|R1|2026-03-10T03:00:00Z|nothing\n12|B|tb|all|2026-03-12T03:00:00Z|replaces 11\n13|C|tc|all|2026-03-20T03:00:00Z|nothing"},
		{"revocation", "SELECT entry, revoked_key, role, signer FROM revocation", "14|BEA2|owner|bea@tarn.example"},
	} {
		out, err := exec.Command("sqlite3", "-batch", "-bail", "-readonly", file, c.query).CombinedOutput()
		if got := strings.TrimSuffix(g.Replace(string(out)), "\n"); err != nil || got != c.want {
			t.Errorf("%s: %s\ngot\n%s\nwant\n%s\n%v", c.table, c.query, got, c.want, err)
		}
	}
	asked := map[string]bool{}
	for _, table := range ledger.Tables {
		asked[table] = true
	}
	if len(asked) != 9 {
		t.Errorf("there are tables that no question is asked of: %v", ledger.Tables)
	}
}

// A refused statement leaves the ledger as it is.
func TestRefusedIsNotRecorded(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	n := w.assess("a", "b")
	before := export(t, w.l)
	line, problems, err := history.ReadLine(t.Context(), w.l)
	if err != nil || len(problems) > 0 {
		t.Fatal(problems, err)
	}
	text, signature, err := sign(signOffOf(line.Assessment(n), "checker", signoff.Approve), "ada", w.head, w.now())
	if err != nil {
		t.Fatal(err)
	}
	if _, err := history.RecordSigned(t.Context(), w.l, nil, history.Statement{Kind: chain.SignOff, Text: text, Signature: signature}, w.now()); !errors.Is(err, approval.ErrRefused) || !strings.Contains(err.Error(), "no policy is anchored") {
		t.Errorf("a sign-off without an anchor: %v", err)
	}
	for _, kind := range []chain.Kind{chain.Anchor, chain.Ledger, chain.Assessment, chain.InForce, chain.Revocation, "note"} {
		if _, err := history.RecordSigned(t.Context(), w.l, nil, history.Statement{Kind: kind, Text: text, Signature: signature}, w.now()); err == nil {
			t.Errorf("a sign-off is recorded as %s", kind)
		}
	}
	body, err := anchorBody("a", "a", ".", "P1", w.head, w.now(), "checker:ada", "approver:bea")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := history.RecordAnchor(t.Context(), w.l, nil, body, w.now()); !errors.Is(err, approval.ErrRefused) {
		t.Errorf("an anchor that lacks a role: %v", err)
	}
	if export(t, w.l) != before {
		t.Error("something was recorded")
	}
	w.anchor("a")
	w.signOff(n, "ada", "checker", signoff.Approve)
}

// An assessment that cannot be computed anew was not computed anew.
func TestProvedCounts(t *testing.T) {
	l := openLedger(t, baseLedger(t))
	repo := newRepository()
	delete(repo.commits, "d")
	r, err := history.Verify(t.Context(), l, history.VerifyOptions{Checker: repo})
	if err != nil || r.Good() {
		t.Fatal(r.Problems, err)
	}
	for _, s := range r.Proved {
		if s == "4 of 4 assessments were computed anew from Git" {
			t.Error("an assessment whose commit is gone is counted as computed anew: ", s)
		}
	}
}

// Progress counts up to the number of assessments.
func TestProgress(t *testing.T) {
	l := openLedger(t, baseLedger(t))
	var seen []string
	_, err := history.Verify(t.Context(), l, history.VerifyOptions{Checker: newRepository(), Progress: func(done, total int) { seen = append(seen, fmt.Sprintf("%d/%d", done, total)) }})
	if err != nil || strings.Join(seen, " ") != "1/4 2/4 3/4 4/4" {
		t.Errorf("%v, %v", seen, err)
	}
}

// The lines of an export are JSON that any reader reads the same way.
func TestExportedLines(t *testing.T) {
	for line := range strings.Lines(export(t, openLedger(t, baseLedger(t)))) {
		var m map[string]any
		if err := json.Unmarshal([]byte(line), &m); err != nil {
			t.Fatal(err)
		}
		for _, name := range []string{"body", "hash", "kind", "previous", "seq", "time"} {
			if _, ok := m[name]; !ok || len(m) != 6 {
				t.Errorf("%s: %d members, %s", line, len(m), name)
			}
		}
	}
}

// A line that was read before is followed through what others have added since;
// one that goes on beyond the ledger, as where a backup was put in its place
// meanwhile, is not recorded by.
func TestLineOfAMomentAgo(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	w := newLedger(t, file)
	w.anchor("a")
	n := w.assess("a", "b")
	old, _, err := history.ReadLine(t.Context(), w.l)
	if err != nil {
		t.Fatal(err)
	}
	backup, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	// The checker may not approve as well: only what came later tells.
	w.signOff(n, "ada", "checker", signoff.Approve)
	text, signature, err := sign(signOffOf(old.Assessment(n), "approver", signoff.Approve), "ada", old.Head(), w.now())
	if err != nil {
		t.Fatal(err)
	}
	if _, err := history.RecordSigned(t.Context(), w.l, old, history.Statement{Kind: chain.SignOff, Text: text, Signature: signature}, w.now()); !errors.Is(err, approval.ErrRefused) {
		t.Errorf("the checker approves, too: %v", err)
	}
	if old.Head() != w.head {
		t.Errorf("the line ends at %v, the ledger at %v", old.Head(), w.head)
	}
	restored := filepath.Join(quickDir(t), "ledger.db")
	if err := os.WriteFile(restored, backup, 0o600); err != nil {
		t.Fatal(err)
	}
	l, err := ledger.Open(t.Context(), restored, ledger.Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if text, signature, err = sign(signOffOf(old.Assessment(n), "approver", signoff.Approve), "bea", w.head, w.now()); err != nil {
		t.Fatal(err)
	}
	if _, err := history.RecordSigned(t.Context(), l, old, history.Statement{Kind: chain.SignOff, Text: text, Signature: signature}, w.now()); !errors.Is(err, ledger.ErrDamaged) {
		t.Errorf("the end of the ledger is gone: %v", err)
	}
}
