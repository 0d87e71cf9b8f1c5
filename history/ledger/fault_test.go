package ledger_test

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// deed is something that is done to a ledger, and that may fail in the middle.
type deed struct {
	name string
	// prepare makes the ledger to which it is done; nil: there is none yet.
	prepare func(t testing.TB, file string)
	// do is nil where it is the opening itself that is watched.
	do func(ctx context.Context, l *ledger.Ledger) (chain.Head, error)

	head chain.Head // that it leads to
}

var none chain.Head

// deeds are all ways in which a ledger is written.
var deeds = []deed{
	{"create", nil, nil, none},
	{"upgrade", func(t testing.TB, file string) {
		ledger.CreateFormat(t, file, 1, when, strings.Repeat("ab", 16), recordOf("one", 5), recordOf("two", 5))
	}, nil, none},
	{"anchor", func(t testing.TB, file string) { opened(t, file, ledger.Options{Create: true}).Close() },
		func(ctx context.Context, l *ledger.Ledger) (chain.Head, error) { return anchor(ctx, l, when) }, none},
	{"assessment", anchored, func(ctx context.Context, l *ledger.Ledger) (chain.Head, error) {
		return assess(ctx, l, when, "two", 120)
	}, none},
	{"large assessment", anchored, func(ctx context.Context, l *ledger.Ledger) (chain.Head, error) {
		if err := ledger.SmallCache(ctx, l); err != nil {
			return chain.Head{}, err
		}
		return assess(ctx, l, when, "two", 250)
	}, none},
	{"sign-off", anchored, func(ctx context.Context, l *ledger.Ledger) (chain.Head, error) {
		return signOff(ctx, l, when, 1, 2)
	}, none},
}

// anchored makes a ledger with an anchor and an assessment.
func anchored(t testing.TB, file string) {
	l := opened(t, file, ledger.Options{Create: true})
	defer l.Close()
	if _, err := anchor(t.Context(), l, when); err != nil {
		t.Fatal(err)
	}
	if _, err := assess(t.Context(), l, when, "one", 3); err != nil {
		t.Fatal(err)
	}
}

// template makes the ledger to which a deed is done; nil where there is none yet.
func (d deed) template(t testing.TB, eyes *inspector) (content []byte, before found) {
	t.Helper()
	if d.prepare == nil {
		return nil, found{}
	}
	file := filepath.Join(quickDir(t), "ledger.db")
	d.prepare(t, file)
	content, err := os.ReadFile(file)
	if err == nil {
		before, err = eyes.content(t.Context(), content, nil)
	}
	if err != nil {
		t.Fatal(err)
	}
	return content, before
}

// run does a deed to a ledger that is opened through the disk. The ledger is
// given where it could be opened, and has to be closed.
func (d deed) run(ctx context.Context, file string, watch func()) (l *ledger.Ledger, head chain.Head, err error) {
	if d.do == nil {
		watch()
	}
	l, err = ledger.Open(ctx, file, onDisk(ledger.Options{Create: d.prepare == nil, Now: clock}))
	if err != nil {
		return nil, head, err
	}
	if d.do == nil {
		head, err = l.Head(ctx)
		return l, head, err
	}
	watch()
	head, err = d.do(ctx, l)
	return l, head, err
}

// headAfter is the head that a deed leads to. Times and keys being fixed, it is
// always the same but for that of a new ledger, which has a random id.
func (d deed) headAfter(before, after found) chain.Head {
	switch {
	case d.prepare == nil:
		return chain.Head{Seq: 1, Hash: after.head.Hash}
	case d.do == nil:
		return before.head
	}
	return d.head
}

// found is what a file holds.
type found struct {
	format int // 0: it is no ledger yet
	head   chain.Head
}

// look opens a ledger as the next process would, after whatever happened to it,
// and proves it whole.
func look(ctx context.Context, file string, noted ...chain.Head) (f found, err error) {
	// A connection of no ledger first: it plays back a journal, as every opening
	// for writing does, and upgrades nothing.
	db, err := sql.Open("sqlite3", "file:"+file+"?mode=rw")
	if err != nil {
		return f, err
	}
	err = db.QueryRowContext(ctx, "PRAGMA user_version").Scan(new(int))
	if err := errors.Join(err, db.Close()); err != nil {
		return f, err
	}
	l, err := ledger.Open(ctx, file, ledger.Options{ReadOnly: true})
	if errors.Is(err, ledger.ErrNoLedger) {
		return f, nil
	}
	if err != nil {
		return f, err
	}
	defer l.Close()
	f.format = ledger.FormatOf(l)
	f.head, err = verified(ctx, l, noted...)
	return f, err
}

// Every call that alters a file fails, one after the other, once or for good,
// with nothing of it or half of it done. The ledger is the one before or the one
// after, never a mix; what was reported as recorded is there; the error says what
// to do and nothing untrue; and once the disk is sound again the same thing can
// be done, by the same process and by another.
func TestEveryCallFails(t *testing.T) {
	for _, d := range deeds {
		t.Run(d.name, func(t *testing.T) {
			disk := useDisk(t)
			dir := quickDir(t)
			eyes := newInspector(t)
			template, before := d.template(t, eyes)
			once := func(n int, mode fault) (int, chain.Head) {
				mode.at = n
				file := filepath.Join(dir, fmt.Sprintf("%d_%v_%v.db", n, mode.sticky, mode.noSpace))
				if template != nil {
					if err := os.WriteFile(file, template, 0o644); err != nil {
						t.Fatal(err)
					}
				}
				return failOnce(t, disk, eyes, d, file, before, mode)
			}
			calls, head := once(0, fault{})
			d.head = head
			for n := range calls {
				once(n+1, fault{})
				once(n+1, fault{partly: true, noSpace: true})
				once(n+1, fault{sticky: true, partly: n%2 == 0})
			}
			t.Log(calls, "calls")
		})
	}
}

// failOnce does a deed with one fault and gives how many calls it takes without.
func failOnce(t *testing.T, disk *disk, eyes *inspector, d deed, file string, before found, mode fault) (calls int, head chain.Head) {
	t.Helper()
	ctx := t.Context()
	l, head, err := d.run(ctx, file, func() { disk.set(mode, false) })
	calls, hit, _ := disk.state()
	complain := func(format string, args ...any) {
		t.Helper()
		t.Errorf("call %d, %v (for good: %v, half: %v, no space: %v): "+format, append([]any{mode.at, hit, mode.sticky, mode.partly, mode.noSpace}, args...)...)
	}
	if mode.at == 0 && err != nil {
		t.Fatal(err)
	}
	if l != nil {
		defer l.Close()
		if mode.sticky {
			l.Close()
		}
	}
	disk.set(fault{}, false)

	after, problem := eyes.files(ctx, file) // as another process finds it
	switch {
	case problem != nil:
		complain("%v: %v", err, problem)
		return calls, head
	case err == nil && after.head != head:
		complain("reported as recorded is %v, another process finds %v", head, after)
	case err != nil && after != before && (after.format != ledger.Format || after.head != d.headAfter(before, after)):
		complain("neither the ledger before, %v, nor the one after: %v", before, after)
	}
	if err != nil {
		checkError(err, hit, mode, after != before, complain)
		if l != nil && !mode.sticky {
			if head, problem = retry(ctx, d, l); problem != nil {
				complain("the same process cannot do it again: %v", problem)
			}
		} else if head, problem = d.again(ctx, file); problem != nil {
			complain("another process cannot do it again: %v", problem)
		}
	}
	final, problem := eyes.files(ctx, file)
	if problem != nil {
		complain("after all: %v", problem)
	} else if final.head != head || final.format != ledger.Format {
		complain("reported as recorded is %v, the ledger has %v", head, final)
	}
	return calls, head
}

// retry does a deed again that may have been done already.
func retry(ctx context.Context, d deed, l *ledger.Ledger) (chain.Head, error) {
	if d.do == nil {
		return l.Head(ctx)
	}
	head, err := d.do(ctx, l)
	if errors.Is(err, approval.ErrRefused) && strings.Contains(err.Error(), "already") {
		return l.Head(ctx)
	}
	return head, err
}

// again does it in what stands for another process.
func (d deed) again(ctx context.Context, file string) (chain.Head, error) {
	l, err := ledger.Open(ctx, file, ledger.Options{Create: d.prepare == nil, Now: clock, Wait: time.Second})
	if err != nil {
		return chain.Head{}, err
	}
	defer l.Close()
	return retry(ctx, d, l)
}

// inspector looks at files of which the same come back again and again, each
// content once.
type inspector struct {
	dir   string
	noted []chain.Head // heads that somebody noted
	seen  map[[2][sha256.Size]byte]inspected
}

type inspected struct {
	found
	err error
}

func newInspector(t testing.TB, noted ...chain.Head) *inspector {
	return &inspector{quickDir(t), noted, map[[2][sha256.Size]byte]inspected{}}
}

// files looks at a ledger and the journal beside it, and leaves them as they are.
func (i *inspector) files(ctx context.Context, file string) (found, error) {
	db, err := os.ReadFile(file)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return found{}, err
	}
	journal, err := os.ReadFile(file + "-journal")
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return found{}, err
	}
	return i.content(ctx, db, journal)
}

// content looks at the content of a ledger and of the journal; nil for none.
func (i *inspector) content(ctx context.Context, db, journal []byte) (found, error) {
	key := [2][sha256.Size]byte{sha256.Sum256(db), sha256.Sum256(journal)}
	r, ok := i.seen[key]
	if !ok {
		file := filepath.Join(i.dir, "ledger.db")
		for name, content := range map[string][]byte{file: db, file + "-journal": journal} {
			os.Remove(name)
			if content == nil {
				continue
			}
			if err := os.WriteFile(name, content, 0o644); err != nil {
				return found{}, err
			}
		}
		if db != nil {
			r.found, r.err = look(ctx, file, i.noted...)
		}
		i.seen[key] = r
	}
	return r.found, r.err
}

// checkError looks at what a user is told.
func checkError(err error, hit call, mode fault, recorded bool, complain func(string, ...any)) {
	var e *ledger.Error
	if !errors.As(err, &e) {
		complain("no class: %v", err)
		return
	}
	// SQLite is told the same of every write that fails, without the system's own
	// number; what those become is shown by TestSystemErrors.
	space := e.Class == ledger.ErrFull
	switch {
	case hit.kind == writing && !space && e.Class != ledger.ErrDamaged, hit.kind != writing && mode.noSpace != space, !mode.noSpace && !space && e.Class != ledger.ErrDamaged:
		complain("class %q is not right: %v", e.Class, err)
	case e.Hint() == "":
		complain("no hint: %v", err)
	case recorded && !knownUntrueHint(hit, mode) && strings.Contains(e.Hint(), "nothing was recorded"):
		complain("it was recorded, and the hint says: %s", e.Hint())
	}
}

// knownUntrueHint is the one case in which the hint says that nothing was
// recorded and it was; see TestHintAfterCommit.
func knownUntrueHint(hit call, mode fault) bool {
	return hit.kind == deletion && mode.partly && mode.noSpace
}

// quickDir gives a folder in memory where there is one, since these tests sync
// some thousand times.
func quickDir(t testing.TB) string {
	t.Helper()
	if dir, err := os.MkdirTemp("/dev/shm", "speedtrail-test-"); err == nil {
		t.Cleanup(func() { os.RemoveAll(dir) })
		return dir
	}
	return t.TempDir()
}

// A message says what happened once.
func TestMessageOnce(t *testing.T) {
	disk := useDisk(t)
	disk.set(fault{at: 1}, false)
	_, err := ledger.Open(t.Context(), filepath.Join(quickDir(t), "ledger.db"), onDisk(ledger.Options{Create: true, Now: clock}))
	var e *ledger.Error
	if !errors.As(err, &e) || strings.Count(err.Error(), e.Class.Error()) != 1 {
		t.Error(err)
	}
}

// The journal is gone, which is what commits, and only then the disk says that it
// is full: the entry is there. The hint may not deny it.
func TestHintAfterCommit(t *testing.T) {
	disk := useDisk(t)
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	l := opened(t, file, onDisk(ledger.Options{}))
	var err error
	for at, hit := 1, (call{}); hit.kind != deletion; at++ {
		disk.set(fault{at: at, partly: true, noSpace: true}, false)
		if _, err = assess(t.Context(), l, when, "two", 1); err == nil {
			t.Fatal("no call failed")
		}
		_, hit, _ = disk.state()
	}
	var e *ledger.Error
	if !errors.As(err, &e) {
		t.Fatal(err)
	}
	if list, err := l.Assessments(t.Context()); err != nil || len(list) != 2 {
		t.Fatal(len(list), err)
	}
	if strings.Contains(e.Hint(), "nothing was recorded") {
		t.Error(e.Hint())
	}
}
