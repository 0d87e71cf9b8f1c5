package approval

import (
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

const ledgerID = "00112233445566778899aabbccddeeff"

var begin = time.Date(2026, 3, 1, 8, 0, 0, 0, time.UTC)

func hexOf(s string) string {
	sum := sha256.Sum256([]byte(s))
	return hex.EncodeToString(sum[:])
}

func commitOf(name string) string { return hexOf("commit " + name)[:40] }
func treeOf(name string) string   { return hexOf("tree " + name)[:40] }

// keyOf gives the key of a name: the same one in every run. ada2 is another key
// of ada.
func keyOf(name string) ssh.Signer {
	if s, ok := keys[name]; ok {
		return s
	}
	seed := sha256.Sum256([]byte("key " + name))
	s, err := ssh.NewSignerFromKey(ed25519.NewKeyFromSeed(seed[:]))
	if err != nil {
		panic(err)
	}
	keys[name] = s
	return s
}

var keys = map[string]ssh.Signer{}

func fingerprintOf(key string) string { return ssh.FingerprintSHA256(keyOf(key).PublicKey()) }

func principal(key string) string { return strings.TrimRight(key, "0123456789") + "@tarn.example" }

// rules is a policy before it is written down.
type rules struct {
	people []string
	roles  []string // "name needed independent_of,... signers,..."
	keys   []string // "key options"
}

// ordinary is the policy of most tests.
func ordinary() rules {
	everybody := []string{"ada", "bea", "cem", "dan", "eva", "fin"}
	return rules{everybody, []string{"checker 1 preparer", "approver 1 preparer,checker", "in-service 1 - cem"}, everybody}
}

// with gives the policy with another line in the place of the one that begins
// with the same word, or one more.
func (r rules) with(list *[]string, line string) {
	word, _, _ := strings.Cut(line, " ")
	for i, old := range *list {
		if name, _, _ := strings.Cut(old, " "); name == word {
			*list = append(append(append([]string{}, (*list)[:i]...), line), (*list)[i+1:]...)
			return
		}
	}
	*list = append(append([]string{}, *list...), line)
}

func (r rules) role(line string) rules { r.with(&r.roles, line); return r }
func (r rules) key(line string) rules  { r.with(&r.keys, line); return r }

// without takes a key out.
func (r rules) without(key string) rules {
	var keys []string
	for _, k := range r.keys {
		if name, _, _ := strings.Cut(k, " "); name != key {
			keys = append(keys, k)
		}
	}
	r.keys = keys
	return r
}

func quoted(list string, suffix string) string {
	if list == "-" || list == "" {
		return "[]"
	}
	var out []string
	for _, s := range strings.Split(list, ",") {
		out = append(out, `"`+s+suffix+`"`)
	}
	return "[" + strings.Join(out, ", ") + "]"
}

// files writes signoff.toml and allowed_signers.
func (r rules) files() (signOff, signers string) {
	var b, k strings.Builder
	b.WriteString("format = 1\n")
	for _, p := range r.people {
		fmt.Fprintf(&b, "\n[[person]]\nprincipal = \"%s@tarn.example\"\nemails = [\"%s@tarn.example\", \"%s@Users.Example\"]\n", p, p, p)
	}
	for _, line := range r.roles {
		f := strings.Fields(line)
		fmt.Fprintf(&b, "\n[[role]]\nname = \"%s\"\nneeded = %s\nindependent_of = %s\n", f[0], f[1], quoted(f[2], ""))
		if len(f) > 3 {
			fmt.Fprintf(&b, "signers = %s\n", quoted(f[3], "@tarn.example"))
		}
	}
	for _, line := range r.keys {
		name, options, _ := strings.Cut(line, " ")
		fmt.Fprintf(&k, "%s %s\n", principal(name), strings.TrimSpace(options+" "+string(ssh.MarshalAuthorizedKey(keyOf(name).PublicKey()))))
	}
	return b.String(), k.String()
}

func (r rules) hash() string {
	s, k := r.files()
	return signoff.PolicyHash([]byte(s), []byte(k))
}

// story is a ledger in the making, without a file. Every statement is asked about
// first (Check) and then recorded (Add), and both have to say the same.
type story struct {
	t      testing.TB
	line   *Line
	head   chain.Head
	now    time.Time // of the next entry
	number int64
	names  map[string]int64 // "folder base-target" -> number of the assessment
	last   Signed           // the statement that was recorded last
	rules  rules            // of in-force records and revocations
	all    []recorded
}

// recorded is what a line is given.
type recorded struct {
	entry      chain.Entry
	assessment *Assessment
}

func newStory(t testing.TB) *story {
	t.Helper()
	s := &story{t: t, line: New(ledgerID), now: begin, names: map[string]int64{}, rules: ordinary()}
	s.must(s.entry(chain.Ledger, []byte("{}"), nil))
	return s
}

// anchored begins a story with an anchor of commit a.
func anchored(t testing.TB, r rules) *story {
	t.Helper()
	s := newStory(t)
	s.rules = r
	s.must(s.anchor("a", r, nil, "checker:ada", "approver:bea", "in-service:cem"))
	return s
}

func (s *story) must(err error) {
	s.t.Helper()
	if err != nil {
		s.t.Fatal(err)
	}
}

// refused wants an error of a class that holds a text.
func (s *story) refused(err error, text string) {
	s.t.Helper()
	class := errors.Is(err, ErrRefused) || errors.Is(err, signoff.ErrSignature) || errors.Is(err, signoff.ErrMalformed)
	if err == nil || !class || !strings.Contains(err.Error(), text) {
		s.t.Errorf("got %v, want a refusal with %q", err, text)
	}
}

func (s *story) entry(kind chain.Kind, body []byte, a *Assessment) error {
	e := chain.Next(s.head, s.now, kind, body)
	s.now = s.now.Add(time.Hour)
	s.head = e.Head()
	s.all = append(s.all, recorded{e, a})
	return s.line.Add(e, a)
}

// assess records an assessment; edit may alter it.
func (s *story) assess(base, target string, r, next rules, edit func(*Assessment)) int64 {
	s.t.Helper()
	s.number++
	sign, keys := r.files()
	nextSign, nextKeys := next.files()
	a := &Assessment{Number: s.number, Digest: hexOf(fmt.Sprint("digest ", base, target, s.number)), Base: commitOf(base), Target: commitOf(target),
		BaseTree: treeOf(base), TargetTree: treeOf(target), Folder: ".", Rules: 2, Findings: "none", Preparers: []string{"dan@tarn.example"},
		Policy: s.line.Policy(sign, keys), Next: s.line.Policy(nextSign, nextKeys)}
	if edit != nil {
		edit(a)
	}
	s.names[a.Folder+" "+base+"-"+target] = s.number
	s.must(s.entry(chain.Assessment, []byte("{}"), a))
	return s.number
}

// sign fills in what a statement does not say and signs it.
func (s *story) sign(st *signoff.Statement, key, format string) Signed {
	s.t.Helper()
	set := func(p *string, v string) {
		if *p == "" {
			*p = v
		}
	}
	set(&st.Ledger, ledgerID)
	set(&st.Folder, ".")
	set(&st.Reason, "looked at it")
	set(&st.Signer, principal(key))
	if st.Time.IsZero() {
		st.Time = s.now
	}
	if st.Head == (chain.Head{}) {
		st.Head = s.head
	}
	text, err := st.Text()
	s.must(err)
	return Signed{Format: format, Signature: signatureOf(s.t, key, text), Statement: string(text)}
}

// signatures are those that were made before: the same key gives the same one.
var signatures = map[string]string{}

func signatureOf(t testing.TB, key string, text []byte) string {
	t.Helper()
	id := key + "\n" + string(text)
	if _, ok := signatures[id]; !ok {
		b, err := signoff.Sign(text, keyOf(key))
		if err != nil {
			t.Fatal(err)
		}
		signatures[id] = string(b)
	}
	return signatures[id]
}

// record asks and records.
func (s *story) record(kind chain.Kind, body Signed) error {
	s.t.Helper()
	s.last = body
	_, before := s.line.Check(kind, body, s.now)
	b, err := canon.Marshal(body)
	s.must(err)
	err = s.entry(kind, b, nil)
	if (before == nil) != (err == nil) || err != nil && !strings.HasSuffix(err.Error(), before.Error()) {
		s.t.Errorf("asked before, it says %v; recorded, %v", before, err)
	}
	return err
}

// statementOf is a sign-off of an assessment.
func (s *story) statementOf(number int64, role, decision string) *signoff.Statement {
	s.t.Helper()
	a := s.line.Assessment(number)
	if a == nil {
		s.t.Fatalf("there is no assessment %d", number)
	}
	return &signoff.Statement{Kind: signoff.SignOff, Assessment: number, Digest: a.Digest, Base: a.Base, Target: a.Target, Folder: a.Folder, Rules: a.Rules,
		Policy: a.Policy.Hash, Findings: a.Findings, Role: role, Decision: decision}
}

func (s *story) signOff(number int64, key, role, decision string, edit ...func(*signoff.Statement)) error {
	s.t.Helper()
	st := s.statementOf(number, role, decision)
	for _, e := range edit {
		e(st)
	}
	return s.record(chain.SignOff, s.sign(st, key, SignOffFormat))
}

// approve has the assessment signed by ada and bea.
func (s *story) approve(number int64) {
	s.t.Helper()
	s.must(s.signOff(number, "ada", "checker", "approve"))
	s.must(s.signOff(number, "bea", "approver", "approve"))
	s.state(number, Approved)
}

// anchor records an anchor; edit may alter its statements, one after the other.
func (s *story) anchor(commit string, r rules, edit func(i int, st *signoff.Statement), parts ...string) error {
	s.t.Helper()
	sign, keys := r.files()
	body := AnchorBody{AllowedSigners: keys, Format: AnchorFormat, SignOff: sign}
	for i, part := range parts {
		role, key, _ := strings.Cut(part, ":")
		st := &signoff.Statement{Kind: signoff.Anchor, Revision: commitOf(commit), Content: treeOf(commit), Policy: r.hash(), Role: role}
		if edit != nil {
			edit(i, st)
		}
		body.Statements = append(body.Statements, s.sign(st, key, AnchorFormat))
	}
	return s.recordAnchor(body)
}

func (s *story) recordAnchor(body AnchorBody) error {
	s.t.Helper()
	_, before := s.line.CheckAnchor(body, s.now)
	s.foreseesAnchor(body, before)
	b, err := canon.Marshal(body)
	s.must(err)
	err = s.entry(chain.Anchor, b, nil)
	if (before == nil) != (err == nil) || err != nil && !strings.HasSuffix(err.Error(), before.Error()) {
		s.t.Errorf("asked before, it says %v; recorded, %v", before, err)
	}
	return err
}

// foreseesAnchor wants an anchor to be refused for the same reason before it is signed.
func (s *story) foreseesAnchor(body AnchorBody, refused error) {
	s.t.Helper()
	var unsigned []Unsigned
	for _, x := range body.Statements {
		r, err := Read(x)
		if err != nil || x.Format != AnchorFormat || r.Kind != signoff.Anchor {
			return // nothing that is made here has another form
		}
		unsigned = append(unsigned, Unsigned{r.Statement, r.Fingerprint})
	}
	body.Statements = nil
	if err := s.line.ForeseeAnchor(body, unsigned, true, s.now); fmt.Sprint(err) != fmt.Sprint(refused) {
		s.t.Errorf("foreseen: %v; recorded: %v", err, refused)
	}
}

func (s *story) inForce(commit string, since time.Time, routes, corrects string, edit ...func(*signoff.Statement)) error {
	s.t.Helper()
	st := &signoff.Statement{Kind: signoff.InForce, Revision: commitOf(commit), Content: treeOf(commit), Policy: s.rules.hash(), Since: since, Corrects: corrects, Role: InServiceRole}
	if routes != signoff.AllRoutes {
		st.Routes = strings.Split(routes, ",")
	}
	for _, e := range edit {
		e(st)
	}
	return s.record(chain.InForce, s.sign(st, "cem", InForceFormat))
}

func (s *story) revoke(key, by, role string) error {
	s.t.Helper()
	return s.record(chain.Revocation, s.sign(&signoff.Statement{Kind: signoff.Revocation, Policy: s.rules.hash(), Key: fingerprintOf(key), Role: role}, by, RevocationFormat))
}

// state wants a state.
func (s *story) state(number int64, want string) State {
	s.t.Helper()
	got := s.line.State(number)
	if got.Word != want {
		s.t.Errorf("assessment %d is %s (missing %v, blocked by %v), want %s", number, got.Word, got.Missing, got.Blocks, want)
	}
	return got
}
