package history

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"
	"sync"

	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// Problem is something that verify has found wrong.
type Problem struct {
	Entry int64  // 0: the ledger as a whole
	Kind  string // chain, body, rows, file, head, anchor, statement, recompute, git
	Text  string
}

// String gives the problem with its entry.
func (p Problem) String() string {
	if p.Entry == 0 {
		return p.Kind + ": " + p.Text
	}
	return fmt.Sprintf("%s: entry %d: %s", p.Kind, p.Entry, p.Text)
}

// Result is what a verification has proved, what not, and why.
type Result struct {
	Problems []Problem // by entry
	Proved   []string
	Unproved []string // with the reason
	Head     chain.Head
	Line     *approval.Line
}

// Good tells whether nothing is wrong and nothing was left unproved that would
// have to be proved.
func (r *Result) Good() bool { return len(r.Problems) == 0 }

// ErrOtherRules is given by a Checker for an assessment that was made by another
// version of the rules.
var ErrOtherRules = errors.New("made by another version of the rules")

// LackingError is given by a Checker for an assessment of which the repository does
// not have a commit.
type LackingError struct {
	Side, Commit string // base or target
	Todo         string // what brings it; may be empty
}

// Error names the commit.
func (e *LackingError) Error() string {
	return fmt.Sprintf("this repository lacks its %s, commit %s", e.Side, e.Commit)
}

// Hint says what to do.
func (e *LackingError) Hint() string { return e.Todo }

// Checker re-derives from Git what the ledger says. It may be called from several
// goroutines at once.
type Checker interface {
	// Recompute gives the digest of the assessment of which the document says what
	// was asked (assessment.Document.Asked), computed anew.
	Recompute(ctx context.Context, doc *assessment.Document) (digest string, err error)
	// Content gives what a folder holds at a commit. The error is a *LackingError
	// where the repository does not have the commit.
	Content(ctx context.Context, commit, folder string) (Content, error)
}

// Content is what Git has in the folder of a data set at a commit, as far as anchors
// and records of what is in force speak of it.
type Content struct {
	Tree                    string // hash of the folder's tree
	SignOff, AllowedSigners string // contents of the policy files, empty where there are none
}

// VerifyOptions are what a verification is asked for.
type VerifyOptions struct {
	Against  []chain.Head // heads that somebody noted elsewhere
	Anchors  []string     // hashes of anchors that somebody got elsewhere
	Checker  Checker      // nil: nothing is held against Git
	Progress func(done, total int)
}

// Verify re-derives everything that a ledger says. Problems do not stop it, but for
// a place where the file cannot be read any further. The error is one of reaching
// the file, or of the context.
func Verify(ctx context.Context, l *ledger.Ledger, o VerifyOptions) (*Result, error) {
	v := &verifier{ctx: ctx, l: l, o: o, r: &Result{}}
	for _, step := range []func() error{v.file, v.entries, v.heads, v.git} {
		err := step()
		if errors.Is(err, ledger.ErrDamaged) {
			v.problem(0, "file", "%v", err)
			v.stopped = true
			break
		}
		if err != nil {
			return nil, err
		}
	}
	v.summary()
	slices.SortStableFunc(v.r.Problems, func(a, b Problem) int { return cmp.Compare(a.Entry, b.Entry) })
	return v.r, nil
}

type verifier struct {
	ctx    context.Context
	l      *ledger.Ledger
	o      VerifyOptions
	r      *Result
	counts map[string]int64
	// assessments counts them: their numbers are 1, 2, ... in the order of entries.
	assessments int64
	docs        []recorded
	stopped     bool     // the file could not be read to its end
	backwards   []string // where the times of entries go back
	lacking     []lacking
	elsewhere   map[string]map[int64]string // see lacksElsewhere
	lock        sync.Mutex
}

// recorded is an assessment to be computed anew.
type recorded struct {
	entry, number int64
	digest        string
	doc           *assessment.Document
}

// lacking is an assessment that nothing rests on and that this repository lacks a
// commit for.
type lacking struct {
	number int64
	err    *LackingError
}

func (v *verifier) problem(entry int64, kind, format string, args ...any) {
	v.lock.Lock()
	defer v.lock.Unlock()
	v.r.Problems = append(v.r.Problems, Problem{entry, kind, fmt.Sprintf(format, args...)})
}

func (v *verifier) file() error {
	err := v.l.CheckFile(v.ctx)
	if errors.Is(err, ledger.ErrDamaged) {
		v.problem(0, "file", "%v", err)
		return nil
	}
	return err
}

// entries checks the chain, the bodies, the rows and the statements.
func (v *verifier) entries() error {
	v.counts = map[string]int64{}
	v.r.Line = approval.New(v.l.ID())
	var head chain.Head
	last := "" // the time of the entry before
	for e, err := range openAhead(v.ctx, v.l, head, true) {
		if err != nil {
			return err
		}
		if e.broken != nil {
			v.problem(e.Seq, "chain", "it %v", errors.Unwrap(e.broken))
			last = ""
		} else {
			// The form of a time is one whose texts stand in the order of the times.
			if e.Time < last {
				v.backwards = append(v.backwards, fmt.Sprintf("entry %d was recorded before entry %d", e.Seq, head.Seq))
			}
			last = e.Time
		}
		head = e.Head()
		if e.canonical != nil {
			v.problem(e.Seq, "body", "%v", e.canonical)
		}
		if (e.Seq == 1) != (e.Kind == chain.Ledger) {
			v.problem(e.Seq, "chain", "an entry of kind %s stands here", e.Kind)
		}
		a, err := v.rows(e)
		if err != nil {
			return err
		}
		if err := v.r.Line.Add(e.Entry, a); err != nil {
			v.problem(e.Seq, "statement", "%s: %v", e.Kind, err)
		}
	}
	v.r.Head = head
	for _, table := range ledger.Tables {
		n, orphans, err := v.l.RowCount(v.ctx, table, head.Seq)
		if err != nil {
			return err
		}
		if n+orphans != v.counts[table] {
			v.problem(0, "rows", "table %s has %d rows, the entries ask for %d", table, n+orphans, v.counts[table])
		}
	}
	return nil
}

// rows compares the rows that repeat an entry with its body.
func (v *verifier) rows(e *opened) (*approval.Assessment, error) {
	switch e.Kind {
	case chain.Assessment:
		return v.assessmentRows(e)
	case chain.Anchor, chain.SignOff, chain.InForce, chain.Revocation:
		want, err := signedRows(e.Entry)
		if err != nil {
			v.problem(e.Seq, "body", "it cannot be read: %v", err)
			return nil, nil
		}
		for _, table := range []ledger.Table{ledger.AnchorTable, ledger.SignOffTable, ledger.InForceTable, ledger.RevocationTable} {
			have, err := v.l.Rows(v.ctx, table, e.Seq)
			if err != nil {
				return nil, err
			}
			var ask []ledger.Row
			for _, r := range want {
				if r.Table == table {
					ask = append(ask, r)
				}
			}
			v.counts[string(table)] += int64(len(have))
			if problem := difference(table, have, ask); problem != "" {
				v.problem(e.Seq, "rows", "%s", problem)
			}
		}
	}
	return nil, nil
}

// difference says how the rows of a table differ from those that an entry asks
// for; empty where they do not.
func difference(table ledger.Table, have, want []ledger.Row) string {
	for i := range min(len(have), len(want)) {
		for k := range want[i].Values {
			if have[i].Values[k] != want[i].Values[k] {
				return fmt.Sprintf("row %d of table %s has %s %v, the entry says %v", i+1, table, ledger.ColumnName(table, k), have[i].Values[k], want[i].Values[k])
			}
		}
	}
	switch {
	case len(have) < len(want):
		return fmt.Sprintf("row %d of table %s is missing", len(have)+1, table)
	case len(have) > len(want):
		return fmt.Sprintf("row %d of table %s is not in the entry", len(want)+1, table)
	}
	return ""
}

func (v *verifier) assessmentRows(e *opened) (*approval.Assessment, error) {
	v.assessments++
	number, err := v.l.NumberOf(v.ctx, e.Seq)
	if errors.Is(err, ledger.ErrDamaged) {
		v.problem(e.Seq, "rows", "%v", err)
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	if number != v.assessments {
		v.problem(e.Seq, "rows", "the assessment has the number %d, by its place it is %d", number, v.assessments)
	}
	if e.unreadable != nil {
		v.problem(e.Seq, "body", "it cannot be read: %v", e.unreadable)
		return nil, nil
	}
	counts, err := v.l.CompareRows(v.ctx, number, e.Seq, assessment.LedgerRecord(e.doc, e.Body, e.digest))
	for table, n := range counts {
		v.counts[table] += n
	}
	if errors.Is(err, ledger.ErrDamaged) {
		v.problem(e.Seq, "rows", "%v", err)
	} else if err != nil {
		return nil, err
	}
	v.docs = append(v.docs, recorded{e.Seq, number, e.digest, e.doc.Asked()})
	return assessmentOf(v.r.Line, number, e.digest, e.doc), nil
}

// heads holds the ledger against what was noted elsewhere.
func (v *verifier) heads() error {
	for _, h := range v.o.Against {
		hash, err := v.l.EntryHash(v.ctx, h.Seq)
		switch {
		case err != nil:
			return err
		case hash == "":
			v.problem(0, "head", "entry %d is not there, and the noted head says that it was: the end was removed, or this is an older copy", h.Seq)
		case hash != h.Hash:
			v.problem(0, "head", "entry %d is another one than the noted head says: the ledger was made anew, or forked", h.Seq)
		default:
			v.r.Proved = append(v.r.Proved, fmt.Sprintf("the ledger still contains the noted head %s", h))
		}
	}
	if len(v.o.Against) == 0 {
		v.r.Unproved = append(v.r.Unproved, "that no entry was removed from the end: no head that was noted elsewhere is given (--against SEQ:HASH)")
	}
	anchors := v.r.Line.Anchors()
	for _, hash := range v.o.Anchors {
		found := false
		for folder, a := range anchors {
			if a.Entry.Hash == hash {
				found = true
				v.r.Proved = append(v.r.Proved, fmt.Sprintf("the policy root of the folder %s is the one that was noted", folder))
			}
		}
		if !found {
			v.problem(0, "anchor", "no anchor of this ledger has the noted hash %s", hash)
		}
	}
	if len(v.o.Anchors) == 0 {
		v.r.Unproved = append(v.r.Unproved, "policy root not proved: no hash of an anchor that was noted elsewhere is given (--anchor HASH)")
		return nil
	}
	// Whoever may add to the ledger can anchor a folder of his own.
	for _, folder := range slices.Sorted(maps.Keys(anchors)) {
		if a := anchors[folder]; !slices.Contains(v.o.Anchors, a.Entry.Hash) {
			v.r.Unproved = append(v.r.Unproved, fmt.Sprintf("policy root of the folder %s not proved: the hash of its anchor, entry %d, is none of those that are given (--anchor HASH)", folder, a.Entry.Seq))
		}
	}
	return nil
}

// mostBackwards is how many places are named at which the times of entries go back.
const mostBackwards = 5

// summary says what was proved of the ledger itself, also where something else is
// wrong.
func (v *verifier) summary() {
	wrong := func(kinds ...string) bool {
		return slices.ContainsFunc(v.r.Problems, func(p Problem) bool { return slices.Contains(kinds, p.Kind) })
	}
	if n := len(v.backwards); n > 0 {
		// Clocks are put right, and machines differ: that is no proof of anything wrong.
		if n > mostBackwards {
			v.backwards = append(v.backwards[:mostBackwards], fmt.Sprintf("and so on, %d times", n))
		}
		v.r.Unproved = append(v.r.Unproved, "which clock was right: by their times "+strings.Join(v.backwards, ", "))
	}
	if v.stopped {
		v.r.Unproved = append(v.r.Unproved, "everything that was to be read after the place where the file is damaged")
		return
	}
	var proved []string
	if !wrong("file", "chain", "body", "rows") {
		proved = append(proved, fmt.Sprintf("%d entries form one chain, and every table repeats them exactly", v.r.Head.Seq))
	}
	if !wrong("statement", "body") {
		signed := len(v.r.Line.SignOffs()) + len(v.r.Line.InForce()) + len(v.r.Line.Revocations())
		for _, a := range v.r.Line.Anchors() {
			signed += len(a.Records)
		}
		text := fmt.Sprintf("%d signed statements obey the policies of their time", signed)
		if n := len(v.r.Line.Revocations()); n > 0 {
			text += fmt.Sprintf("; keys taken out of use: %d, see register", n)
		}
		proved = append(proved, text)
	}
	v.r.Proved = append(proved, v.r.Proved...)
	v.r.Unproved = append(v.r.Unproved, "who wrote a commit, and when an entry was recorded: names and times are claims")
}
