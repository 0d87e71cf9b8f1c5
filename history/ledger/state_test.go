package ledger_test

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// hotJournal makes a ledger as a process leaves it that was killed while it wrote
// to the file itself: with a journal that has to be played back.
func hotJournal(t testing.TB, file string) {
	t.Helper()
	disk := useDisk(t)
	anchored(t, file)
	l := opened(t, file, onDisk(ledger.Options{}))
	disk.set(fault{}, false)
	whole := filepath.Join(filepath.Dir(file), "whole.db")
	content, err := os.ReadFile(file)
	if err == nil {
		err = os.WriteFile(whole, content, 0o644)
	}
	if err != nil {
		t.Fatal(err)
	}
	w := opened(t, whole, onDisk(ledger.Options{}))
	disk.set(fault{}, false)
	if _, err := assess(t.Context(), w, when, "two", 50); err != nil {
		t.Fatal(err)
	}
	calls, _, _ := disk.state()
	w.Close()
	os.Remove(whole)
	// All calls but the last two, the sync of the file and the deletion of the
	// journal, and none after them.
	disk.set(fault{at: calls - 1, sticky: true}, false)
	if _, err := assess(t.Context(), l, when, "two", 50); err == nil {
		t.Fatal("nothing failed")
	}
	l.Close()
	disk.set(fault{}, false)
	if _, err := os.Stat(file + "-journal"); err != nil {
		t.Fatal(err)
	}
}

// A journal that was left behind is played back by whoever opens the ledger next
// for writing, and again it is whole.
func TestHotJournal(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	hotJournal(t, file)
	l := opened(t, file, ledger.Options{})
	if head, err := verified(t.Context(), l); err != nil || head.Seq != 3 {
		t.Fatal(head, err)
	}
	if _, err := os.Stat(file + "-journal"); err == nil {
		t.Error("the journal is still there")
	}
	if head, err := assess(t.Context(), l, when, "two", 50); err != nil || head.Seq != 4 {
		t.Fatal(head, err)
	}
}

// register, report and verify open for reading. After a kill or a loss of power
// they show the ledger, or say what to do.
func TestHotJournalReadOnly(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	hotJournal(t, file)
	l, err := ledger.Open(t.Context(), file, ledger.Options{ReadOnly: true})
	if err == nil {
		defer l.Close()
		if head, err := verified(t.Context(), l); err != nil || head.Seq != 3 {
			t.Fatal(head, err)
		}
		return
	}
	var e *ledger.Error
	if !errors.As(err, &e) {
		t.Fatal(err)
	}
	if strings.Contains(e.Hint(), "check the rights") || strings.Contains(e.Hint(), "another file") {
		t.Errorf("a ledger with a journal that was left behind cannot be opened for reading, and the error does not say that any recording command mends it: %v; hint: %s", err, e.Hint())
	}
}

// Another process holds the ledger for longer than one waits: nothing is
// recorded, reading works meanwhile, and afterwards all is as before.
func TestLockedByAnotherProcess(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	holder := process(t, "hold", file, "", 0)
	in, err := holder.StdinPipe()
	if err != nil {
		t.Fatal(err)
	}
	out, err := holder.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := holder.Start(); err != nil {
		t.Fatal(err)
	}
	lines := bufio.NewReader(out)
	for line := ""; line != "locked\n"; {
		if line, err = lines.ReadString('\n'); err != nil {
			t.Fatal(err)
		}
	}
	const wait = 60 * time.Millisecond
	l := opened(t, file, ledger.Options{Wait: wait})
	begun := time.Now()
	for name, record := range map[string]func() error{
		"assessment": func() error { _, err := assess(t.Context(), l, when, "two", 1); return err },
		"sign-off":   func() error { _, err := signOff(t.Context(), l, when, 1, 1); return err },
	} {
		err := record()
		var e *ledger.Error
		if !errors.Is(err, ledger.ErrLocked) || !errors.As(err, &e) || !strings.Contains(e.Hint(), "try again") {
			t.Errorf("%s: %v", name, err)
		}
	}
	if waited := time.Since(begun); waited < wait {
		t.Error("it waited for ", waited, " only")
	}
	reader := opened(t, file, ledger.Options{ReadOnly: true, Wait: wait})
	if head, err := verified(t.Context(), reader); err != nil || head.Seq != 3 {
		t.Error("reading meanwhile: ", head, err)
	}
	in.Close()
	if line, err := lines.ReadString('\n'); err != nil || line != "given up\n" {
		t.Fatal(line, err)
	}
	if err := holder.Wait(); err != nil {
		t.Fatal(err)
	}
	if head, err := signOff(t.Context(), l, when, 1, 1); err != nil || head.Seq != 4 {
		t.Fatal(head, err)
	}
}

// A symbolic link is refused however the ledger is opened, and nothing is made
// where it points to.
func TestSymbolicLinks(t *testing.T) {
	dir := quickDir(t)
	good, nowhere := filepath.Join(dir, "good.db"), filepath.Join(dir, "nowhere.db")
	anchored(t, good)
	before, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	for name, target := range map[string]string{"good": good, "nowhere": nowhere} {
		link := filepath.Join(dir, name+"-link.db")
		if err := os.Symlink(target, link); err != nil {
			t.Skip("no symbolic links here: ", err)
		}
		for _, o := range []ledger.Options{{ReadOnly: true}, {}, {Create: true, Now: clock}} {
			if _, err := ledger.Open(t.Context(), link, o); !errors.Is(err, ledger.ErrSymlink) {
				t.Errorf("link to %s with %+v: %v", name, o, err)
			}
		}
	}
	if _, err := os.Lstat(nowhere); err == nil {
		t.Error("a ledger was made through a link")
	}
	if after, err := os.ReadFile(good); err != nil || !bytes.Equal(after, before) {
		t.Error("the ledger was altered through a link", err)
	}
}

// Yesterday's backup is a whole ledger: only a head that was noted since tells
// that entries are missing, and which. What is recorded in it then is a fork.
func TestRestoredBackup(t *testing.T) {
	dir := quickDir(t)
	file, backup := filepath.Join(dir, "ledger.db"), filepath.Join(dir, "backup.db")
	anchored(t, file)
	content, err := os.ReadFile(file)
	if err == nil {
		err = os.WriteFile(backup, content, 0o644)
	}
	if err != nil {
		t.Fatal(err)
	}
	l := opened(t, file, ledger.Options{})
	yesterday, err := l.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	first, err := signOff(t.Context(), l, when, 1, 1)
	if err != nil {
		t.Fatal(err)
	}
	second, err := assess(t.Context(), l, when, "two", 2)
	if err != nil {
		t.Fatal(err)
	}
	b := opened(t, backup, ledger.Options{})
	problems := func(noted ...chain.Head) (texts []string) {
		t.Helper()
		r, err := history.Verify(t.Context(), b, history.VerifyOptions{Against: noted})
		if err != nil {
			t.Fatal(err)
		}
		for _, p := range r.Problems {
			texts = append(texts, p.String())
		}
		return texts
	}
	if got := problems(); len(got) != 0 {
		t.Error("the backup itself: ", got)
	}
	got := problems(yesterday, first, second)
	if len(got) != 2 || !strings.Contains(got[0], "entry 4 is not there") || !strings.Contains(got[1], "entry 5 is not there") {
		t.Error("against heads noted since: ", got)
	}
	if _, err := assess(t.Context(), b, when, "other", 2); err != nil {
		t.Fatal(err)
	}
	got = problems(yesterday, first, second)
	if len(got) != 2 || !strings.Contains(got[0], "entry 4 is another one") || !strings.Contains(got[1], "entry 5 is not there") {
		t.Error("after more was recorded: ", got)
	}
}

// The system's clock jumps back between entries. Recording works, since times are
// claims and the chain is one of hashes; a statement that is older than the entry
// that it names is refused.
func TestClockJumpsBack(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	l := opened(t, file, ledger.Options{})
	ctx := t.Context()
	back := when.Add(-48 * time.Hour)
	head, err := assess(ctx, l, back, "two", 2)
	if err != nil {
		t.Fatal("an assessment before the entry before it: ", err)
	}
	if e, err := l.Entry(ctx, head.Seq); err != nil || e.Time != back.Format(chain.TimeLayout) {
		t.Error(e.Time, err)
	}
	// The head of the statement is the assessment of the day before yesterday.
	signed, err := signOff(ctx, l, back.Add(time.Second), 2, 1)
	if err != nil {
		t.Fatal("a statement after the entry that it names, though before others: ", err)
	}
	ahead, err := assess(ctx, l, when, "three", 2)
	if err != nil {
		t.Fatal(err)
	}
	for _, test := range []struct {
		name             string
		stated, recorded time.Time
		refused          string
	}{
		{"a statement before the entry that it names", when.Add(-time.Second), when, "before the entry"},
		{"the same with the clock still back", back, back, "before the entry"},
		{"the time of the entry, the clock back", when, back, "after the time of recording"},
		{"within the five minutes that are allowed", when, when.Add(-approval.Tolerance), ""},
	} {
		statement, signature, err := sign(ctx, l, test.stated, 3, 2)
		if err != nil {
			t.Fatal(err)
		}
		before, err := l.Head(ctx)
		if err != nil {
			t.Fatal(err)
		}
		_, err = history.RecordSigned(ctx, l, nil, history.Statement{Kind: chain.SignOff, Text: statement, Signature: signature}, test.recorded)
		after, _ := l.Head(ctx)
		switch {
		case test.refused == "" && err != nil:
			t.Errorf("%s: %v", test.name, err)
		case test.refused != "" && (!errors.Is(err, approval.ErrRefused) || !strings.Contains(err.Error(), test.refused)):
			t.Errorf("%s: %v", test.name, err)
		case test.refused != "" && after != before:
			t.Errorf("%s: it was refused and recorded", test.name)
		}
	}
	if _, err := verified(ctx, l, head, signed, ahead); err != nil {
		t.Fatal(err)
	}
}

// Where times go back is said, of many places the first ones, and is nothing wrong.
func TestTimesThatGoBack(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	l := opened(t, file, ledger.Options{})
	for _, c := range []struct {
		n    int64
		want string
	}{
		{1, "entry 4 was recorded before entry 3"},
		{7, "entry 4 was recorded before entry 3, entry 5 was recorded before entry 4, entry 6 was recorded before entry 5, entry 7 was recorded before entry 6, entry 8 was recorded before entry 7, and so on, 7 times"},
	} {
		for head, err := l.Head(t.Context()); head.Seq < 3+c.n; head, err = l.Head(t.Context()) {
			if err != nil {
				t.Fatal(err)
			}
			if _, err := assess(t.Context(), l, when.Add(-time.Duration(head.Seq)*time.Hour), fmt.Sprint("back ", head.Seq), 2); err != nil {
				t.Fatal(err)
			}
		}
		r, err := history.Verify(t.Context(), l, history.VerifyOptions{})
		if err != nil || !r.Good() || !slices.Contains(r.Unproved, "which clock was right: by their times "+c.want) {
			t.Error(c.n, err, r)
		}
	}
}

// The ledger was removed and the journal beside it stayed: a new ledger takes
// nothing of it.
func TestStrayJournal(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	hotJournal(t, file)
	if err := os.Remove(file); err != nil {
		t.Fatal(err)
	}
	if _, err := ledger.Open(t.Context(), file, ledger.Options{}); !errors.Is(err, ledger.ErrNoLedger) {
		t.Fatal(err)
	}
	l := opened(t, file, ledger.Options{Create: true})
	if head, err := verified(t.Context(), l); err != nil || head.Seq != 1 {
		t.Fatal(head, err)
	}
	if _, err := os.Stat(file + "-journal"); err == nil {
		t.Error("the journal is still there")
	}
}
