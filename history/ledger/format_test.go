package ledger_test

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// Two versions of the tool: this one reads a ledger of the first format without
// touching it, and raises it when it writes.
func TestFirstFormat(t *testing.T) {
	dir := quickDir(t)
	file := filepath.Join(dir, "ledger.db")
	id := strings.Repeat("cd", 16)
	noted := ledger.CreateFormat(t, file, 1, when, id, recordOf("one", 3), recordOf("two", 0))
	before, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	ctx := t.Context()
	r := opened(t, file, ledger.Options{ReadOnly: true})
	if ledger.FormatOf(r) != 1 || r.ID() != id {
		t.Error(ledger.FormatOf(r), r.ID())
	}
	// What register, report and verify ask.
	if list, err := r.Assessments(ctx); err != nil || len(list) != 2 || list[1].Changes != 3 {
		t.Error(list, err)
	}
	if a, e, err := r.Assessment(ctx, 1); err != nil || a.Target != named("one") || !bytes.Equal(e.Body, recordOf("one", 3).Body) {
		t.Error(a, err)
	}
	if line, problems, err := history.ReadLine(ctx, r); err != nil || len(problems) > 0 || line.State(1).Word != approval.Open {
		t.Error(problems, err)
	}
	if head, err := verified(ctx, r, noted); err != nil || head != noted {
		t.Error(head, err)
	}
	if _, err := anchor(ctx, r, when); err == nil {
		t.Error("an anchor was recorded in a ledger that is open for reading")
	}
	r.Close()
	if after, err := os.ReadFile(file); err != nil || !bytes.Equal(after, before) {
		t.Error("reading altered the ledger", err)
	}

	w := opened(t, file, ledger.Options{})
	if ledger.FormatOf(w) != ledger.Format {
		t.Error(ledger.FormatOf(w))
	}
	if head, err := verified(ctx, w, noted); err != nil || head != noted {
		t.Error("the upgrade altered an entry: ", head, err)
	}
	fresh := opened(t, filepath.Join(dir, "fresh.db"), ledger.Options{Create: true})
	have, err := ledger.Objects(ctx, w)
	if err != nil {
		t.Fatal(err)
	}
	want, err := ledger.Objects(ctx, fresh)
	if err != nil || strings.Join(have, "\n") != strings.Join(want, "\n") {
		t.Error("the tables are not those of a new ledger", err)
	}
	if _, err := anchor(ctx, w, when); err != nil {
		t.Fatal(err)
	}
	if _, err := signOff(ctx, w, when, 1, 1); err != nil {
		t.Fatal(err)
	}
	w.Close()
	// As any later process finds it, for reading and writing.
	for _, o := range []ledger.Options{{ReadOnly: true}, {}, {Create: true}} {
		l := opened(t, file, o)
		if head, err := verified(ctx, l, noted); err != nil || head.Seq != noted.Seq+2 || ledger.FormatOf(l) != ledger.Format {
			t.Error(head, err)
		}
		l.Close()
	}
}

// Several processes open a ledger of the first format at once: it is raised once,
// and all of them record.
func TestUpgradeAtOnce(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	noted := []chain.Head{ledger.CreateFormat(t, file, 1, when, strings.Repeat("ef", 16), recordOf("one", 3))}
	var group sync.WaitGroup
	outputs := make([][]byte, 4)
	for i := range outputs {
		cmd := process(t, "record", file, string(rune('a'+i)), 5)
		group.Go(func() { outputs[i], _ = cmd.Output() })
	}
	group.Wait()
	for i, out := range outputs {
		list := heads(t, string(out))
		if len(list) != 1 {
			t.Errorf("process %d: %s", i, out)
		}
		noted = append(noted, list...)
	}
	l := opened(t, file, ledger.Options{ReadOnly: true})
	if head, err := verified(t.Context(), l, noted...); err != nil || head.Seq != 6 || ledger.FormatOf(l) != ledger.Format {
		t.Fatal(head, err)
	}
}

// A reader has the ledger open in the first format while another process raises
// it and has it signed: it goes on, and sees what was added.
func TestUpgradeUnderReader(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	noted := ledger.CreateFormat(t, file, 1, when, strings.Repeat("ef", 16), recordOf("one", 3))
	r := opened(t, file, ledger.Options{ReadOnly: true})
	w := opened(t, file, ledger.Options{})
	if _, err := anchor(t.Context(), w, when); err != nil {
		t.Fatal(err)
	}
	head, err := verified(t.Context(), r, noted)
	if err != nil {
		t.Fatal("a ledger that was opened for reading in format 1 keeps that number when another process raises the file to format 2; the rows of what is signed since are then not looked for, and verify calls that a fault: ", err)
	}
	if head.Seq != noted.Seq+1 {
		t.Error(head)
	}
}

// A ledger of a later format is refused however it is opened, and left alone.
func TestLaterFormat(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	content, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	// user_version stands at offset 60 (Database File Format, section 1.3).
	content[63] = ledger.Format + 1
	if err := os.WriteFile(file, content, 0o644); err != nil {
		t.Fatal(err)
	}
	for _, o := range []ledger.Options{{ReadOnly: true}, {}, {Create: true, Now: clock}} {
		_, err := ledger.Open(t.Context(), file, o)
		var e *ledger.Error
		if !errors.Is(err, ledger.ErrNewer) || !errors.As(err, &e) || e.Hint() == "" {
			t.Errorf("%+v: %v", o, err)
		}
	}
	if after, err := os.ReadFile(file); err != nil || !bytes.Equal(after, content) {
		t.Error("it was altered", err)
	}
}

// A number of a format that is not that of the tables is refused: an upgrade that
// another program did by half.
func TestFormatOfOtherTables(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	ledger.CreateFormat(t, file, 1, when, strings.Repeat("ef", 16))
	content, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	content[63] = ledger.Format
	if err := os.WriteFile(file, content, 0o644); err != nil {
		t.Fatal(err)
	}
	for _, o := range []ledger.Options{{ReadOnly: true}, {}} {
		if _, err := ledger.Open(t.Context(), file, o); !errors.Is(err, ledger.ErrForeign) {
			t.Errorf("%+v: %v", o, err)
		}
	}
}
