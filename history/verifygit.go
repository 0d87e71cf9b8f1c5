package history

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	"speedtrail/history/approval"
	"speedtrail/schema/parallel"
)

// git computes the assessments anew and looks at what statements say about
// commits, several at a time.
func (v *verifier) git() error {
	if v.o.Checker == nil {
		v.r.Unproved = append(v.r.Unproved, "that the assessments are what Git holds: they were not computed anew")
		return nil
	}
	var done, other, failed int
	err := parallel.Try(v.ctx, len(v.docs), func(ctx context.Context, i int) error {
		d := v.docs[i]
		digest, err := v.o.Checker.Recompute(ctx, d.doc)
		if ctx.Err() != nil {
			return ctx.Err()
		}
		fate := v.recomputed(d, digest, err)
		v.lock.Lock()
		defer v.lock.Unlock()
		switch fate {
		case byOtherRules:
			other++
		case notProved:
			failed++
		}
		done++
		if v.o.Progress != nil {
			v.o.Progress(done, len(v.docs))
		}
		return nil
	})
	if err != nil {
		return err
	}
	v.r.Proved = append(v.r.Proved, fmt.Sprintf("%d of %d assessments were computed anew from Git", len(v.docs)-other-failed, len(v.docs)))
	v.leftOut()
	if err := v.statements(); err != nil {
		return err
	}
	v.leftElsewhere()
	return nil
}

// vouched tells whether the root of a folder is among those that were noted elsewhere,
// where any are given. Whoever may add to the ledger can anchor a folder of his own, at
// a commit that nobody else has, and sign there: that would be wrong for everybody and
// for ever, and says nothing about the folders that somebody asks for.
func (v *verifier) vouched(folder string) bool {
	a := v.r.Line.Anchor(folder)
	return len(v.o.Anchors) == 0 || a == nil || slices.Contains(v.o.Anchors, a.Entry.Hash)
}

// lacksElsewhere notes a commit that such a folder names and this repository lacks.
func (v *verifier) lacksElsewhere(folder string, entry int64, commit string) {
	v.lock.Lock()
	defer v.lock.Unlock()
	if v.elsewhere == nil {
		v.elsewhere = map[string]map[int64]string{}
	}
	if v.elsewhere[folder] == nil {
		v.elsewhere[folder] = map[int64]string{}
	}
	v.elsewhere[folder][entry] = commit
}

// leftElsewhere says what was left open of such folders.
func (v *verifier) leftElsewhere() {
	for _, folder := range slices.Sorted(maps.Keys(v.elsewhere)) {
		entries := v.elsewhere[folder]
		var names []string
		for _, entry := range slices.Sorted(maps.Keys(entries)) {
			if len(names) == mostLacking {
				names = append(names, fmt.Sprintf("and %d more", len(entries)-mostLacking))
				break
			}
			names = append(names, fmt.Sprintf("entry %d, commit %s", entry, entries[entry]))
		}
		v.r.Unproved = append(v.r.Unproved, fmt.Sprintf("what is recorded of the folder %s, whose policy root is none of those that are given: this repository lacks commits that it names (%s)", folder, strings.Join(names, "; ")))
	}
}

// fate is what came of computing an assessment anew.
type fate int

const (
	proved fate = iota
	notProved
	byOtherRules
)

// recomputed judges what computing an assessment anew gave.
func (v *verifier) recomputed(d recorded, digest string, err error) fate {
	var lacks *LackingError
	switch absent := errors.As(err, &lacks); {
	case errors.Is(err, ErrOtherRules):
		v.problem(d.entry, "recompute", "not proved: the assessment was made by version %d of the rules; assess again", d.doc.Computed.RulesVersion)
		return byOtherRules
	case absent && v.restsOn(d) == "":
		v.lacks(d, lacks)
	case absent && !v.vouched(d.doc.Computed.Folder):
		v.lacksElsewhere(d.doc.Computed.Folder, d.entry, lacks.Commit)
	case absent:
		v.problem(d.entry, "git", "the assessment cannot be computed anew, and %s: %s", v.restsOn(d), oneLine(err))
	case err != nil:
		v.problem(d.entry, "git", "the assessment cannot be computed anew: %s", oneLine(err))
	case digest != d.digest:
		v.problem(d.entry, "recompute", "computed anew the assessment has the digest %s, recorded is %s", digest, d.digest)
	default:
		return proved
	}
	return notProved
}

// lacks notes an assessment that nothing rests on and that cannot be computed here.
func (v *verifier) lacks(d recorded, err *LackingError) {
	v.lock.Lock()
	defer v.lock.Unlock()
	v.lacking = append(v.lacking, lacking{d.number, err})
}

// restsOn says what rests on an assessment; empty where nothing does. Nobody who adds
// an assessment that no clone can check gets more than a line in the register, but for a
// signature under it: that has to be proved.
func (v *verifier) restsOn(d recorded) string {
	for _, r := range v.r.Line.SignOffs() {
		if r.Assessment == d.number {
			return fmt.Sprintf("it is signed, in entry %d", r.Entry.Seq)
		}
	}
	for _, r := range v.r.Line.InForce() {
		if r.Revision == d.doc.Computed.Target.Commit {
			return fmt.Sprintf("its target went into service, entry %d", r.Entry.Seq)
		}
	}
	return ""
}

// mostLacking is how many assessments are named of those that lack a commit.
const mostLacking = 5

// leftOut says which assessments were not computed anew.
func (v *verifier) leftOut() {
	if len(v.lacking) == 0 {
		return
	}
	slices.SortFunc(v.lacking, func(a, b lacking) int { return cmp.Compare(a.number, b.number) })
	var names, todo []string
	for i, x := range v.lacking {
		if i == mostLacking {
			names = append(names, fmt.Sprintf("and %d more", len(v.lacking)-i))
			break
		}
		names = append(names, fmt.Sprintf("assessment %d, commit %s", x.number, x.err.Commit))
		if x.err.Todo != "" && !slices.Contains(todo, x.err.Todo) {
			todo = append(todo, x.err.Todo)
		}
	}
	text := fmt.Sprintf("%d assessments that nobody has signed: they could not be computed anew, because this repository lacks a commit (%s)", len(v.lacking), strings.Join(names, "; "))
	if len(v.lacking) == 1 {
		text = fmt.Sprintf("1 assessment that nobody has signed: it could not be computed anew, because this repository lacks a commit (%s)", names[0])
	}
	v.r.Unproved = append(v.r.Unproved, strings.Join(append([]string{text}, todo...), "; "))
}

// oneLine writes an error, and what it says to do, in one line.
func oneLine(err error) string {
	text := strings.ReplaceAll(err.Error(), "\n", "; ")
	var h interface{ Hint() string }
	if errors.As(err, &h) && h.Hint() != "" {
		text += "; hint: " + strings.ReplaceAll(h.Hint(), "\n", "; ")
	}
	return text
}

// statements looks at the commits that anchors and in-force records name.
func (v *verifier) statements() error {
	check := func(entry int64, revision, folder, content string, policy *approval.Policy) {
		found, err := v.o.Checker.Content(v.ctx, revision, folder)
		var lacks *LackingError
		switch {
		case errors.As(err, &lacks) && !v.vouched(folder):
			v.lacksElsewhere(folder, entry, lacks.Commit)
		case err != nil:
			v.problem(entry, "git", "the commit %s that it names cannot be read: %s", revision, oneLine(err))
		case found.Tree != content:
			v.problem(entry, "git", "the folder %s of commit %s has the content %s, the statement says %s", folder, revision, found.Tree, content)
		case policy != nil && (policy.SignOff != found.SignOff || policy.AllowedSigners != found.AllowedSigners):
			v.problem(entry, "git", "the policy of commit %s is not the one that the anchor holds", revision)
		}
	}
	for folder, a := range v.r.Line.Anchors() {
		check(a.Entry.Seq, a.Revision, folder, a.Content, &a.Policy)
	}
	for _, r := range v.r.Line.InForce() {
		check(r.Entry.Seq, r.Revision, r.Folder, r.Content, nil)
	}
	return v.ctx.Err()
}
