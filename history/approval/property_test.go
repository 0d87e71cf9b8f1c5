package approval

import (
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/history/signoff"
)

// step is something that is recorded; it does nothing where it may not.
type step struct {
	what, pair, key, role, decision string
}

// words describes the states of the assessments of a folder by their revisions.
func (s *story) words(l *Line, folder string) map[string]string {
	out := map[string]string{}
	for pair, n := range s.names {
		if l.Assessment(n).Folder != folder {
			continue
		}
		state := l.State(n)
		var signed, rejected []string
		for _, r := range state.Signed {
			signed = append(signed, r.Signer+" "+r.Role+" "+r.Decision)
		}
		for _, r := range state.RejectedBy {
			rejected = append(rejected, r.Signer)
		}
		out[pair] = fmt.Sprint(state.Word, state.Missing, state.Blocks, signed, rejected, state.Superseded > 0)
	}
	return out
}

// do takes a step in a folder, as far as the assessment is there. Refusals are as
// good as anything: record compares what Check and Add say.
func (s *story) do(folder string, x step) {
	s.t.Helper()
	n, there := s.names[folder+" "+x.pair]
	switch {
	case x.what == "assess" && !there:
		base, target, _ := strings.Cut(x.pair, "-")
		s.assess(base, target, ordinary(), ordinary(), func(a *Assessment) { a.Folder = folder })
	case x.what == "sign" && there:
		_ = s.signOff(n, x.key, x.role, x.decision)
	case x.what == "in force":
		_ = s.inForce(x.pair[:1], day(int(x.pair[0]-'a')+int(x.key[0]-'a')+1), signoff.AllRoutes, CorrectsNothing, func(st *signoff.Statement) { st.Folder = folder })
	}
}

// The entries of another folder, their number and where they stand change no
// state; and whatever is recorded, Check before and Add afterwards agree.
func TestUnrelatedEntries(t *testing.T) {
	pairs := []string{"a-b", "b-c", "a-d", "c-e"}
	draw := rapid.Custom(func(t *rapid.T) step {
		return step{
			rapid.SampledFrom([]string{"assess", "sign", "sign", "sign", "sign", "in force"}).Draw(t, "what"),
			rapid.SampledFrom(pairs).Draw(t, "pair"),
			rapid.SampledFrom([]string{"ada", "bea", "cem", "dan", "fin"}).Draw(t, "key"),
			rapid.SampledFrom([]string{"checker", "approver"}).Draw(t, "role"),
			rapid.SampledFrom([]string{"approve", "approve", "approve", "reject"}).Draw(t, "decision"),
		}
	})
	both := func(t testing.TB) *story {
		s := anchored(t, ordinary())
		s.must(s.anchor("a", ordinary(), func(_ int, st *signoff.Statement) { st.Folder = "data" }, "checker:ada", "approver:bea", "in-service:cem"))
		return s
	}
	rapid.Check(t, func(r *rapid.T) {
		main := append([]step{{what: "assess", pair: "a-b"}, {what: "assess", pair: "b-c"}}, rapid.SliceOfN(draw, 0, 14).Draw(r, "main")...)
		unrelated := rapid.SliceOfN(draw, 0, 10).Draw(r, "unrelated")
		plain := both(t)
		for _, x := range main {
			plain.do(".", x)
		}
		mixed := both(t)
		left := slices.Clone(unrelated)
		for _, x := range main {
			for len(left) > 0 && rapid.Bool().Draw(r, "now") {
				mixed.do("data", left[0])
				left = left[1:]
			}
			mixed.do(".", x)
		}
		if want, got := plain.words(plain.line, "."), mixed.words(mixed.line, "."); !maps.Equal(want, got) {
			r.Fatalf("with other entries in between\n%v\nwithout\n%v", got, want)
		}
		if want, got := len(plain.line.Standing(".")), len(mixed.line.Standing(".")); want != got {
			r.Fatalf("%d records stand with other entries in between, %d without", got, want)
		}
	})
}

// What was recorded says the same when it is read again from the first entry on,
// and an entry that does not count changes no state.
func TestReadingAgain(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		s := anchored(t, ordinary())
		for _, pair := range []string{"a-b", "b-c"} {
			s.do(".", step{what: "assess", pair: pair})
		}
		for range rapid.IntRange(0, 10).Draw(r, "steps") {
			before := s.words(s.line, ".")
			n := s.names[rapid.SampledFrom([]string{". a-b", ". b-c"}).Draw(r, "pair")]
			err := s.signOff(n, rapid.SampledFrom([]string{"ada", "bea", "dan", "fin", "mal"}).Draw(r, "key"), rapid.SampledFrom([]string{"checker", "approver", "in-service", "boss"}).Draw(r, "role"),
				rapid.SampledFrom([]string{"approve", "reject"}).Draw(r, "decision"))
			if after := s.words(s.line, "."); err != nil && !maps.Equal(before, after) {
				r.Fatalf("an entry that does not count (%v) changes a state from\n%v\nto\n%v", err, before, after)
			}
		}
		again := New(ledgerID)
		for _, x := range s.all {
			var a *Assessment
			if x.assessment != nil {
				copied := *x.assessment
				a = &copied
			}
			_ = again.Add(x.entry, a)
		}
		if want, got := s.words(s.line, "."), s.words(again, "."); !maps.Equal(want, got) {
			r.Fatalf("read again\n%v\nas recorded\n%v", got, want)
		}
	})
}
