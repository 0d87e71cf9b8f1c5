package approval

import (
	"fmt"
	"time"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// addAnchor takes up an anchor.
func (l *Line) addAnchor(e chain.Entry, recorded time.Time) error {
	var body AnchorBody
	if err := canon.Unmarshal(e.Body, &body); err != nil {
		return fmt.Errorf("its body cannot be read: %w", err)
	}
	a, err := l.CheckAnchor(body, recorded)
	if err != nil {
		return err
	}
	a.Entry = e.Head()
	for i := range a.Records {
		a.Records[i].Entry = e.Head()
		l.statements[signoff.Hash(a.Records[i].Text)] = e.Seq
	}
	l.anchors[a.Records[0].Folder] = a
	delete(l.contents, a.Records[0].Folder)
	return nil
}

// CheckAnchor decides whether an anchor may be recorded: there is one for each
// ledger and folder, and its statements are those of people who satisfy every
// role of the policy that it puts in force. What a role asks about preparers
// cannot be asked of the first revision, and is not.
func (l *Line) CheckAnchor(body AnchorBody, recorded time.Time) (*AnchorRecord, error) {
	return l.checkAnchor(body, nil, true, recorded)
}

// Unsigned is a statement that nobody has signed so far, and the fingerprint of the
// key that is to sign it; without one, any that may.
type Unsigned struct {
	signoff.Statement
	Fingerprint string
}

// ForeseeAnchor tells why an anchor could not be recorded at a time if the unsigned
// statements were added to those of the body; whole says that no others will come.
// Nobody need sign what is refused afterwards. Before there is a ledger, an empty line
// stands for it.
func (l *Line) ForeseeAnchor(body AnchorBody, unsigned []Unsigned, whole bool, recorded time.Time) error {
	_, err := l.checkAnchor(body, unsigned, whole, recorded)
	return err
}

func (l *Line) checkAnchor(body AnchorBody, unsigned []Unsigned, whole bool, recorded time.Time) (*AnchorRecord, error) {
	if body.Format != AnchorFormat {
		return nil, refuse("the format is %q, %q is needed", body.Format, AnchorFormat)
	}
	p := l.policy(body.SignOff, body.AllowedSigners)
	policy, err := usable(p, "the anchor")
	if err != nil {
		return nil, err
	}
	records, err := anchorStatements(body, unsigned, recorded)
	if err != nil {
		return nil, err
	}
	if len(records) == 0 {
		return nil, refuse("nobody signs the anchor")
	}
	if folder := records[0].Folder; l.anchors[folder] != nil {
		return nil, refuse("the folder %s has an anchor already, entry %d", folder, l.anchors[folder].Entry.Seq)
	}
	a := &AnchorRecord{Policy: p}
	seen := map[string]bool{}
	for _, r := range records {
		if err := l.checkAnchorStatement(&r, p); err != nil {
			return nil, err
		}
		if seen[signoff.Hash(r.Text)] {
			return nil, refuse("a statement stands twice in the anchor")
		}
		seen[signoff.Hash(r.Text)] = true
		if first := a.Records; len(first) > 0 && (first[0].Revision != r.Revision || first[0].Folder != r.Folder || first[0].Content != r.Content) {
			return nil, refuse("the statements name different revisions, folders or contents")
		}
		for _, other := range a.Records {
			if other.Signer == r.Signer && other.Role != r.Role && policy.Independent(other.Role, r.Role) {
				return nil, refuse("%s signs as %s and as %s, which must be different people", r.Signer, other.Role, r.Role)
			}
		}
		a.Records = append(a.Records, r)
	}
	if whole {
		if err := enoughSign(policy, a.Records); err != nil {
			return nil, err
		}
	}
	a.Revision, a.Content = a.Records[0].Revision, a.Records[0].Content
	return a, nil
}

// anchorStatements reads the statements of an anchor, signed and unsigned.
func anchorStatements(body AnchorBody, unsigned []Unsigned, recorded time.Time) (records []Record, err error) {
	for _, signed := range body.Statements {
		r, err := readAnchorStatement(signed, recorded)
		if err != nil {
			return nil, err
		}
		records = append(records, r)
	}
	for _, u := range unsigned {
		text, err := u.Text()
		if err != nil {
			return nil, err
		}
		records = append(records, Record{Statement: u.Statement, Recorded: recorded, Text: text, Fingerprint: u.Fingerprint, foreseen: true})
	}
	return records, nil
}

// enoughSign checks that as many people sign in each role as its policy needs.
func enoughSign(policy *schema.Policy, records []Record) error {
	people := map[string]map[string]bool{} // role -> signers
	for _, r := range records {
		if people[r.Role] == nil {
			people[r.Role] = map[string]bool{}
		}
		people[r.Role][r.Signer] = true
	}
	for _, role := range policy.Roles {
		if n := len(people[role.Name]); n < role.Needed {
			return refuse("the role %s is signed by %d of %d people", role.Name, n, role.Needed)
		}
	}
	return nil
}

func readAnchorStatement(signed Signed, recorded time.Time) (Record, error) {
	if signed.Format != AnchorFormat {
		return Record{}, refuse("the format is %q, %q is needed", signed.Format, AnchorFormat)
	}
	s, err := signoff.Parse([]byte(signed.Statement))
	if err != nil {
		return Record{}, err
	}
	if s.Kind != signoff.Anchor {
		return Record{}, refuse("a statement of kind %s cannot serve as %s", s.Kind, signoff.Anchor)
	}
	return Record{Statement: s, Recorded: recorded, Signature: []byte(signed.Signature), Text: []byte(signed.Statement)}, nil
}

func (l *Line) checkAnchorStatement(r *Record, p Policy) error {
	// Of a ledger that is still to be made nobody knows the id.
	if !r.foreseen || len(l.heads) > 0 {
		if err := l.checkForm(r); err != nil {
			return err
		}
	}
	if r.Policy != p.Hash {
		return refuse("the statement names the policy %s, the anchor holds %s", r.Policy, p.Hash)
	}
	if err := checkRole(p.Parsed, r.Role, r.Signer); err != nil {
		return err
	}
	return l.checkSignature(r, p.Parsed)
}
