package demo

import (
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/pem"
	"fmt"
	"strings"
	"time"

	"golang.org/x/crypto/ssh"
)

// Signer is somebody of the network who signs, with a test key. The keys are made
// from their names, so that everyone has them: they protect nothing.
type Signer struct{ Principal, Key string }

// The people who sign. Holm has a second key since the summer.
var (
	Holm    = Signer{"r.holm@brackwater.example", "holm"}
	HolmNew = Signer{"r.holm@brackwater.example", "holm-2"}
	Brand   = Signer{"o.brand@brackwater.example", "brand"}
	Sand    = Signer{"v.sand@brackwater.example", "sand"}
	Deverel = Signer{"a.deverel@brackwater.example", "deverel"}
)

// Signers lists all keys.
var Signers = []Signer{Holm, HolmNew, Brand, Sand, Deverel}

// Private gives the test key.
func (s Signer) Private() ed25519.PrivateKey {
	seed := sha256.Sum256([]byte("speedtrail demonstration key " + s.Key))
	return ed25519.NewKeyFromSeed(seed[:])
}

// SSH gives the test key for signing.
func (s Signer) SSH() (ssh.Signer, error) { return ssh.NewSignerFromKey(s.Private()) }

// PEM gives the test key as a file that ssh-keygen reads. Its bytes differ from
// call to call.
func (s Signer) PEM() ([]byte, error) {
	block, err := ssh.MarshalPrivateKey(s.Private(), s.Key+" (demonstration, not secret)")
	if err != nil {
		return nil, err
	}
	return pem.EncodeToMemory(block), nil
}

// line writes the line of allowed_signers.
func (s Signer) line(options string) string {
	key, err := s.SSH()
	if err != nil {
		panic(err) // a key of 32 bytes is always one
	}
	public := strings.TrimSpace(string(ssh.MarshalAuthorizedKey(key.PublicKey())))
	if options != "" {
		options += " "
	}
	return fmt.Sprintf("%s %s%s\n", s.Principal, options, public)
}

// allowedSigners is the file at the beginning, and after Holm has got a new key.
func allowedSigners(rotated bool) string {
	text := "# Who may sign what off, by key. See signoff.toml for the roles.\n"
	if !rotated {
		text += Holm.line("")
	} else {
		text += Holm.line(`valid-before="20250801Z"`) + HolmNew.line(`valid-after="20250801Z"`)
	}
	return text + Brand.line("") + Sand.line("") + Deverel.line("")
}

// Signing is a decision of the demonstration's history.
type Signing struct {
	Base, Target           string // tags of the assessment
	Role, Decision, Reason string
	By                     Signer
	When                   time.Time
	Refused                bool // it is tried and must be refused
}

// Anchoring is who signs the anchor, at release-2025.1.
var Anchoring = []struct {
	Role string
	By   Signer
}{{"checker", Holm}, {"approver", Brand}, {"in-service", Sand}}

// AnchorTime is when the anchor was recorded.
var AnchorTime = at("2025-03-04T09:00")

// Signings is the year's sign-offs: the second release was first signed by
// somebody who had prepared it, and refused; nobody has approved the fourth.
var Signings = []Signing{
	{"release-2025.1", "release-2025.2", "checker", "approve", "recomputed, Ashling plain checked against BN-118", Holm, at("2025-06-03T10:00"), false},
	{"release-2025.1", "release-2025.2", "approver", "approve", "for the summer timetable", Brand, at("2025-06-04T08:30"), false},
	{"release-2025.2", "release-2025.3", "checker", "approve", "my own realignment, as built", Deverel, at("2025-08-05T09:00"), true},
	{"release-2025.2", "release-2025.3", "checker", "approve", "as-built survey of June seen", Holm, at("2025-08-05T16:00"), false},
	{"release-2025.2", "release-2025.3", "approver", "approve", "realignment in service", Brand, at("2025-08-06T14:00"), false},
	{"release-2025.3", "release-2025.4", "checker", "approve", "recanting checked against BN-131", HolmNew, at("2025-11-12T11:00"), false},
}

// Service is the year's log of what went into service.
var Service = []struct {
	Tag, Reason string
	Since, When time.Time
}{
	{"release-2025.1", "the register of line speeds comes into use", at("2025-03-10T03:00"), at("2025-03-07T12:00")},
	{"release-2025.2", "summer timetable", at("2025-06-15T03:00"), at("2025-06-11T12:00")},
	{"release-2025.3", "realignment opened", at("2025-08-11T03:00"), at("2025-08-08T12:00")},
	{"release-2025.4", "winter timetable", at("2025-12-14T03:00"), at("2025-12-10T12:00")},
}
