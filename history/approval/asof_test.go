package approval

import (
	"testing"
	"time"

	"speedtrail/history/signoff"
)

// What somebody signed before an instant and handed in after it hides nothing that was
// recorded by then, also where the clock of recording went back; what was signed after
// it ends the line of then.
func TestAsOfLateRecording(t *testing.T) {
	for name, c := range map[string]struct {
		signed time.Duration // after the instant
		want   bool
	}{"signed before": {-time.Minute, true}, "signed after": {time.Hour, false}} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			late, other := s.assess("a", "b", ordinary(), ordinary(), nil), s.assess("a", "c", ordinary(), ordinary(), nil)
			s.must(s.signOff(late, "ada", "checker", "approve"))
			s.must(s.signOff(other, "ada", "checker", "approve"))
			head, at := s.head, s.now.Add(30*time.Minute)
			s.now = at.Add(2 * time.Hour)
			s.must(s.signOff(late, "bea", "approver", "approve", func(st *signoff.Statement) { st.Time = at.Add(c.signed) }))
			s.now = at.Add(-time.Minute)
			s.must(s.signOff(other, "bea", "approver", "approve", func(st *signoff.Statement) { st.Head = head }))
			then := s.line.AsOf(at)
			if then.ApprovedContent(".", treeOf("b")) || !s.line.ApprovedContent(".", treeOf("b")) {
				t.Error("what was recorded late counts then, or does not count now")
			}
			if got := then.ApprovedContent(".", treeOf("c")); got != c.want {
				t.Errorf("what was recorded behind it is approved: %t, want %t", got, c.want)
			}
		})
	}
}

// A content is approved since the last sign-off of its own folder that made it so.
func TestSince(t *testing.T) {
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	is := func(l *Line) bool { return l.ApprovedContent(".", treeOf("b")) }
	if _, ok := s.line.Since(".", is); ok {
		t.Error("what is not true has a time")
	}
	s.must(s.signOff(n, "ada", "checker", "approve"))
	for range 2 { // taken back, and given again
		want := s.now
		s.must(s.signOff(n, "bea", "approver", "approve"))
		if at, ok := s.line.Since(".", is); !ok || !at.Equal(want) {
			t.Errorf("since %v, %t, want %v", at, ok, want)
		}
		s.must(s.signOff(n, "bea", "approver", "reject"))
	}
	if _, ok := s.line.Since(".", func(*Line) bool { return true }); ok {
		t.Error("what was always true has a time")
	}
}

// What somebody signs in another folder is no instant at which something about this
// one comes to be true.
func TestSinceOfOtherFolder(t *testing.T) {
	s := anchored(t, ordinary())
	s.must(s.anchor("a", ordinary(), func(_ int, st *signoff.Statement) { st.Folder = "data" }, "checker:ada", "approver:bea", "in-service:cem"))
	other := s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Folder = "data" })
	own := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(other, "ada", "checker", "approve"))
	want := s.now
	s.must(s.signOff(own, "ada", "checker", "approve"))
	signed := func(l *Line) bool { return len(l.signOffs) > 0 }
	if at, ok := s.line.Since(".", signed); !ok || !at.Equal(want) {
		t.Errorf("since %v, %t, want %v", at, ok, want)
	}
}
