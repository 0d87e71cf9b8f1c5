// Package signoff writes and reads the statements that people sign, and checks
// their signatures.
//
// A statement is plain text: a first line that names its kind and version, then
// one "name: value" a line in a fixed order, each line ended by one line feed:
//
//	speedtrail sign-off 1
//	ledger: 6f0c...
//	assessment: 3
//	...
//
// Values are valid UTF-8 without control, line or paragraph separator or
// bidirectional characters and without blanks at their ends; what does not obey
// is refused, never escaped. Two different statements never have the same text,
// and Parse(Text(s)) gives s again: the bytes that were signed are the ones that
// are read.
//
// A signature is an OpenSSH signature (PROTOCOL.sshsig) with the namespace
// "speedtrail-signoff" in its armoured form, as ssh-keygen -Y sign writes it.
// Anyone can check one with ssh-keygen -Y verify and no other tool.
package signoff

import (
	"errors"
	"fmt"
	"path"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"speedtrail/history/chain"
	"speedtrail/schema"
)

// Namespace is that of every signature.
const Namespace = schema.Namespace

// Bounds of a statement.
const (
	MaxReason    = 500 // bytes
	MaxStatement = 64 << 10
)

// Kind is the kind of a statement: what serves as one never serves as another.
type Kind string

// The kinds of statement, as their first lines name them.
const (
	SignOff    Kind = "sign-off"
	Anchor     Kind = "anchor"
	InForce    Kind = "in-force"
	Revocation Kind = "revocation"
)

// field is a line of a statement.
type field struct {
	name  string
	kinds []Kind
	get   func(*Statement) string
	set   func(*Statement, string) error
}

// Statement is what a person states. Which fields a kind has, and their order,
// is said by fields.
type Statement struct {
	Kind       Kind
	Ledger     string // id of the ledger
	Assessment int64  // sign-off: its number
	Digest     string // sign-off: of the assessment
	Base       string // sign-off: full commit hash
	Target     string // sign-off: full commit hash
	Revision   string // anchor, in-force: full commit hash
	Folder     string // of the data set in the repository, "." for its root
	Content    string // anchor, in-force: hash of the folder's Git tree
	Rules      int    // sign-off: version of the rules
	Policy     string // SHA-256 of the policy that counts, see PolicyHash
	Findings   string // sign-off: "none", or ids with their numbers, "outside 2, masked 1"; "requests not looked at" before them
	Routes     []string
	Since      time.Time // in-force: the instant
	Corrects   string    // in-force: "nothing", "replaces SEQ" or "voids SEQ"
	Key        string    // revocation: fingerprint, SHA256:...
	Role       string    // in the policy; of a revocation also "owner"
	Decision   string    // sign-off: approve or reject
	Reason     string
	Signer     string // principal
	Time       time.Time
	Head       chain.Head // an entry of the ledger that the signer has seen
}

// AllRoutes stands for the whole network in Routes.
const AllRoutes = "all"

// Decisions.
const (
	Approve = "approve"
	Reject  = "reject"
)

// Owner is the role of a revocation by the key's own principal.
const Owner = schema.Owner

// TimeLayout is the form of times, always UTC.
const TimeLayout = chain.TimeLayout

var every = []Kind{SignOff, Anchor, InForce, Revocation}

func text(p func(*Statement) *string) (func(*Statement) string, func(*Statement, string) error) {
	return func(s *Statement) string { return *p(s) }, func(s *Statement, v string) error { *p(s) = v; return nil }
}

func instant(p func(*Statement) *time.Time) (func(*Statement) string, func(*Statement, string) error) {
	return func(s *Statement) string { return p(s).UTC().Format(TimeLayout) }, func(s *Statement, v string) error {
		t, err := time.Parse(TimeLayout, v)
		*p(s) = t
		return err
	}
}

func number(get func(*Statement) int64, set func(*Statement, int64)) (func(*Statement) string, func(*Statement, string) error) {
	return func(s *Statement) string { return strconv.FormatInt(get(s), 10) }, func(s *Statement, v string) error {
		n, err := strconv.ParseInt(v, 10, 64)
		set(s, n)
		return err
	}
}

// fields lists the lines in their order.
var fields = func() []field {
	var list []field
	add := func(name string, kinds []Kind, get func(*Statement) string, set func(*Statement, string) error) {
		list = append(list, field{name, kinds, get, set})
	}
	addText := func(name string, kinds []Kind, p func(*Statement) *string) {
		get, set := text(p)
		add(name, kinds, get, set)
	}
	addText("ledger", every, func(s *Statement) *string { return &s.Ledger })
	get, set := number(func(s *Statement) int64 { return s.Assessment }, func(s *Statement, n int64) { s.Assessment = n })
	add("assessment", []Kind{SignOff}, get, set)
	addText("digest", []Kind{SignOff}, func(s *Statement) *string { return &s.Digest })
	addText("base", []Kind{SignOff}, func(s *Statement) *string { return &s.Base })
	addText("target", []Kind{SignOff}, func(s *Statement) *string { return &s.Target })
	addText("revision", []Kind{Anchor, InForce}, func(s *Statement) *string { return &s.Revision })
	addText("folder", every, func(s *Statement) *string { return &s.Folder })
	addText("content", []Kind{Anchor, InForce}, func(s *Statement) *string { return &s.Content })
	get, set = number(func(s *Statement) int64 { return int64(s.Rules) }, func(s *Statement, n int64) { s.Rules = int(n) })
	add("rules", []Kind{SignOff}, get, set)
	addText("policy", every, func(s *Statement) *string { return &s.Policy })
	addText("findings", []Kind{SignOff}, func(s *Statement) *string { return &s.Findings })
	add("routes", []Kind{InForce}, func(s *Statement) string {
		if len(s.Routes) == 0 {
			return AllRoutes
		}
		return strings.Join(s.Routes, ",")
	}, func(s *Statement, v string) error {
		if s.Routes = nil; v != AllRoutes {
			s.Routes = strings.Split(v, ",")
		}
		return nil
	})
	get, set = instant(func(s *Statement) *time.Time { return &s.Since })
	add("since", []Kind{InForce}, get, set)
	addText("corrects", []Kind{InForce}, func(s *Statement) *string { return &s.Corrects })
	addText("key", []Kind{Revocation}, func(s *Statement) *string { return &s.Key })
	addText("role", every, func(s *Statement) *string { return &s.Role })
	addText("decision", []Kind{SignOff}, func(s *Statement) *string { return &s.Decision })
	addText("reason", every, func(s *Statement) *string { return &s.Reason })
	addText("signer", every, func(s *Statement) *string { return &s.Signer })
	get, set = instant(func(s *Statement) *time.Time { return &s.Time })
	add("time", every, get, set)
	add("head", every, func(s *Statement) string { return s.Head.String() }, func(s *Statement, v string) (err error) {
		s.Head, err = chain.ParseHead(v)
		return err
	})
	return list
}()

// ErrMalformed is the class of everything that is wrong with the form of a
// statement.
var ErrMalformed = errors.New("malformed statement")

func malformed(format string, args ...any) error {
	return fmt.Errorf("%w: "+format, append([]any{ErrMalformed}, args...)...)
}

// Text writes the statement. The error says which value cannot be written.
func (s Statement) Text() ([]byte, error) {
	if !slices.Contains(every, s.Kind) {
		return nil, malformed("kind %q is not known", string(s.Kind))
	}
	var b strings.Builder
	fmt.Fprintf(&b, "speedtrail %s 1\n", s.Kind)
	for _, f := range fields {
		if !slices.Contains(f.kinds, s.Kind) {
			continue
		}
		v := f.get(&s)
		if problem := valueProblem(v); problem != "" {
			return nil, malformed("%s %s", f.name, problem)
		}
		b.WriteString(f.name + ": " + v + "\n")
	}
	if len(s.Reason) > MaxReason {
		return nil, malformed("the reason has %d bytes, at most %d are allowed", len(s.Reason), MaxReason)
	}
	// Another way to write a folder would be another folder: with an anchor of its own.
	if f := s.Folder; path.Clean(f) != f || path.IsAbs(f) || f == ".." || strings.HasPrefix(f, "../") {
		return nil, malformed("folder %q is not a path from the root of a repository in its one form", f)
	}
	for _, r := range s.Routes {
		// No name, as behind a comma at the end, would stand for the whole network.
		if r == AllRoutes || strings.Contains(r, ",") || r == "" || strings.TrimFunc(r, unicode.IsSpace) != r {
			return nil, malformed("route %q cannot be named in a statement", r)
		}
	}
	if b.Len() > MaxStatement {
		return nil, malformed("longer than %d bytes", MaxStatement)
	}
	return []byte(b.String()), nil
}

// valueProblem says why a value may not stand in a statement.
func valueProblem(v string) string {
	switch {
	case v == "":
		return "is empty"
	case !utf8.ValidString(v):
		return "is not valid UTF-8"
	case strings.TrimFunc(v, unicode.IsSpace) != v:
		return "has blanks at its ends"
	}
	for _, r := range v {
		if unicode.IsControl(r) || r == '\u2028' || r == '\u2029' || r == '\uFEFF' || unicode.Is(unicode.Bidi_Control, r) {
			return fmt.Sprintf("holds the character %U, which can deceive a reader", r)
		}
	}
	return ""
}

// Parse reads a statement. It accepts exactly what Text writes: the bytes of the
// result are those that were given.
func Parse(b []byte) (Statement, error) {
	if len(b) > MaxStatement {
		return Statement{}, malformed("longer than %d bytes", MaxStatement)
	}
	first, rest, ok := strings.Cut(string(b), "\n")
	kind, found := strings.CutPrefix(first, "speedtrail ")
	kind, version := strings.CutSuffix(kind, " 1")
	s := Statement{Kind: Kind(kind)}
	if !ok || !found || !version || !slices.Contains(every, s.Kind) {
		return Statement{}, malformed("the first line names no kind of statement of version 1")
	}
	for _, f := range fields {
		if !slices.Contains(f.kinds, s.Kind) {
			continue
		}
		line, after, ended := strings.Cut(rest, "\n")
		value, named := strings.CutPrefix(line, f.name+": ")
		if named && !ended {
			return Statement{}, malformed("the line feed at the end of the line %q is missing; it is signed as well", f.name)
		}
		if !named {
			return Statement{}, malformed("the line %q is missing or stands elsewhere", f.name)
		}
		rest = after
		if err := f.set(&s, value); err != nil {
			return Statement{}, malformed("%s %q cannot be read", f.name, value)
		}
	}
	if rest != "" {
		return Statement{}, malformed("more lines follow the last one")
	}
	again, err := s.Text()
	if err != nil {
		return Statement{}, err
	}
	if string(again) != string(b) {
		return Statement{}, malformed("a value is not written in its one form")
	}
	return s, nil
}
