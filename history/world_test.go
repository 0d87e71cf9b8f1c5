package history_test

import (
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"iter"
	"os"
	"path/filepath"
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
//	P3      as P2, with dax, another name of dan, in the place of dan, and a role more
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
	independent, service, more := `["preparer"]`, "cem", ""
	switch name {
	case "P2":
		keys[0] = "ada2"
	case "P3":
		people[3], keys[0], keys[4] = "dax", "ada2", "dax"
		more = "\n[[role]]\nname = \"reader\"\nneeded = 1\nindependent_of = [\"preparer\"]\n"
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
	b.WriteString(more)
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
	in, err := w.l.RecordAssessment(w.t.Context(), w.now(), assessment.LedgerRecord(d, body, digest))
	if err != nil {
		w.t.Fatal(err)
	}
	w.head = in.Head
	return in.Number
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
	if w.head, err = history.RecordSigned(w.t.Context(), w.l, nil, history.Statement{Kind: kind, Text: text, Signature: signature}, w.now()); err != nil {
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
func anchorBody(c, tree, folder, policy string, head chain.Head, now time.Time, signs ...string) (approval.AnchorBody, error) {
	s, k := policyFiles(policy)
	body := approval.AnchorBody{AllowedSigners: k, Format: approval.AnchorFormat, SignOff: s}
	for _, part := range signs {
		if part == "none" {
			continue
		}
		role, key, _ := strings.Cut(part, ":")
		text, signature, err := sign(signoff.Statement{Kind: signoff.Anchor, Revision: commitOf(c), Folder: folder, Content: treeOf(tree), Policy: policyHash(policy), Role: role}, key, head, now)
		if err != nil {
			return body, err
		}
		body.Statements = append(body.Statements, approval.Signed{Format: approval.AnchorFormat, Signature: string(signature), Statement: string(text)})
	}
	return body, nil
}

func (w *writer) anchor(c string) {
	w.t.Helper()
	body, err := anchorBody(c, w.repo.commits[c].tree, ".", w.repo.commits[c].policy, w.head, w.now(), "checker:ada", "approver:bea", "in-service:cem")
	if err == nil {
		w.head, err = history.RecordAnchor(w.t.Context(), w.l, nil, body, w.now())
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
