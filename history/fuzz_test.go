package history_test

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/go-json-experiment/json"

	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// chainedLines makes an export of lines "kind time body", with the hashes that
// belong to them, so that what is in the bodies is read, too.
func chainedLines(data []byte) []byte {
	var b bytes.Buffer
	var head chain.Head
	for line := range strings.Lines(strings.ToValidUTF8(string(data), "")) {
		fields := strings.SplitN(strings.TrimSuffix(line, "\n"), " ", 3)
		if len(fields) < 3 {
			continue
		}
		at, err := time.Parse(chain.TimeLayout, fields[1])
		if err != nil {
			at = begin
		}
		e := chain.Next(head, at, chain.Kind(fields[0]), []byte(fields[2]))
		text, err := json.Marshal(map[string]any{"body": fields[2], "hash": e.Hash, "kind": fields[0], "previous": e.Previous, "seq": e.Seq, "time": e.Time})
		if err != nil {
			continue
		}
		b.Write(append(text, '\n'))
		head = e.Head()
	}
	return b.Bytes()
}

// FuzzImport: what cannot be imported names its line and leaves no file; what
// can be is a ledger whose export is the same entries, and which verify can read
// to its end.
func FuzzImport(f *testing.F) {
	text := export(f, openLedger(f, baseLedger(f)))
	lines := strings.SplitAfter(text, "\n")
	for _, seed := range []string{
		text, lines[0], lines[0] + lines[1], strings.Join(lines[:3], ""), text[:len(text)/2], "", "{}\n", "\xef\xbb\xbf" + lines[0],
		strings.TrimSuffix(lines[0], "\n") + "\r\n",
		strings.Replace(text, `"seq":2`, `"seq":2.0`, 1),
		strings.Replace(text, `"kind":"assessment"`, `"kind":"ledger"`, 1),
	} {
		f.Add([]byte(seed), false)
	}
	// Entries that are chained as they should be: "kind time body" a line.
	var all strings.Builder
	first := `ledger 2026-03-01T08:00:00Z {"format":1,"id":"` + ledgerID + `"}` + "\n"
	for e, err := range openLedger(f, baseLedger(f)).Entries(f.Context(), 1) {
		if err != nil {
			f.Fatal(err)
		}
		line := string(e.Kind) + " " + e.Time + " " + string(e.Body) + "\n"
		all.WriteString(line)
		f.Add([]byte(first+line), true)
	}
	f.Add([]byte(all.String()), true)
	for _, kind := range []chain.Kind{chain.Ledger, chain.Assessment, chain.Anchor, chain.SignOff, chain.InForce, chain.Revocation, "note", ""} {
		for _, body := range []string{"", "{}", "[]", "null", `{"format":"x"}`, `{"format":1,"id":""}`} {
			f.Add([]byte(first+string(kind)+" 9999-12-31T23:59:59Z "+body+"\n"), true)
		}
	}
	dir := quickDir(f)
	f.Fuzz(func(t *testing.T, data []byte, chained bool) {
		if chained {
			data = chainedLines(data)
		}
		file := filepath.Join(dir, "import.db")
		head, err := history.Import(t.Context(), file, bytes.NewReader(data))
		if err != nil {
			if _, statErr := os.Lstat(file); !errors.Is(statErr, os.ErrNotExist) {
				os.Remove(file)
				t.Fatalf("a file is left behind by %v", err)
			}
			var at *history.ImportError
			if errors.As(err, &at) && (at.Line < 1 || at.Line > bytes.Count(data, []byte("\n"))+1) {
				t.Fatalf("line %d of %d: %v", at.Line, bytes.Count(data, []byte("\n")), err)
			}
			return
		}
		defer os.Remove(file)
		l, err := ledger.Open(t.Context(), file, ledger.Options{ReadOnly: true})
		if err != nil {
			t.Fatalf("what was imported cannot be opened: %v", err)
		}
		defer l.Close()
		now, err := l.Head(t.Context())
		if err != nil || now != head {
			t.Fatalf("the head is %s, %v; the import said %s", now, err, head)
		}
		var again bytes.Buffer
		if err := history.Export(t.Context(), l, &again); err != nil {
			t.Fatal(err)
		}
		copied := filepath.Join(dir, "again.db")
		if second, err := history.Import(t.Context(), copied, bytes.NewReader(again.Bytes())); err != nil || second != head {
			t.Fatalf("the export cannot be imported: %s, %v, want %s", second, err, head)
		}
		os.Remove(copied)
		if int64(bytes.Count(again.Bytes(), []byte("\n"))) != head.Seq {
			t.Fatalf("%d lines for %d entries", bytes.Count(again.Bytes(), []byte("\n")), head.Seq)
		}
		if _, err := history.Verify(t.Context(), l, history.VerifyOptions{}); err != nil {
			t.Fatalf("verify stops: %v", err)
		}
	})
}
