package ledger_test

import (
	"context"
	"crypto/ed25519"
	"crypto/sha256"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

var when = time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)

func clock() time.Time { return when }

// people is how many of them may sign, each in the one role.
const people = 8

func principal(n int) string { return fmt.Sprintf("signer%d@tarn.example", n) }

// keyOf gives the key of a person, the same in every process.
func keyOf(n int) ssh.Signer {
	seed := sha256.Sum256([]byte(principal(n)))
	s, err := ssh.NewSignerFromKey(ed25519.NewKeyFromSeed(seed[:]))
	if err != nil {
		panic(err)
	}
	return s
}

// policyFiles are signoff.toml and allowed_signers of every revision.
var policyFiles = func() assessment.Policy {
	var roles, keys strings.Builder
	roles.WriteString("format = 1\n\n[[person]]\nprincipal = \"writer@tarn.example\"\nemails = [\"writer@tarn.example\"]\n")
	for n := range people {
		fmt.Fprintf(&roles, "\n[[person]]\nprincipal = %q\nemails = [%q]\n", principal(n), principal(n))
		fmt.Fprintf(&keys, "%s %s", principal(n), ssh.MarshalAuthorizedKey(keyOf(n).PublicKey()))
	}
	roles.WriteString("\n[[role]]\nname = \"approver\"\nneeded = 1\nindependent_of = [\"preparer\"]\n")
	return assessment.Policy{SignOff: roles.String(), AllowedSigners: keys.String()}
}()

var policyHash = signoff.PolicyHash([]byte(policyFiles.SignOff), []byte(policyFiles.AllowedSigners))

// named gives a hash in hex as Git has them.
func named(what string) string { return fmt.Sprintf("%x", sha256.Sum256([]byte(what)))[:40] }

// recordOf gives an assessment from the anchored revision to one of a name, with
// some speed changes. Each is made once.
func recordOf(name string, changes int) ledger.Record {
	key := fmt.Sprint(name, " ", changes)
	r, ok := records.Load(key)
	if !ok {
		r, _ = records.LoadOrStore(key, makeRecord(name, changes))
	}
	return r.(ledger.Record)
}

var records sync.Map

func makeRecord(name string, changes int) ledger.Record {
	route := assessment.Route{
		ID: "R1", Fate: "kept", Causes: [][]assessment.Cause{{}}, Pieces: [][]assessment.Piece{{}},
		Sources: [][]assessment.Source{{{File: "routes/r1/speeds.csv", Kind: "basic", Line: 2, Value: 90}}, {{File: "routes/r1/speeds.csv", Kind: "basic", Line: 2, Value: 110}}},
	}
	for i := range changes {
		route.Changes = append(route.Changes, assessment.Change{
			Direction: "nominal", From: fmt.Sprintf("%d.000", i), To: fmt.Sprintf("%d.000", i+1), Start: int64(i) * 1_000_000, Length: 1_000_000,
			Before: 90, After: 110, AfterSource: 1, RunOut: i%2 == 1, Trains: []int{0},
		})
	}
	doc := &assessment.Document{Format: assessment.Format, Computed: assessment.Computed{
		At: "2026-03-01T12:00:00Z", Dataset: "Test", Folder: ".", RulesVersion: 1,
		Base:      assessment.Revision{Commit: named("base"), Tree: named("base tree")},
		Target:    assessment.Revision{Commit: named(name), Tree: named(name + " tree")},
		Policy:    assessment.Policies{Base: policyFiles, Target: policyFiles},
		Preparers: []assessment.Person{{Email: "writer@tarn.example", Name: "Writer"}},
		Requests:  []assessment.Request{{ID: "CR-1", Title: "First"}},
		Findings:  []assessment.Finding{{ID: "outside", Route: "R1", Direction: "nominal", From: "1.000", To: "2.000", Text: "text"}},
		Trains:    []assessment.Train{{ID: "T1", Fate: "kept"}},
		Routes:    []assessment.Route{route},
	}}
	body, digest, err := doc.Encode()
	if err != nil {
		panic(err)
	}
	return assessment.LedgerRecord(doc, body, digest)
}

// assess records an assessment.
func assess(ctx context.Context, l *ledger.Ledger, at time.Time, name string, changes int) (chain.Head, error) {
	in, err := l.RecordAssessment(ctx, at, recordOf(name, changes))
	return in.Head, err
}

// sign makes the statement of a person about an assessment, by the newest head.
func sign(ctx context.Context, l *ledger.Ledger, at time.Time, number int64, person int) (statement, signature []byte, err error) {
	line, _, err := history.ReadLine(ctx, l)
	if err != nil {
		return nil, nil, err
	}
	a := line.Assessment(number)
	if a == nil {
		return nil, nil, fmt.Errorf("no assessment %d", number)
	}
	s := signoff.Statement{
		Kind: signoff.SignOff, Ledger: l.ID(), Assessment: number, Digest: a.Digest, Base: a.Base, Target: a.Target, Folder: a.Folder, Rules: a.Rules,
		Policy: a.Policy.Hash, Findings: a.Findings, Role: "approver", Decision: signoff.Approve, Reason: "checked", Signer: principal(person),
		Time: at, Head: line.Head(),
	}
	statement, err = s.Text()
	if err != nil {
		return nil, nil, err
	}
	signature, err = signoff.Sign(statement, keyOf(person))
	return statement, signature, err
}

// signOff records a sign-off.
func signOff(ctx context.Context, l *ledger.Ledger, at time.Time, number int64, person int) (chain.Head, error) {
	statement, signature, err := sign(ctx, l, at, number, person)
	if err != nil {
		return chain.Head{}, err
	}
	return history.RecordSigned(ctx, l, nil, history.Statement{Kind: chain.SignOff, Text: statement, Signature: signature}, at)
}

// anchor records the anchor.
func anchor(ctx context.Context, l *ledger.Ledger, at time.Time) (chain.Head, error) {
	head, err := l.Head(ctx)
	if err != nil {
		return chain.Head{}, err
	}
	statement, err := signoff.Statement{
		Kind: signoff.Anchor, Ledger: l.ID(), Revision: named("base"), Folder: ".", Content: named("base tree"), Policy: policyHash,
		Role: "approver", Reason: "the first policy", Signer: principal(0), Time: at, Head: head,
	}.Text()
	if err != nil {
		return chain.Head{}, err
	}
	signature, err := signoff.Sign(statement, keyOf(0))
	if err != nil {
		return chain.Head{}, err
	}
	return history.RecordAnchor(ctx, l, nil, approval.AnchorBody{
		Format: approval.AnchorFormat, SignOff: policyFiles.SignOff, AllowedSigners: policyFiles.AllowedSigners,
		Statements: []approval.Signed{{Format: approval.AnchorFormat, Signature: string(signature), Statement: string(statement)}},
	}, at)
}

// verified proves a whole ledger: SQLite's own check, the chain, all rows in both
// directions, every statement; and that just those of the noted heads are there
// that should be. It gives the head.
func verified(ctx context.Context, l *ledger.Ledger, noted ...chain.Head) (chain.Head, error) {
	r, err := history.Verify(ctx, l, history.VerifyOptions{Against: noted})
	if err != nil {
		return chain.Head{}, err
	}
	missing := 0
	for _, p := range r.Problems {
		if p.Kind != "head" || !strings.Contains(p.Text, "is not there") {
			return r.Head, fmt.Errorf("verify: %v", p)
		}
		missing++
	}
	want := 0
	for _, h := range noted {
		if h.Seq > r.Head.Seq {
			want++
			continue
		}
		proved := false
		for _, s := range r.Proved {
			proved = proved || strings.Contains(s, "still contains the noted head "+h.String())
		}
		if !proved {
			return r.Head, fmt.Errorf("verify does not prove the noted head %s", h)
		}
	}
	if missing != want {
		return r.Head, fmt.Errorf("verify says that %d noted heads are missing, %d are", missing, want)
	}
	return r.Head, nil
}

// opened opens a ledger.
func opened(t testing.TB, file string, o ledger.Options) *ledger.Ledger {
	t.Helper()
	if o.Now == nil {
		o.Now = clock
	}
	l, err := ledger.Open(t.Context(), file, o)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

// TestPeople proves that what the other tests record is whole.
func TestPeople(t *testing.T) {
	l := opened(t, t.TempDir()+"/ledger.db", ledger.Options{Create: true})
	ctx := t.Context()
	var heads []chain.Head
	for i, f := range []func() (chain.Head, error){
		func() (chain.Head, error) { return anchor(ctx, l, when) },
		func() (chain.Head, error) { return assess(ctx, l, when, "one", 5) },
		func() (chain.Head, error) { return signOff(ctx, l, when, 1, 1) },
	} {
		head, err := f()
		if err != nil {
			t.Fatal(i, err)
		}
		heads = append(heads, head)
	}
	missing := chain.Head{Seq: 9, Hash: strings.Repeat("0", 64)}
	if head, err := verified(ctx, l, append(heads, missing)...); err != nil || head != heads[2] {
		t.Fatal(head, err)
	}
	line, problems, err := history.ReadLine(ctx, l)
	if err != nil || len(problems) > 0 || line.State(1).Word != approval.Approved {
		t.Fatal(problems, err)
	}
}
