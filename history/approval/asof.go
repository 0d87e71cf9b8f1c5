package approval

import "time"

// AsOf gives the line as it stood at an instant: with the entries up to the first
// one that was recorded after it. Anchors are all there, as whoever begins a ledger
// has data in service already. It answers questions about approval and nothing
// else, and must not be added to.
func (l *Line) AsOf(at time.Time) *Line {
	n := 0
	for n < len(l.times) && !l.times[n].After(at) {
		n++
	}
	return l.upTo(int64(n))
}

// upTo gives the line as it stood after an entry.
func (l *Line) upTo(seq int64) *Line {
	if seq >= int64(len(l.heads)) {
		return l
	}
	if past := l.past[seq]; past != nil {
		return past
	}
	past := New(l.ledger)
	past.heads, past.times = l.heads[:seq:seq], l.times[:seq:seq]
	past.anchors, past.policies = l.anchors, l.policies
	for _, a := range l.assessments {
		if a.Entry.Seq <= seq {
			past.assessments = append(past.assessments, a)
			past.byNumber[a.Number] = a
		}
	}
	for _, r := range l.signOffs {
		if r.Entry.Seq <= seq {
			past.take(r)
		}
	}
	if l.past == nil {
		l.past = map[int64]*Line{}
	}
	l.past[seq] = past
	return past
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
