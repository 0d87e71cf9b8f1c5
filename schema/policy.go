package schema

import (
	"slices"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"golang.org/x/crypto/ssh"

	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// Preparer is the built-in role of those who wrote a change.
const Preparer = "preparer"

// Owner is what a revocation has in the place of a role where the owner of the key
// signs it. It is no role.
const Owner = "owner"

// InService is the role of those who record that a revision went into service. It
// takes no part in approvals, so it makes no approval independent of anybody.
const InService = "in-service"

// Policy says who may sign what off: signoff.toml and allowed_signers.
type Policy struct {
	Persons []Person
	Roles   []Role
	Keys    []Key // of allowed_signers, in its order
}

// Person is somebody with the addresses that stand in commits.
type Person struct {
	Pos       source.Position
	Principal string   // as in allowed_signers, lower case
	Emails    []string // lower case
}

// Role is a part that people take in an approval.
type Role struct {
	Pos           source.Position
	Name          string
	Needed        int      // how many different people, at least 1
	IndependentOf []string // names of roles, Preparer among them
	Signers       []string // principals; empty: every person
	Places        RolePlaces
}

// RolePlaces are where the values of a role stand.
type RolePlaces struct {
	Needed                 source.Position
	IndependentOf, Signers []source.Position // in the order of the lists
}

// Key is a public key that a principal may sign with.
type Key struct {
	Pos         source.Position
	Principal   string
	Public      ssh.PublicKey
	Fingerprint string   // SHA256:...
	Namespaces  []string // empty: every namespace
	// Bounds of validity, both inclusive; zero: none.
	ValidAfter, ValidBefore time.Time
}

// policy reads both policy files; nil where there is none.
func (r *reader) policy() *Policy {
	// A file that was refused is there all the same.
	count := r.faults.Count()
	m, haveRoles := r.toml(signoffFile, false)
	rolesThere := haveRoles || r.refused[signoffFile] || r.faults.Count() > count
	count = r.faults.Count()
	content, haveKeys := r.file(signersFile, table.MaxTOMLSize)
	keysThere := haveKeys || r.refused[signersFile] || r.faults.Count() > count
	switch {
	case !rolesThere && !keysThere:
		return nil
	case !keysThere:
		r.faults.Add(source.Position{File: signersFile}, "the file is missing, signoff.toml needs it")
	case !rolesThere:
		r.faults.Add(source.Position{File: signoffFile}, "the file is missing, allowed_signers needs it")
	}
	before := r.faults.Count()
	p := &Policy{}
	if haveKeys {
		r.allowedSigners(p, content)
	}
	if haveRoles {
		r.signoff(p, m)
		if r.faults.Count() == before {
			r.checkRoles(p)
		}
		if haveKeys && r.faults.Count() == before {
			r.checkEnough(p)
		}
	}
	return p
}

// ParsePolicy reads a policy from the content of its two files. The error is a
// *source.Faults.
func ParsePolicy(signoff, allowedSigners []byte) (*Policy, error) {
	r := &reader{}
	p := &Policy{}
	r.allowedSigners(p, allowedSigners)
	if m := table.ReadTOML(signoffFile, signoff, &r.faults); m != nil {
		r.signoff(p, table.Reader{Map: m, Faults: &r.faults})
		if r.faults.Count() == 0 {
			r.checkRoles(p)
		}
		if r.faults.Count() == 0 {
			r.checkEnough(p)
		}
	}
	if err := r.faults.Err(); err != nil {
		return nil, err
	}
	return p, nil
}

// PolicyFiles gives the content of signoff.toml and allowed_signers as they were
// read; empty where the data set has no policy.
func (d *Dataset) PolicyFiles() (signoff, allowedSigners []byte) {
	for _, f := range d.Files {
		switch f.Path {
		case signoffFile:
			signoff = f.Content
		case signersFile:
			allowedSigners = f.Content
		}
	}
	return signoff, allowedSigners
}

// Person gives the person of an e-mail address, compared without ASCII letter
// case; nil where it is nobody's, as is that of a commit without one.
func (p *Policy) Person(email string) *Person {
	if email == "" {
		return nil
	}
	email = asciiLower(email)
	for i := range p.Persons {
		if slices.Contains(p.Persons[i].Emails, email) {
			return &p.Persons[i]
		}
	}
	return nil
}

// Known tells whether a principal is a person of the policy.
func (p *Policy) Known(principal string) bool {
	return slices.ContainsFunc(p.Persons, func(x Person) bool { return x.Principal == principal })
}

// Role gives the role of a name; nil where there is none.
func (p *Policy) Role(name string) *Role {
	for i := range p.Roles {
		if p.Roles[i].Name == name {
			return &p.Roles[i]
		}
	}
	return nil
}

// Key gives the key of a fingerprint; nil where it is not allowed.
func (p *Policy) Key(fingerprint string) *Key {
	for i := range p.Keys {
		if p.Keys[i].Fingerprint == fingerprint {
			return &p.Keys[i]
		}
	}
	return nil
}

// Independent tells whether two roles must be taken by different people.
func (p *Policy) Independent(a, b string) bool {
	for _, pair := range [...][2]string{{a, b}, {b, a}} {
		if r := p.Role(pair[0]); r != nil && slices.Contains(r.IndependentOf, pair[1]) {
			return true
		}
	}
	return false
}

// May tells whether a principal may sign in the role.
func (r *Role) May(principal string) bool {
	return len(r.Signers) == 0 || slices.Contains(r.Signers, principal)
}

func (r *reader) signoff(p *Policy, m table.Reader) {
	if v := m.Number("format", true); v != nil && v.Text != "1" {
		r.faults.Add(v.Pos, "format %s is not known, this program reads format 1", source.Quote(v.Text))
	}
	emails, principals, names := map[string]source.Position{}, map[string]source.Position{}, map[string]source.Position{}
	for _, t := range m.Tables("person") {
		person := Person{Pos: t.Pos, Principal: t.Text("principal", true)}
		r.once(principals, "person", person.Principal, valuePlace(t, "principal"))
		r.checkBlanks(t, "emails")
		for _, v := range t.Texts("emails") {
			email := asciiLower(v.Text)
			if problem := emailProblem(email); problem != "" {
				r.faults.Add(v.Pos, "e-mail address %s %s", source.Quote(v.Text), problem)
				continue
			}
			r.once(emails, "e-mail address", email, v.Pos)
			person.Emails = append(person.Emails, email)
		}
		t.Finish()
		p.Persons = append(p.Persons, person)
	}
	for _, t := range m.Tables("role") {
		role := Role{Pos: t.Pos, Name: t.Text("name", true), Needed: whole(t, "needed", 1, 100)}
		role.Places.Needed = valuePlace(t, "needed")
		if t.Get("needed") == nil {
			r.faults.Add(t.Pos, "needed is missing")
		}
		if role.Name != "" && !madeOf(role.Name, 50, "-", true) || role.Name == Preparer {
			r.faults.Add(valuePlace(t, "name"), "role name %s is not made of up to 50 letters, digits and '-', or is the built-in %s", source.Quote(role.Name), Preparer)
		} else if problem := builtIn(role.Name); problem != "" {
			r.faults.Add(valuePlace(t, "name"), "role name %s %s", source.Quote(role.Name), problem)
		}
		r.once(names, "role", role.Name, valuePlace(t, "name"))
		for _, v := range t.Texts("independent_of") {
			role.IndependentOf, role.Places.IndependentOf = append(role.IndependentOf, v.Text), append(role.Places.IndependentOf, v.Pos)
		}
		for _, v := range t.Texts("signers") {
			role.Signers, role.Places.Signers = append(role.Signers, v.Text), append(role.Places.Signers, v.Pos)
		}
		t.Finish()
		p.Roles = append(p.Roles, role)
	}
	m.Finish()
}

// checkRoles checks what makes a policy one that can be met.
func (r *reader) checkRoles(p *Policy) {
	if len(p.Roles) == 0 {
		r.faults.Add(source.Position{File: signoffFile}, "no role, at least one [[role]] is needed")
		return
	}
	independent, service := false, false
	for _, role := range p.Roles {
		for i, other := range role.IndependentOf {
			if other == Preparer {
				independent = independent || role.Name != InService
				service = service || role.Name == InService
			}
			if other != Preparer && !slices.ContainsFunc(p.Roles, func(r Role) bool { return r.Name == other }) {
				known := []string{Preparer}
				for _, x := range p.Roles {
					known = append(known, x.Name)
				}
				r.faults.Add(role.Places.IndependentOf[i], "role %s is independent of %s, which is no role%s", source.Quote(role.Name), source.Quote(other), Meant(other, known))
			}
		}
		people := len(p.Persons)
		if len(role.Signers) > 0 {
			people = len(slices.Compact(slices.Sorted(slices.Values(role.Signers))))
			for i, s := range role.Signers {
				if !slices.ContainsFunc(p.Persons, func(person Person) bool { return person.Principal == s }) {
					r.faults.Add(role.Places.Signers[i], "role %s names the signer %s, who is no person of this file", source.Quote(role.Name), source.Quote(s))
				}
			}
		}
		if people < role.Needed {
			r.faults.Add(role.Places.Needed, "role %s needs %d people and has %d", source.Quote(role.Name), role.Needed, people)
		}
	}
	switch {
	case !independent && service:
		r.faults.Add(p.Roles[0].Pos, "only %s is independent of preparer, and it takes no part in approvals; another role has to be independent, too", InService)
	case !independent:
		r.faults.Add(p.Roles[0].Pos, "no role is independent of preparer, at least one has to be")
	}
	for _, k := range p.Keys {
		if !slices.ContainsFunc(p.Persons, func(person Person) bool { return person.Principal == k.Principal }) {
			r.faults.Add(k.Pos, "principal %s is no person of %s", source.Quote(k.Principal), signoffFile)
		}
	}
}

// builtIn says why a role may not have a name that means something else, or that
// a reader takes for one that does.
func builtIn(name string) string {
	switch lower := asciiLower(name); {
	case lower == Owner:
		return "is the word for the owner of a key where one is revoked, take another"
	case lower == Preparer:
		return "looks like the built-in " + Preparer + ", take another"
	case lower == InService && name != InService:
		return "looks like " + InService + " and would be a role of approvals, write " + InService + " or take another"
	}
	return ""
}

// checkBlanks refuses blanks at the ends of texts, which other lists may have: an
// address is compared with that of a commit, and what is compared stands there.
func (r *reader) checkBlanks(t table.Reader, key string) {
	v := t.Get(key)
	if v == nil {
		return
	}
	for _, item := range v.Items {
		if item.Kind == table.StringKind && strings.TrimSpace(item.Text) != item.Text && strings.TrimSpace(item.Text) != "" {
			r.faults.Add(item.Pos, "e-mail address %s has blanks at its ends, write it without", source.Quote(item.Text))
		}
	}
}

// emailProblem says why an address would be that of nobody, or of too many: a
// commit without an address is nobody's, and bytes that cannot be read all turn
// into the same character.
func emailProblem(email string) string {
	switch {
	case email == "":
		return "is empty, a commit without an address belongs to no person"
	case strings.ContainsFunc(email, unicode.IsSpace):
		return "holds a blank, an address has none"
	case strings.ContainsAny(email, "<>"):
		return "holds '<' or '>', write what stands between them"
	case strings.ContainsRune(email, utf8.RuneError):
		return "holds U+FFFD, which stands for every byte that cannot be read"
	}
	return ""
}

// asciiLower lowers ASCII letters only: other letters have no one lower form.
func asciiLower(s string) string {
	return strings.Map(func(r rune) rune {
		if 'A' <= r && r <= 'Z' {
			return r + 'a' - 'A'
		}
		return r
	}, s)
}
