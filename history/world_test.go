package history_test

import (
	"context"
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"iter"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

// ledgerID is that of every ledger of these tests.
const ledgerID = "00112233445566778899aabbccddeeff"

// begin is the time of the first entry; each later one is an hour younger.
var begin = time.Date(2026, 3, 1, 8, 0, 0, 0, time.UTC)

func hexOf(s string) string {
	sum := sha256.Sum256([]byte(s))
	return hex.EncodeToString(sum[:])
}

func commitOf(name string) string { return hexOf("commit " + name)[:40] }
func treeOf(name string) string   { return hexOf("tree " + name)[:40] }

// keyOf gives the key of a name: the same one in every run.
func keyOf(name string) ssh.Signer {
	if s, ok := keys.Load(name); ok {
		return s.(ssh.Signer)
	}
	seed := sha256.Sum256([]byte("key " + name))
	s, err := ssh.NewSignerFromKey(ed25519.NewKeyFromSeed(seed[:]))
	if err != nil {
		panic(err)
	}
	keys.Store(name, s)
	return s
}

// keys and policies are made once.
var keys, policies sync.Map

func fingerprint(key string) string { return ssh.FingerprintSHA256(keyOf(key).PublicKey()) }

// ownerOf gives the principal of a key: ada2 is another key of ada.
func ownerOf(key string) string { return strings.TrimRight(key, "0123456789") + "@tarn.example" }

// policyFiles gives the two files of a policy by its name:
//
//	P1      that of the anchor
//	P2      the same, with the key ada2 in the place of ada
//	own     valid, but mal may do everything
//	lax     not valid: no role is independent of preparer
//	two     not valid: one key belongs to two principals
//	none    no policy
func policyFiles(name string) (signoff, signers string) {
	if made, ok := policies.Load(name); ok {
		return made.([2]string)[0], made.([2]string)[1]
	}
	signoff, signers = writePolicy(name)
	policies.Store(name, [2]string{signoff, signers})
	return signoff, signers
}

func writePolicy(name string) (signoff, signers string) {
	if name == "none" {
		return "", ""
	}
	people, keys := []string{"ada", "bea", "cem", "dan", "fay", "gus", "hal"}, []string{
		"ada", "bea", "bea2", "cem", "dan", `fay valid-after="20270101Z"`, `gus valid-before="20260101Z"`, `hal namespaces="file"`,
	}
	independent, service := `["preparer"]`, "cem"
	switch name {
	case "P2":
		keys[0] = "ada2"
	case "own":
		people, keys, service = []string{"mal", "nan", "dan"}, []string{"mal", "nan", "dan"}, "mal"
	case "lax":
		independent = "[]"
	}
	var b, k strings.Builder
	b.WriteString("format = 1\n")
	for _, p := range people {
		fmt.Fprintf(&b, "\n[[person]]\nprincipal = \"%s@tarn.example\"\nemails = [\"%s@tarn.example\", \"%s@users.example\"]\n", p, p, p)
	}
	fmt.Fprintf(&b, "\n[[role]]\nname = \"checker\"\nneeded = 1\nindependent_of = %s\n", independent)
	fmt.Fprintf(&b, "\n[[role]]\nname = \"approver\"\nneeded = 1\nindependent_of = %s\n", strings.Replace(independent, `"]`, `", "checker"]`, 1))
	fmt.Fprintf(&b, "\n[[role]]\nname = \"in-service\"\nneeded = 1\nindependent_of = []\nsigners = [\"%s@tarn.example\"]\n", service)
	for _, line := range keys {
		key, options, _ := strings.Cut(line, " ")
		if options != "" {
			options += " "
		}
		fmt.Fprintf(&k, "%s %s%s", ownerOf(key), options, ssh.MarshalAuthorizedKey(keyOf(key).PublicKey()))
	}
	if name == "two" {
		fmt.Fprintf(&k, "gus@tarn.example %s", ssh.MarshalAuthorizedKey(keyOf("bea").PublicKey()))
	}
	return b.String(), k.String()
}

func policyHash(name string) string {
	s, k := policyFiles(name)
	return signoff.PolicyHash([]byte(s), []byte(k))
}

// commit is one of the repository that the tests invent.
type commit struct {
	parent, tree, policy string
	authors              []string // addresses
	findings             []string // ids, "id=reason" for an accepted one
}

// repository is what Git holds, by name. It is a history.Checker.
//
//	a - b - c - d - g (empty)      c turns the keys over
//	     \       \- f              f is a sibling of d
//	      (a) - e                  eva, who is no person, had a part in e
//	a - m - o                      mal writes a policy of his own into m
//	c - n - q                      n has no policy
//	c - l - p, t - u               l has a lax policy, t a key of two principals
//	x                              has no common ancestor
//	s                              its history ends at a shallow boundary
type repository struct {
	commits map[string]commit
	digests map[int]string    // of the assessment of an entry's order, computed anew
	rules   map[string]bool   // targets whose assessments were made by other rules
	content map[string]string // commit -> tree, where it differs from what was recorded
	policy  map[string]string // commit -> policy
}

func newRepository() *repository {
	dan := []string{"dan@tarn.example"}
	return &repository{digests: map[int]string{}, rules: map[string]bool{}, content: map[string]string{}, policy: map[string]string{}, commits: map[string]commit{
		"a": {"", "a", "P1", dan, nil},
		"b": {"a", "b", "P1", dan, []string{"outside", "masked", "masked=renewed next week"}},
		"c": {"b", "c", "P2", dan, []string{"policy-changed"}},
		"d": {"c", "d", "P2", dan, nil},
		"e": {"a", "e", "P1", []string{"dan@users.example", "eva@fell.example"}, nil},
		"f": {"c", "f", "P2", dan, nil},
		"g": {"d", "d", "P2", []string{"cem@users.example"}, nil},
		"m": {"a", "m", "own", dan, []string{"policy-changed"}},
		"o": {"m", "o", "own", dan, nil},
		"n": {"c", "n", "none", dan, nil},
		"q": {"n", "q", "P2", dan, nil},
		"l": {"c", "l", "lax", dan, []string{"policy-changed"}},
		"p": {"l", "p", "lax", dan, nil},
		"t": {"c", "t", "two", dan, []string{"policy-changed"}},
		"u": {"t", "u", "P2", dan, nil},
		"x": {"", "x", "P2", dan, nil},
		"s": {"shallow", "s", "P2", dan, nil},
	}}
}

// document is what an honest assessment of two commits says.
func (r *repository) document(base, target string) *assessment.Document {
	b, t := r.commits[base], r.commits[target]
	revision := func(name string, c commit) assessment.Revision {
		return assessment.Revision{Author: assessment.Person{Email: c.authors[0], Name: "Author"}, Commit: commitOf(name), Committed: "2026-02-27T10:00:00Z", Subject: "Commit " + name, Tree: treeOf(c.tree)}
	}
	policy := func(name string) assessment.Policy {
		s, k := policyFiles(name)
		return assessment.Policy{AllowedSigners: k, SignOff: s}
	}
	d := &assessment.Document{Format: assessment.Format, Named: assessment.Named{Base: base, Target: target}}
	c := &d.Computed
	c.At, c.Dataset, c.Folder, c.RulesVersion = "2026-02-28T12:00:00Z", "Tarn", ".", 2
	c.Base, c.Target = revision(base, b), revision(target, t)
	c.Policy = assessment.Policies{Base: policy(b.policy), Target: policy(t.policy)}
	at := target
	for at != base && at != "" && at != "shallow" {
		for _, email := range r.commits[at].authors {
			p := assessment.Person{Email: email, Name: "Author"}
			if !slices.Contains(c.Preparers, p) {
				c.Preparers = append(c.Preparers, p)
			}
		}
		at = r.commits[at].parent
	}
	ids := t.findings
	switch at {
	case "":
		ids = append([]string{assessment.BaseNotAncestor}, ids...)
	case "shallow":
		c.Preparers = nil
	}
	for _, id := range ids {
		id, accepted, _ := strings.Cut(id, "=")
		c.Findings = append(c.Findings, assessment.Finding{ID: id, Accepted: accepted, Route: "R1", Direction: "nominal", From: "1", To: "2", Text: "see for yourself", Do: "look", Why: "it matters"})
	}
	c.Requests = []assessment.Request{{ID: "CR-" + target, Title: "Request " + target, Reason: "renewed", File: "requests/cr.toml"}}
	c.Trains = []assessment.Train{{ID: "T1", Fate: "kept"}, {ID: "T2", Fate: "kept"}}
	c.Routes = []assessment.Route{{ID: "R1", Name: "Route", Fate: "kept", Folder: "routes/r1", Start: "0", End: "5",
		Sources: [][]assessment.Source{{{File: "routes/r1/speed.csv", Kind: "basic", Line: 3, Value: 60}}, {{File: "routes/r1/speed.csv", Kind: "basic", Line: 3, Value: 80}}},
		Changes: []assessment.Change{
			{Direction: "nominal", From: "1", To: "2", Length: 1_000_000, Start: 1_000_000, Before: 60, After: 80, BeforeSource: 0, AfterSource: 1, Trains: []int{0, 1}},
			{Direction: "reverse", From: "2", To: "1", Length: 1_000_000, Start: 3_000_000, Before: 60, After: 80, BeforeSource: 0, AfterSource: 1, Trains: []int{0}, RunOut: true},
		},
	}}
	return d
}

// encoded gives the body and digest of a document.
func encoded(d *assessment.Document) (body []byte, digest string) {
	body, digest, err := d.Encode()
	if err != nil {
		panic(err)
	}
	return body, digest
}

// named finds the name of a commit; empty where there is none.
func (r *repository) named(hash string) string {
	for name := range r.commits {
		if commitOf(name) == hash {
			return name
		}
	}
	return ""
}

// Recompute makes the honest document of the two commits.
func (r *repository) Recompute(_ context.Context, d *assessment.Document) (string, error) {
	base, target := r.named(d.Computed.Base.Commit), r.named(d.Computed.Target.Commit)
	if base == "" {
		return "", errors.New("there is no commit " + d.Computed.Base.Commit)
	}
	if target == "" {
		return "", errors.New("there is no commit " + d.Computed.Target.Commit)
	}
	if r.rules[target] {
		return "", history.ErrOtherRules
	}
	if tree, ok := r.content[target]; ok {
		c := r.commits[target]
		c.tree = tree
		other := newRepository()
		other.commits[target] = c
		_, digest := encoded(other.document(base, target))
		return digest, nil
	}
	_, digest := encoded(r.document(base, target))
	return digest, nil
}

// Content gives the tree and the policy of a commit.
func (r *repository) Content(_ context.Context, hash, _ string) (tree, signOff, allowedSigners string, err error) {
	name := r.named(hash)
	if name == "" {
		return "", "", "", errors.New("there is no such commit")
	}
	c := r.commits[name]
	if other, ok := r.content[name]; ok {
		c.tree = other
	}
	if other, ok := r.policy[name]; ok {
		c.policy = other
	}
	signOff, allowedSigners = policyFiles(c.policy)
	return treeOf(c.tree), signOff, allowedSigners, nil
}

// quickDir is a folder that goes with the test: in memory where there is such a
// place, since a ledger waits for the disk at every entry and that is not what
// these tests are about.
func quickDir(t testing.TB) string {
	t.Helper()
	dir, err := os.MkdirTemp("/dev/shm", "ledger")
	if err != nil {
		return t.TempDir()
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	return dir
}

// clock gives the time of the entry that is recorded as number seq.
func clock(seq int64) time.Time { return begin.Add(time.Duration(seq-1) * time.Hour) }

// writer records entries as the program does: everything is checked.
type writer struct {
	t    testing.TB
	l    *ledger.Ledger
	repo *repository
	head chain.Head
}

// newLedger makes a ledger of the known id.
func newLedger(t testing.TB, file string) *writer {
	t.Helper()
	body, err := canon.Marshal(map[string]any{"format": 1, "id": ledgerID})
	if err != nil {
		t.Fatal(err)
	}
	first := chain.Next(chain.Head{}, begin, chain.Ledger, body)
	head, err := ledger.Restore(t.Context(), file, func(yield func(ledger.Restored, error) bool) { yield(ledger.Restored{Entry: first}, nil) })
	if err != nil {
		t.Fatal(err)
	}
	l, err := ledger.Open(t.Context(), file, ledger.Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return &writer{t: t, l: l, repo: newRepository(), head: head}
}

func (w *writer) now() time.Time { return clock(w.head.Seq + 1) }

func (w *writer) assess(base, target string) int64 {
	w.t.Helper()
	d := w.repo.document(base, target)
	body, digest := encoded(d)
	number, _, head, err := w.l.RecordAssessment(w.t.Context(), w.now(), assessment.LedgerRecord(d, body, digest))
	if err != nil {
		w.t.Fatal(err)
	}
	w.head = head
	return number
}

// sign fills in what the statement does not say and signs it.
func sign(s signoff.Statement, key string, head chain.Head, now time.Time) (text, signature []byte, err error) {
	set := func(p *string, v string) {
		if *p == "" {
			*p = v
		}
	}
	set(&s.Ledger, ledgerID)
	set(&s.Folder, ".")
	set(&s.Reason, "looked at it")
	set(&s.Signer, ownerOf(key))
	if s.Time.IsZero() {
		s.Time = now
	}
	if s.Head == (chain.Head{}) {
		s.Head = head
	}
	if text, err = s.Text(); err != nil {
		return nil, nil, err
	}
	signature, err = signoff.Sign(text, keyOf(key))
	return text, signature, err
}

func (w *writer) record(kind chain.Kind, s signoff.Statement, key string) {
	w.t.Helper()
	text, signature, err := sign(s, key, w.head, w.now())
	if err != nil {
		w.t.Fatal(err)
	}
	if w.head, err = history.RecordSigned(w.t.Context(), w.l, kind, text, signature, w.now()); err != nil {
		w.t.Fatal(err)
	}
}

func (w *writer) signOff(number int64, key, role, decision string) {
	w.t.Helper()
	line, _, err := history.ReadLine(w.t.Context(), w.l)
	if err != nil {
		w.t.Fatal(err)
	}
	w.record(chain.SignOff, signOffOf(line.Assessment(number), role, decision), key)
}

func signOffOf(a *approval.Assessment, role, decision string) signoff.Statement {
	return signoff.Statement{Kind: signoff.SignOff, Assessment: a.Number, Digest: a.Digest, Base: a.Base, Target: a.Target, Folder: a.Folder,
		Rules: a.Rules, Policy: a.Policy.Hash, Findings: a.Findings, Role: role, Decision: decision}
}

// anchorBody makes the anchor of a commit; signs lists "role:key".
func anchorBody(c, tree, policy string, head chain.Head, now time.Time, signs ...string) (approval.AnchorBody, error) {
	s, k := policyFiles(policy)
	body := approval.AnchorBody{AllowedSigners: k, Format: approval.AnchorFormat, SignOff: s}
	for _, part := range signs {
		if part == "none" {
			continue
		}
		role, key, _ := strings.Cut(part, ":")
		text, signature, err := sign(signoff.Statement{Kind: signoff.Anchor, Revision: commitOf(c), Content: treeOf(tree), Policy: policyHash(policy), Role: role}, key, head, now)
		if err != nil {
			return body, err
		}
		body.Statements = append(body.Statements, approval.Signed{Format: approval.AnchorFormat, Signature: string(signature), Statement: string(text)})
	}
	return body, nil
}

func (w *writer) anchor(c string) {
	w.t.Helper()
	body, err := anchorBody(c, w.repo.commits[c].tree, w.repo.commits[c].policy, w.head, w.now(), "checker:ada", "approver:bea", "in-service:cem")
	if err == nil {
		w.head, err = history.RecordAnchor(w.t.Context(), w.l, body, w.now())
	}
	if err != nil {
		w.t.Fatal(err)
	}
}

func (w *writer) inForce(c, policy, since, routes, corrects string) {
	w.t.Helper()
	at, err := time.Parse(time.RFC3339, since)
	if err != nil {
		w.t.Fatal(err)
	}
	s := signoff.Statement{Kind: signoff.InForce, Revision: commitOf(c), Content: treeOf(w.repo.commits[c].tree), Policy: policyHash(policy), Since: at, Corrects: corrects, Role: approval.InServiceRole}
	if routes != "all" {
		s.Routes = strings.Split(routes, ",")
	}
	w.record(chain.InForce, s, "cem")
}

// baseLedger records what every case begins with; testdata/vectors/README.md
// lists the entries.
func baseLedger(t testing.TB) (file string) {
	t.Helper()
	file = filepath.Join(quickDir(t), "ledger.db")
	w := newLedger(t, file)                                        // 1
	w.assess("a", "b")                                             // 2
	w.anchor("a")                                                  // 3
	w.inForce("a", "P1", "2026-03-01T03:00:00Z", "all", "nothing") // 4
	w.signOff(1, "ada", "checker", "approve")                      // 5
	w.signOff(1, "bea", "approver", "reject")                      // 6
	w.signOff(1, "bea", "approver", "approve")                     // 7
	w.assess("b", "c")                                             // 8
	w.signOff(2, "ada", "checker", "approve")                      // 9
	w.signOff(2, "bea", "approver", "approve")                     // 10
	w.inForce("b", "P2", "2026-03-10T03:00:00Z", "R1", "nothing")  // 11
	w.inForce("b", "P2", "2026-03-12T03:00:00Z", "all", "replaces 11")
	w.inForce("c", "P2", "2026-03-20T03:00:00Z", "all", "nothing") // 13
	w.record(chain.Revocation, signoff.Statement{Kind: signoff.Revocation, Policy: policyHash("P2"), Key: fingerprint("bea2"), Role: signoff.Owner}, "bea")
	w.assess("c", "d")                         // 15
	w.signOff(3, "ada2", "checker", "approve") // 16
	w.assess("a", "e")                         // 17
	if err := w.l.Close(); err != nil {
		t.Fatal(err)
	}
	return file
}

// entriesOf lists the entries of a ledger.
func entriesOf(t testing.TB, seq iter.Seq2[chain.Entry, error]) []chain.Entry {
	t.Helper()
	var list []chain.Entry
	for e, err := range seq {
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, e)
	}
	return list
}
