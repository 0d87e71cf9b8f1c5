package approval

import (
	"cmp"
	"slices"
	"strconv"
	"strings"
	"time"

	"speedtrail/schema"
)

// Corrections of an in-force record.
const (
	CorrectsNothing = "nothing"
	Replaces        = "replaces"
	Voids           = "voids"
)

// checkInForce checks a record that a revision went into service.
func (l *Line) checkInForce(r *Record) error {
	if err := l.checkForm(r); err != nil {
		return err
	}
	policy, err := l.checkNewest(r)
	if err != nil {
		return err
	}
	if r.Role != InServiceRole {
		return refuse("the role is %q, %q is needed", r.Role, InServiceRole)
	}
	if err := checkRole(policy, r.Role, r.Signer); err != nil {
		return err
	}
	if err := l.checkCorrection(r); err != nil {
		return err
	}
	return l.checkNewestSignature(r, policy)
}

// checkNewest gives the newest approved policy of the folder of a statement,
// which has to name it.
func (l *Line) checkNewest(r *Record) (*schema.Policy, error) {
	newest := l.Newest(r.Folder)
	if newest.Hash == "" {
		return nil, refuse("no policy is anchored for the folder %s; speedtrail anchor puts one in force", r.Folder)
	}
	policy, err := usable(newest, "the newest approved revision")
	if err != nil {
		return nil, err
	}
	if newest.Hash != r.Policy {
		return nil, refuse("the statement names the policy %s, in force is %s", r.Policy, newest.Hash)
	}
	return policy, nil
}

// ReadCorrection reads what an in-force statement corrects: the word and the entry.
func ReadCorrection(corrects string) (word string, entry int64, ok bool) {
	if corrects == CorrectsNothing {
		return CorrectsNothing, 0, true
	}
	word, number, _ := strings.Cut(corrects, " ")
	n, err := strconv.ParseInt(number, 10, 64)
	return word, n, err == nil && n > 0 && strconv.FormatInt(n, 10) == number && (word == Replaces || word == Voids)
}

// checkCorrection checks what a record corrects, and that it does not conflict
// with another: for one route and instant there is one answer.
func (l *Line) checkCorrection(r *Record) error {
	word, entry, ok := ReadCorrection(r.Corrects)
	if !ok {
		return refuse("it corrects %q; nothing, replaces ENTRY and voids ENTRY are known", r.Corrects)
	}
	standing := l.Standing(r.Folder)
	if word != CorrectsNothing {
		i := slices.IndexFunc(standing, func(s Record) bool { return s.Entry.Seq == entry })
		if i < 0 {
			return refuse("entry %d is no in-force record that stands for this folder", entry)
		}
		if word == Voids {
			return nil
		}
		standing = slices.Delete(standing, i, i+1)
	}
	for _, s := range standing {
		if s.Since.Equal(r.Since) && overlap(s.Routes, r.Routes) {
			return refuse("entry %d says already what is in force from %s; replace or void it", s.Entry.Seq, r.Since.UTC().Format(time.RFC3339))
		}
	}
	return nil
}

// overlap tells whether two lists of routes share one; an empty list is all.
func overlap(a, b []string) bool {
	if len(a) == 0 || len(b) == 0 {
		return true
	}
	return slices.ContainsFunc(a, func(id string) bool { return slices.Contains(b, id) })
}

// Standing lists the in-force records of a folder that nothing replaces or voids,
// by instant.
func (l *Line) Standing(folder string) []Record {
	return l.StandingBefore(folder, int64(len(l.heads))+1)
}

// StandingBefore lists those that stood before an entry was recorded.
func (l *Line) StandingBefore(folder string, seq int64) []Record {
	gone := map[int64]bool{}
	var list []Record
	for i := range l.inForce {
		r := &l.inForce[i]
		if r.Folder != folder || r.Entry.Seq >= seq {
			continue
		}
		word, entry, _ := ReadCorrection(r.Corrects)
		if word != CorrectsNothing {
			gone[entry] = true
		}
		if word == Voids {
			gone[r.Entry.Seq] = true
		}
	}
	for _, r := range l.inForce {
		if r.Folder == folder && r.Entry.Seq < seq && !gone[r.Entry.Seq] {
			list = append(list, r)
		}
	}
	slices.SortStableFunc(list, func(a, b Record) int { return a.Since.Compare(b.Since) })
	return list
}

// Correction is an in-force record that another one replaces or voids.
type Correction struct {
	Record, By Record
	How        string // Replaces or Voids
}

// Corrections lists the in-force records of a folder that do not stand any more, in
// the order of the ledger: what was said once is not taken out of sight.
func (l *Line) Corrections(folder string) []Correction {
	var list []Correction
	for _, by := range l.inForce {
		word, entry, _ := ReadCorrection(by.Corrects)
		if by.Folder != folder || word == CorrectsNothing {
			continue
		}
		for _, r := range l.inForce {
			if r.Folder == folder && r.Entry.Seq == entry {
				list = append(list, Correction{r, by, word})
			}
		}
	}
	slices.SortStableFunc(list, func(a, b Correction) int { return cmp.Compare(a.Record.Entry.Seq, b.Record.Entry.Seq) })
	return list
}

// InForceAt gives the record that says what was in force on a route at an
// instant, and the one before it; nil where there is none. An empty route asks
// for records of the whole network.
func (l *Line) InForceAt(folder, route string, at time.Time) (now, before *Record) {
	standing := l.Standing(folder)
	for i := range standing {
		r := &standing[i]
		if r.Since.After(at) || len(r.Routes) > 0 && !slices.Contains(r.Routes, route) {
			continue
		}
		now, before = r, now
	}
	return now, before
}

// Led tells whether approved assessments lead from one content of a folder to
// another, each beginning where the one before ended.
func (l *Line) Led(folder, from, to string) bool {
	if from == to {
		return l.ApprovedContent(folder, to)
	}
	contents := l.approvedContents(folder)
	_, begins := contents[from]
	reached := map[string]bool{from: begins}
	for grown := true; grown; {
		grown = false
		for _, a := range l.assessments {
			if a.Folder == folder && reached[a.BaseTree] && !reached[a.TargetTree] && l.approved(a, contents) {
				reached[a.TargetTree], grown = true, true
			}
		}
	}
	return reached[to]
}
