// Package chain links the entries of a ledger by hashes. It knows no SQL and no
// Git; anyone can do the same in any language.
//
// An entry has a number, a time, a kind and a body. Its hash is
//
//	SHA-256("speedtrail-entry 1\n" seq "\n" time "\n" kind "\n" hex(SHA-256(body)) "\n" previous "\n")
//
// in lower-case hex, where seq is decimal and counts from 1, time is
// YYYY-MM-DDTHH:MM:SSZ, and previous is the hash of the entry before, 64 zeros
// for the first. The body is RFC 8785 JSON; the stored bytes are hashed, never
// a re-serialisation.
//
// A chain finds an entry that was altered, inserted, reordered or removed from
// the middle. It cannot find entries that were removed from its end, nor a chain
// that somebody made anew as a whole: against those help a head that was noted
// elsewhere, and signatures.
package chain

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"regexp"
	"strconv"
	"strings"
	"time"
)

// Kind is the kind of an entry.
type Kind string

// The kinds of entry that this version writes.
const (
	Ledger     Kind = "ledger" // the first: a random 128-bit id
	Assessment Kind = "assessment"
	Anchor     Kind = "anchor"   // puts a policy in force as the root of the line of approval
	SignOff    Kind = "sign-off" // a decision on an assessment
	InForce    Kind = "in-force" // a revision went into service
	Revocation Kind = "revocation"
)

// TimeLayout is the form of an entry's time, always UTC.
const TimeLayout = "2006-01-02T15:04:05Z"

// Origin is the hash that the first entry names as the one before it.
const Origin = "0000000000000000000000000000000000000000000000000000000000000000"

// Entry is a link of the chain.
type Entry struct {
	Seq      int64
	Time     string
	Kind     Kind
	Body     []byte
	Previous string
	Hash     string
}

// Head is the number and hash of an entry, by which a state of a chain is
// noted. The zero Head is that of an empty chain.
type Head struct {
	Seq  int64
	Hash string
}

// String writes "SEQ:HASH".
func (h Head) String() string { return strconv.FormatInt(h.Seq, 10) + ":" + h.Hash }

var hashForm = regexp.MustCompile(`^[0-9a-f]{64}$`)

// IsHash tells whether a text has the form of an entry's hash.
func IsHash(s string) bool { return hashForm.MatchString(s) }

// ParseHead reads "SEQ:HASH".
func ParseHead(s string) (Head, error) {
	seq, hash, _ := strings.Cut(s, ":")
	n, err := strconv.ParseInt(seq, 10, 64)
	if err != nil || n < 1 || strconv.FormatInt(n, 10) != seq || !hashForm.MatchString(hash) {
		return Head{}, fmt.Errorf("%q is no head, write SEQ:HASH with 64 lower-case hex digits", s)
	}
	return Head{n, hash}, nil
}

// Head gives the head of a chain that ends with the entry.
func (e Entry) Head() Head { return Head{e.Seq, e.Hash} }

// Next makes the entry that follows a head.
func Next(head Head, t time.Time, kind Kind, body []byte) Entry {
	e := Entry{Seq: head.Seq + 1, Time: t.UTC().Format(TimeLayout), Kind: kind, Body: body, Previous: head.Hash}
	if head.Seq == 0 {
		e.Previous = Origin
	}
	e.Hash = e.sum()
	return e
}

// sum computes the entry's hash.
func (e Entry) sum() string {
	body := sha256.Sum256(e.Body)
	link := sha256.New()
	fmt.Fprintf(link, "speedtrail-entry 1\n%d\n%s\n%s\n%s\n%s\n", e.Seq, e.Time, e.Kind, hex.EncodeToString(body[:]), e.Previous)
	return hex.EncodeToString(link.Sum(nil))
}

// The ways in which an entry does not follow a head.
var (
	ErrSequence = errors.New("is not the next number")
	ErrPrevious = errors.New("does not name the hash of the entry before it")
	ErrTime     = errors.New("has a time that is not written YYYY-MM-DDTHH:MM:SSZ")
	ErrHash     = errors.New("does not have the hash of its content")
)

// Check proves that an entry follows a head. The error names the entry.
func Check(head Head, e Entry) error {
	previous := head.Hash
	if head.Seq == 0 {
		previous = Origin
	}
	t, err := time.Parse(TimeLayout, e.Time)
	var problem error
	switch {
	case e.Seq != head.Seq+1:
		problem = ErrSequence
	case e.Previous != previous:
		problem = ErrPrevious
	case err != nil || t.Format(TimeLayout) != e.Time:
		problem = ErrTime
	case e.Hash != e.sum():
		problem = ErrHash
	default:
		return nil
	}
	return fmt.Errorf("entry %d %w", e.Seq, problem)
}
