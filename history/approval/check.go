package approval

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
	"time"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// Tolerance is by how much the clock of a signer may be ahead.
const Tolerance = 5 * time.Minute

// InServiceRole is the role of those who may record that a revision went into
// service. It takes no part in approvals.
const InServiceRole = schema.InService

// kinds says which statement belongs to which entry.
var kinds = map[chain.Kind]struct {
	statement signoff.Kind
	format    string
}{
	chain.SignOff:    {signoff.SignOff, SignOffFormat},
	chain.InForce:    {signoff.InForce, InForceFormat},
	chain.Revocation: {signoff.Revocation, RevocationFormat},
	chain.Anchor:     {signoff.Anchor, AnchorFormat},
}

// Read reads a signed statement without asking whether it counts.
func Read(body Signed) (Record, error) {
	s, err := signoff.Parse([]byte(body.Statement))
	if err != nil {
		return Record{}, err
	}
	_, fingerprint, err := signoff.Key([]byte(body.Signature))
	return Record{Statement: s, Fingerprint: fingerprint, Signature: []byte(body.Signature), Text: []byte(body.Statement)}, err
}

// Check decides whether a signed statement may be recorded at a time, after the
// entries that the line has taken up.
func (l *Line) Check(kind chain.Kind, body Signed, recorded time.Time) (Record, error) {
	k := kinds[kind]
	if kind == chain.Anchor {
		return Record{}, refuse("an anchor is several statements")
	}
	if body.Format != k.format {
		return Record{}, refuse("the format is %q, %q is needed", body.Format, k.format)
	}
	s, err := signoff.Parse([]byte(body.Statement))
	if err != nil {
		return Record{}, err
	}
	if s.Kind != k.statement {
		return Record{}, refuse("a statement of kind %s cannot serve as %s", s.Kind, k.statement)
	}
	r := Record{Statement: s, Recorded: recorded, Signature: []byte(body.Signature), Text: []byte(body.Statement)}
	if err := l.check(&r); err != nil {
		return r, err
	}
	r.Entry = chain.Head{Seq: int64(len(l.heads)) + 1}
	return r, nil
}

func (l *Line) check(r *Record) error {
	switch r.Kind {
	case signoff.SignOff:
		return l.checkSignOff(r)
	case signoff.InForce:
		return l.checkInForce(r)
	case signoff.Revocation:
		return l.checkRevocation(r)
	}
	return refuse("a statement of kind %s is not recorded by itself", r.Kind)
}

// Foresee tells why a statement could not be recorded at a time if the key with a
// fingerprint signed it; without a fingerprint, if a key that may did. Nobody need
// sign what is refused afterwards.
func (l *Line) Foresee(s signoff.Statement, fingerprint string, recorded time.Time) error {
	text, err := s.Text()
	if err != nil {
		return err
	}
	with := func(fingerprint string) error {
		return l.check(&Record{Statement: s, Recorded: recorded, Text: text, Fingerprint: fingerprint, foreseen: true})
	}
	if err := with(fingerprint); err != nil || fingerprint != "" {
		return err
	}
	// One policy can have a key that another one took out.
	for _, key := range l.keysOf(s.Signer) {
		if err = with(key); err == nil {
			break
		}
	}
	return err
}

// keysOf lists the keys that the policies of the line have of somebody.
func (l *Line) keysOf(signer string) []string {
	var list []string
	for _, p := range l.policies {
		if p.Parsed == nil {
			continue
		}
		for _, k := range p.Parsed.Keys {
			if k.Principal == signer {
				list = append(list, k.Fingerprint)
			}
		}
	}
	slices.Sort(list)
	return slices.Compact(list)
}

// checkForm checks what all statements have in common but the signature: the
// ledger, the head, the time, that the statement is new.
func (l *Line) checkForm(r *Record) error {
	switch {
	case r.Ledger != l.ledger:
		return refuse("the statement is for the ledger %s, this is %s", r.Ledger, l.ledger)
	case r.Head.Seq < 1 || r.Head.Seq > int64(len(l.heads)) || l.heads[r.Head.Seq-1] != r.Head:
		return refuse("the head %s that the statement names is no entry of this ledger", r.Head)
	}
	if at, ok := l.statements[signoff.Hash(r.Text)]; ok {
		return refuse("the statement is recorded already, as entry %d", at)
	}
	if seen := l.times[r.Head.Seq-1]; r.Time.Before(seen) {
		return &hinted{
			refuse("the statement is of %s, before the entry %d that it names, of %s", r.Time.Format(signoff.TimeLayout), r.Head.Seq, seen.Format(signoff.TimeLayout)),
			fmt.Sprintf("put the clock right; if the one by which entry %d was recorded was wrong, record an assessment with this one first: a statement that is made after it names its entry", r.Head.Seq),
		}
	}
	if r.Time.After(r.Recorded.Add(Tolerance)) {
		return refuse("the statement is of %s, after the time of recording, %s", r.Time.Format(signoff.TimeLayout), r.Recorded.Format(signoff.TimeLayout))
	}
	return nil
}

// usable gives a policy that can be used, or says why not.
func usable(p Policy, whose string) (*schema.Policy, error) {
	switch {
	case p.Hash == "":
		return nil, refuse("%s has no policy (signoff.toml and allowed_signers)", whose)
	case p.Problem != nil:
		return nil, refuse("the policy of %s is not valid: %v", whose, p.Problem)
	}
	return p.Parsed, nil
}

// checkSignOff checks a sign-off of an assessment.
func (l *Line) checkSignOff(r *Record) error {
	if err := l.checkForm(r); err != nil {
		return err
	}
	a := l.byNumber[r.Assessment]
	if a == nil {
		return refuse("there is no assessment %d", r.Assessment)
	}
	policy, err := usable(a.Policy, "the base")
	if err != nil {
		return err
	}
	if err := checkRepeats(r, a); err != nil {
		return err
	}
	if err := l.checkAge(r, a); err != nil {
		return err
	}
	if _, err := usable(a.Next, "the target"); err != nil {
		return err
	}
	if problem := l.blocked(a); problem != "" {
		return refuse("assessment %d cannot be signed: %s", a.Number, problem)
	}
	if r.inForce, err = usable(l.Newest(a.Folder), "the newest approved revision"); err != nil {
		return err
	}
	for _, p := range l.Rejected(a) {
		r.rejected = append(r.rejected, p.Parsed)
	}
	return l.checkPolicies(r, a, policy)
}

// checkRepeats checks that a sign-off says of its assessment what that says, and
// decides something that is known.
func checkRepeats(r *Record, a *Assessment) error {
	for _, same := range []struct {
		name      string
		have, got any
	}{
		{"digest", a.Digest, r.Digest}, {"base", a.Base, r.Base}, {"target", a.Target, r.Target}, {"folder", a.Folder, r.Folder},
		{"rules version", a.Rules, r.Rules}, {"list of findings", a.Findings, r.Findings}, {"policy", a.Policy.Hash, r.Policy},
	} {
		if same.have != same.got {
			return refuse("the %s of the statement is %v, that of assessment %d is %v", same.name, same.got, a.Number, same.have)
		}
	}
	if r.Decision != signoff.Approve && r.Decision != signoff.Reject {
		return refuse("the decision is %q, approve and reject are known", r.Decision)
	}
	return nil
}

// checkAge checks that whoever signed knew the assessment, and his last decision on
// its content: an approval of before a rejection does not lift it, by whatever number
// it goes.
func (l *Line) checkAge(r *Record, a *Assessment) error {
	if r.Head.Seq < a.Entry.Seq {
		return refuse("the head that the statement names, %d, is older than the assessment, entry %d", r.Head.Seq, a.Entry.Seq)
	}
	for _, i := range l.ofContent[a.content()] {
		earlier := &l.signOffs[i]
		if earlier.Signer == r.Signer && r.Head.Seq < earlier.Entry.Seq {
			return refuse("the head that the statement names, %d, is older than the last decision of %s on it, entry %d", r.Head.Seq, r.Signer, earlier.Entry.Seq)
		}
	}
	return nil
}

// checkPolicies checks role, independence and key of a sign-off by the policy of the
// base, by the newest approved one (r.inForce) and by newer ones that are rejected
// (r.rejected).
func (l *Line) checkPolicies(r *Record, a *Assessment, base *schema.Policy) error {
	// A role that only the policy in force has, or a newer one that is rejected, may be
	// taken all the same.
	signer := base
	for _, p := range append([]*schema.Policy{r.inForce}, r.rejected...) {
		if signer.Role(r.Role) == nil && p.Role(r.Role) != nil {
			signer = p
		}
	}
	if err := checkRole(signer, r.Role, r.Signer); err != nil {
		return err
	}
	if r.Role == InServiceRole {
		return refuse("the role %s records what is in force and approves nothing", InServiceRole)
	}
	if err := l.checkIndependence(r, a, base); err != nil {
		return err
	}
	if err := l.checkSignature(r, signer); err != nil {
		return err
	}
	if signer == r.inForce || signer == base {
		if err := l.checkBy(r, a, r.inForce, "the newest approved policy"); err != nil {
			return err
		}
	}
	for _, p := range r.rejected {
		if p.Role(r.Role) == nil || r.Decision != signoff.Approve {
			continue
		}
		if err := l.checkBy(r, a, p, whoseRejected); err != nil {
			return l.byRejected(r.Folder, p, err)
		}
	}
	return l.checkTakenOut(r, a.TargetTree)
}

// checkBy holds a sign-off against a newer policy as well: a base of before a turn of
// the policy does not bring the former one back.
func (l *Line) checkBy(r *Record, a *Assessment, p *schema.Policy, whose string) error {
	if p.Role(r.Role) == nil {
		return refuse("by %s: it has no role %q; base the change on the newest release, and assess it again", whose, r.Role)
	}
	err := checkRole(p, r.Role, r.Signer)
	if err == nil {
		err = l.checkIndependence(r, a, p)
	}
	if err == nil && (!r.foreseen || r.Fingerprint != "") {
		_, err = allowedKey(p, r.Fingerprint, r.Signer, r.Time, r.Recorded)
	}
	if err != nil {
		return refuse("by %s: %v", whose, strings.TrimPrefix(err.Error(), ErrRefused.Error()+": "))
	}
	return nil
}

// checkTakenOut refuses a key that an approved policy took out, or one that was approved
// until somebody rejected it. content is what is decided on, empty where nothing is.
func (l *Line) checkTakenOut(r *Record, content string) error {
	if r.foreseen && r.Fingerprint == "" {
		return nil
	}
	if by := l.takenOut(r.Folder, r.Fingerprint); by != nil {
		return refuse("the key %s was taken out of the policy by assessment %d, which is approved", r.Fingerprint, by.Number)
	}
	if by := l.stillOut(r.Folder, content, r.Fingerprint); by != nil {
		return refuse("the key %s was taken out of the policy by assessment %d, which was approved until entry %d rejected it", r.Fingerprint, by.by.Number, by.at)
	}
	return nil
}

// checkNewestSignature checks the signature of a statement that goes by the newest
// approved policy.
func (l *Line) checkNewestSignature(r *Record, p *schema.Policy) error {
	if err := l.checkSignature(r, p); err != nil {
		return err
	}
	for _, p := range l.rejected(r.Folder, "") {
		if err := checkRejected(r, p.Parsed); err != nil {
			err = refuse("by %s: %v", whoseRejected, strings.TrimPrefix(err.Error(), ErrRefused.Error()+": "))
			return l.byRejected(r.Folder, p.Parsed, err)
		}
	}
	return l.checkTakenOut(r, "")
}

// checkRejected holds such a statement against a newer policy whose release was
// rejected: whom it had let sign no more, the rejection does not bring back.
func checkRejected(r *Record, p *schema.Policy) error {
	if r.Role != signoff.Owner {
		if err := checkRole(p, r.Role, r.Signer); err != nil {
			return err
		}
		if r.Kind == signoff.Revocation && !p.Independent(r.Role, schema.Preparer) {
			return refuse("the role %s is not independent of preparer", r.Role)
		}
	}
	if r.foreseen && r.Fingerprint == "" {
		return nil
	}
	_, err := allowedKey(p, r.Fingerprint, r.Signer, r.Time, r.Recorded)
	return err
}

// blocked says why nobody may sign an assessment; empty where somebody may.
func (l *Line) blocked(a *Assessment) string {
	switch {
	case l.anchors[a.Folder] == nil:
		return "no policy is anchored for this folder; speedtrail anchor puts one in force"
	case a.BaseNotAncestor:
		return "its base is no ancestor of its target"
	case a.Base == a.Target:
		return "its base is its target"
	case len(a.Preparers) == 0:
		return "nobody is known to have prepared it"
	case !l.ApprovedContent(a.Folder, a.BaseTree):
		return "its base is neither the anchor nor an approved target (base-not-approved)"
	}
	if problem := l.otherPolicy(a); problem != "" {
		return problem
	}
	if !l.counted(a) {
		return "its preparers are counted from " + a.since() + ", which is not the approved commit but another one of the same content: who prepared that is not known; assess the change again"
	}
	if a.BaseTree == a.TargetTree {
		// Else a commit that brings history without content would become an approved one.
		return "its target has the content of its base, so that there is nothing to sign"
	}
	return ""
}

// checkIndependence keeps a person from taking two parts that must be taken by
// different people. The earlier part counts: a decision on the assessment, an
// approval of the same content by whatever number.
func (l *Line) checkIndependence(r *Record, a *Assessment, p *schema.Policy) error {
	if p.Independent(r.Role, schema.Preparer) {
		switch email, known, ok := a.hand(p, r.Signer); {
		case ok && known:
			return refuse("%s prepared the change (%s), and the role %s is independent of preparer", r.Signer, email, r.Role)
		case ok:
			return refuse("whether %s prepared the change cannot be told: %s is no person of this policy, and the role %s is independent of preparer", r.Signer, cmp.Or(email, "somebody without an address"), r.Role)
		}
	}
	for _, i := range l.ofContent[a.content()] {
		earlier := &l.signOffs[i]
		part := earlier.Assessment == r.Assessment || earlier.Decision == signoff.Approve
		if part && earlier.Signer == r.Signer && earlier.Role != r.Role && p.Independent(r.Role, earlier.Role) {
			return refuse("%s signed as %s (entry %d), and the role %s is independent of that", r.Signer, earlier.Role, earlier.Entry.Seq, r.Role)
		}
	}
	return nil
}
