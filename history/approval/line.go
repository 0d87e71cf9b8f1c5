// Package approval follows the line of approval through the entries of a ledger:
// from the anchor, through policies and the people who may sign, to the state of
// every assessment.
//
// It knows no SQL and no Git: everything that it decides by stands in the bodies
// of the entries. The same code decides whether a new statement may be recorded
// and, later, whether the recorded one was allowed to be: an entry is checked
// against the entries before it and nothing else.
//
//	line := approval.New(ledgerID)
//	for _, e := range entries {
//		if err := line.Add(e); err != nil { ... } // recorded, but it does not count
//	}
//	line.State(3) // open, partly signed, approved, rejected
//
// The rules are those of the sign-off design; package signoff has the form of
// statements.
package approval

import (
	"cmp"
	"errors"
	"fmt"
	"maps"
	"slices"
	"time"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// Signed is a statement with its signature, as the body of an entry holds it.
type Signed struct {
	Format    string `json:"format"`
	Signature string `json:"signature"`
	Statement string `json:"statement"`
}

// Formats of the bodies.
const (
	SignOffFormat    = "speedtrail-sign-off 1"
	AnchorFormat     = "speedtrail-anchor 1"
	InForceFormat    = "speedtrail-in-force 1"
	RevocationFormat = "speedtrail-revocation 1"
)

// AnchorBody is the body of an anchor: the policy that it puts in force and the
// statements of people who satisfy every role in it.
type AnchorBody struct {
	AllowedSigners string   `json:"allowed_signers"` // content of the file
	Format         string   `json:"format"`
	SignOff        string   `json:"signoff"` // content of signoff.toml
	Statements     []Signed `json:"statements"`
}

// Assessment is what the line needs of an assessment.
type Assessment struct {
	Number               int64
	Entry                chain.Head
	Digest               string
	Base, Target         string // full commit hashes
	BaseTree, TargetTree string // content of the data set folder
	Folder               string
	Rules                int
	Policy, Next         Policy // of the base, of the target
	Preparers            []string
	Findings             string // as statements write them
	BaseNotAncestor      bool
	// Since is the approved commit from which preparers are counted, where the base is
	// another commit of the same content; else it is empty.
	Since string
}

// Policy is a policy with the bytes that it was read from.
type Policy struct {
	SignOff, AllowedSigners string
	Hash                    string // empty where there is none
	Parsed                  *schema.Policy
	Problem                 error // why it cannot be read
}

// Record is a statement that was checked and counts.
type Record struct {
	signoff.Statement
	Entry       chain.Head
	Recorded    time.Time
	Fingerprint string
	Signature   []byte
	Text        []byte

	foreseen bool             // nobody has signed it so far: Foresee
	inForce  *schema.Policy   // of a sign-off: the newest approved policy when it was recorded
	rejected []*schema.Policy // of a sign-off: newer ones whose releases stood rejected then
}

// AnchorRecord is the root of a line of approval.
type AnchorRecord struct {
	Entry    chain.Head
	Revision string
	Content  string
	Policy   Policy
	Records  []Record
}

// Line is the state after some entries.
type Line struct {
	ledger      string
	heads       []chain.Head
	times       []time.Time
	assessments []*Assessment
	numbered    int64 // entries of kind assessment, also those whose body cannot be read
	byNumber    map[int64]*Assessment
	anchors     map[string]*AnchorRecord // by folder
	signOffs    []Record
	inForce     []Record
	revoked     map[string]Record // by fingerprint
	statements  map[string]int64  // hash -> entry
	policies    map[string]Policy
	lost        map[string][]lost // what rejections took out of force, by folder, in their order

	ofAssessment map[int64][]int           // indices in signOffs
	ofContent    map[content][]int         // the same, by what was decided on
	done         map[int64]int64           // what signedOff gave, by assessment
	begun        map[int64]int64           // what firstSigned gave
	contents     map[string]map[string]way // approved contents by folder
	past         map[instant]*Line         // the line as it stood at an instant
}

// New begins a line for the ledger of an id.
func New(ledger string) *Line {
	return &Line{ledger: ledger, byNumber: map[int64]*Assessment{}, anchors: map[string]*AnchorRecord{}, revoked: map[string]Record{}, statements: map[string]int64{}, policies: map[string]Policy{},
		ofAssessment: map[int64][]int{}, ofContent: map[content][]int{}, done: map[int64]int64{}, begun: map[int64]int64{}, contents: map[string]map[string]way{}, lost: map[string][]lost{}}
}

// ErrRefused is the class of everything that a policy or the rules of signing
// do not allow.
var ErrRefused = errors.New("refused")

func refuse(format string, args ...any) error {
	return fmt.Errorf("%w: "+format, append([]any{ErrRefused}, args...)...)
}

// hinted is a refusal that knows what to do about it.
type hinted struct {
	error
	hint string
}

// Unwrap gives the refusal.
func (e *hinted) Unwrap() error { return e.error }

// Hint says what to do.
func (e *hinted) Hint() string { return e.hint }

// Add takes up the next entry of the ledger. An error says why the entry, which
// is recorded all the same, does not count.
func (l *Line) Add(e chain.Entry, assessment *Assessment) error {
	recorded, err := time.Parse(chain.TimeLayout, e.Time)
	if err == nil {
		err = l.add(e, recorded, assessment)
	}
	l.heads = append(l.heads, e.Head())
	l.times = append(l.times, recorded)
	l.past = nil
	return err
}

func (l *Line) add(e chain.Entry, recorded time.Time, assessment *Assessment) error {
	switch e.Kind {
	case chain.Ledger:
		return nil
	case chain.Assessment:
		l.numbered++
		if assessment == nil {
			return errors.New("its body cannot be read")
		}
		assessment.Entry = e.Head()
		l.assessments = append(l.assessments, assessment)
		l.byNumber[assessment.Number] = assessment
		return nil
	case chain.Anchor:
		return l.addAnchor(e, recorded)
	case chain.SignOff, chain.InForce, chain.Revocation:
		var body Signed
		if err := canon.Unmarshal(e.Body, &body); err != nil {
			return fmt.Errorf("its body cannot be read: %w", err)
		}
		r, err := l.Check(e.Kind, body, recorded)
		if err != nil {
			return err
		}
		r.Entry = e.Head()
		l.statements[signoff.Hash(r.Text)] = e.Seq
		switch e.Kind {
		case chain.SignOff:
			l.decide(r)
		case chain.InForce:
			l.inForce = append(l.inForce, r)
		default:
			l.revoked[r.Key] = r
		}
		return nil
	}
	return fmt.Errorf("kind %q is not known", string(e.Kind))
}

// Head is that of the newest entry.
func (l *Line) Head() chain.Head {
	if len(l.heads) == 0 {
		return chain.Head{}
	}
	return l.heads[len(l.heads)-1]
}

// Numbered is how many assessments there are, readable or not: their numbers are
// 1, 2, ... in the order of the ledger.
func (l *Line) Numbered() int64 { return l.numbered }

// Assessments lists the assessments in the order of the ledger.
func (l *Line) Assessments() []*Assessment { return l.assessments }

// Assessment gives the assessment of a number; nil where there is none.
func (l *Line) Assessment(number int64) *Assessment { return l.byNumber[number] }

// Anchor gives the root of a folder's line; nil where there is none.
func (l *Line) Anchor(folder string) *AnchorRecord { return l.anchors[folder] }

// Anchors lists the folders that have an anchor, in no order.
func (l *Line) Anchors() map[string]*AnchorRecord { return l.anchors }

// SignOffs lists the sign-offs that count, in the order of the ledger.
func (l *Line) SignOffs() []Record { return l.signOffs }

// InForce lists the in-force records that count, in the order of the ledger.
func (l *Line) InForce() []Record { return l.inForce }

// Revocations lists the revocations that count, in the order of the ledger.
func (l *Line) Revocations() []Record {
	return slices.SortedFunc(maps.Values(l.revoked), func(a, b Record) int { return cmp.Compare(a.Entry.Seq, b.Entry.Seq) })
}

// Revoked gives the revocation of a key. It holds for all folders: where a key is
// stolen, the thief has it for each of them.
func (l *Line) Revoked(fingerprint string) (Record, bool) {
	r, ok := l.revoked[fingerprint]
	return r, ok
}

// policy reads a policy, each one once.
func (l *Line) policy(signOff, allowedSigners string) Policy {
	if signOff == "" && allowedSigners == "" {
		return Policy{}
	}
	hash := signoff.PolicyHash([]byte(signOff), []byte(allowedSigners))
	p, ok := l.policies[hash]
	if !ok {
		p = Policy{SignOff: signOff, AllowedSigners: allowedSigners, Hash: hash}
		p.Parsed, p.Problem = schema.ParsePolicy([]byte(signOff), []byte(allowedSigners))
		l.policies[hash] = p
	}
	return p
}

// Policy reads the policy of two files' content.
func (l *Line) Policy(signOff, allowedSigners string) Policy {
	return l.policy(signOff, allowedSigners)
}

// forget drops what a decision on a content can have changed.
func (l *Line) forget(decided content) {
	for _, i := range l.ofContent[decided] {
		delete(l.done, l.signOffs[i].Assessment)
		delete(l.begun, l.signOffs[i].Assessment)
	}
	delete(l.contents, decided.folder)
}

// Newest gives the policy that is in force for a folder: the one to which an
// approved assessment turned last, else the anchor's. An assessment whose target
// was approved before turns nothing, nor does one that leaves the policy as it
// is.
func (l *Line) Newest(folder string) Policy {
	anchor := l.anchors[folder]
	if anchor == nil {
		return Policy{}
	}
	if turns := l.turns(folder); len(turns) > 0 {
		return turns[len(turns)-1].by.Next
	}
	return anchor.Policy
}

// turns lists the approved assessments that turned the policy of a folder, in the
// order in which they were complete for the first time, a release after the one that
// it is based on: whoever takes an approval back and gives it again moves nothing.
func (l *Line) turns(folder string) []way {
	var list []way
	for _, s := range l.approvedContents(folder) {
		if s.by != nil && s.by.Policy.Hash != s.by.Next.Hash {
			list = append(list, s)
		}
	}
	slices.SortFunc(list, inOrder)
	return list
}

func inOrder(a, b way) int {
	return cmp.Or(cmp.Compare(a.first, b.first), cmp.Compare(a.depth, b.depth), cmp.Compare(a.by.Number, b.by.Number))
}

// takenOut gives the approved assessment that took a key out of the policy of a
// folder: what another one, which never had to do with the key, leaves in its policy
// does not bring it back. It is nil where the key was not taken out, or was brought
// in again.
func (l *Line) takenOut(folder, fingerprint string) *Assessment {
	turns := l.turns(folder)
	brings := len(turns)
	// A release that goes back to an approved content turns nothing, and takes out all
	// the same.
	contents := l.approvedContents(folder)
	for _, a := range l.assessments {
		base, ok := contents[a.BaseTree]
		if ok && a.Folder == folder && a.Policy.Hash != a.Next.Hash && contents[a.TargetTree].by != a && l.signedOff(a) > 0 {
			turns = append(turns, way{by: a, first: max(base.first, l.firstSigned(a)), depth: base.depth + 1})
		}
	}
	turning := map[*Assessment]bool{}
	for _, s := range turns[:brings] {
		turning[s.by] = true
	}
	slices.SortFunc(turns, inOrder)
	var by *Assessment
	for _, s := range turns {
		if s.by.Policy.Parsed == nil || s.by.Next.Parsed == nil {
			continue
		}
		before, after := s.by.Policy.Parsed.Key(fingerprint) != nil, s.by.Next.Parsed.Key(fingerprint) != nil
		switch {
		case before && !after:
			by = s.by
		case after && !before && turning[s.by]:
			by = nil
		}
	}
	return by
}
