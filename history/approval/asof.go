package approval

import "time"

// AsOf gives the line as it stood at an instant: with the sign-offs that were recorded
// by then, up to the first statement that somebody made later. The time of an entry
// is a claim of whoever recorded it, and an assessment has no signer: one that is said
// to be of next year takes nothing away from what was signed after it. Anchors are all
// there, as whoever begins a ledger has data in service already. It answers questions
// about approval and nothing else, and must not be added to.
func (l *Line) AsOf(at time.Time) *Line {
	end := int64(len(l.heads))
	until := func(records []Record) {
		for i := range records {
			// A signer's clock may be ahead.
			if r := &records[i]; r.Time.After(at) && r.Recorded.After(at) {
				end = min(end, r.Entry.Seq-1)
			}
		}
	}
	until(l.signOffs)
	until(l.inForce)
	for _, r := range l.revoked {
		until([]Record{r})
	}
	for _, a := range l.anchors {
		until(a.Records)
	}
	var recorded []Record
	for _, r := range l.signOffs {
		if r.Entry.Seq <= end && !r.Recorded.After(at) {
			recorded = append(recorded, r)
		}
	}
	// Of two instants with the same end, the later one has all sign-offs of the other.
	key := instant{end, len(recorded)}
	if past := l.past[key]; past != nil {
		return past
	}
	past := New(l.ledger)
	past.heads, past.times = l.heads[:end:end], l.times[:end:end]
	past.anchors, past.policies = l.anchors, l.policies
	for _, a := range l.assessments {
		if a.Entry.Seq <= end {
			past.assessments = append(past.assessments, a)
			past.byNumber[a.Number] = a
		}
	}
	for _, r := range recorded {
		past.take(r)
	}
	if l.past == nil {
		l.past = map[instant]*Line{}
	}
	l.past[key] = past
	return past
}

// instant tells the lines of the past apart: by their last entry, and by how many
// sign-offs there are up to it.
type instant struct {
	end      int64
	signOffs int
}

// take takes up a sign-off that counts.
func (l *Line) take(r Record) {
	decided := l.byNumber[r.Assessment].content()
	l.ofAssessment[r.Assessment] = append(l.ofAssessment[r.Assessment], len(l.signOffs))
	l.ofContent[decided] = append(l.ofContent[decided], len(l.signOffs))
	l.signOffs = append(l.signOffs, r)
	l.forget(decided)
}

// Since gives the time at which something about a folder came to be true that is
// true now: it was not true before, and has been ever since. It asks about sign-offs
// only; false where it was always true.
func (l *Line) Since(folder string, is func(*Line) bool) (at time.Time, ok bool) {
	past := New(l.ledger)
	past.anchors, past.policies = l.anchors, l.policies
	next, holds := 0, is(past)
	for i := range l.signOffs {
		r := &l.signOffs[i]
		for ; next < len(l.assessments) && l.assessments[next].Entry.Seq < r.Entry.Seq; next++ {
			a := l.assessments[next]
			past.assessments = append(past.assessments, a)
			past.byNumber[a.Number] = a
		}
		past.take(*r)
		if r.Folder != folder {
			continue
		}
		before := holds
		if holds = is(past); holds && !before {
			at, ok = l.times[r.Entry.Seq-1], true
		}
	}
	return at, ok
}
