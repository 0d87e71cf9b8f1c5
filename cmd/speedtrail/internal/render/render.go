// Package render writes what a reader sees: assessments and profiles as text,
// HTML, Markdown, CSV, JSON and SVG. It computes nothing about speeds; it
// arranges and words a document.
//
// All data is hostile until written: HTML goes through html/template, cells that
// a spreadsheet could take for a formula are made harmless, control codes and
// invisible marks come out as escapes. The same document gives the same bytes.
package render

import (
	"fmt"
	"strconv"
	"strings"

	"speedtrail/history/assessment"
	"speedtrail/schema/unit"
)

// Caution stands in every report, every help text and the README.
const Caution = "speedtrail is an aid to review. It is not a safety-approved tool and does not authorise a speed. " +
	"Its results must be checked by competent persons under the infrastructure manager's rules and the applicable " +
	"national rules and standards; those always take precedence."

// Record is what the ledger knows about an assessment; zero for one that is not
// recorded.
type Record struct {
	Blocks     []string  `json:"blocks"` // what keeps it from being approved
	Digest     string    `json:"digest"`
	Ledger     string    `json:"ledger"`  // id
	Missing    []string  `json:"missing"` // roles that lack people
	Number     int64     `json:"number"`
	SignOffs   []SignOff `json:"sign_offs"`
	State      string    `json:"state"`      // open, partly signed, approved, rejected
	Superseded int64     `json:"superseded"` // by another approved assessment from the same base; 0: no
}

// SignOff is a decision that somebody signed.
type SignOff struct {
	Assessment  int64  `json:"assessment"` // of the same content; a rejection of another assessment counts as well
	Command     string `json:"command"`    // that checks it with no other tool
	Decision    string `json:"decision"`
	Entry       int64  `json:"entry"`
	Fingerprint string `json:"key"`
	// Elsewhere is null where no older folder of the ledger knows the signer without
	// this key.
	Elsewhere *Elsewhere `json:"key_elsewhere" jsonschema:"nullable"`
	Reason    string     `json:"reason"`
	// Revoked is null while the key is in use.
	Revoked   *Revocation `json:"key_revoked" jsonschema:"nullable"`
	Role      string      `json:"role"`
	Signature string      `json:"signature"`
	Signer    string      `json:"signer"`
	Statement string      `json:"statement"`
	Time      string      `json:"time"` // as the signer states it
}

// Style is how text looks where it goes to.
type Style struct {
	Width int
	Color bool
	Brief bool // what decides only: verdict, findings, trains
	// Advise, if given, completes the calls of this program that a text advises, so
	// that they are about the same repository and ledger.
	Advise func(text string) string
}

func (s *Style) advise(text string) string {
	if s.Advise == nil {
		return text
	}
	return s.Advise(text)
}

// km writes millimetres as kilometres.
func km(mm int64) string { return unit.Distance(mm).KM() }

// metres writes millimetres as metres.
func metres(mm int64) string { return unit.Distance(mm).M() }

// signed writes a number with its sign, minus as a minus sign.
func signed(n int) string {
	switch {
	case n > 0:
		return "+" + strconv.Itoa(n)
	case n < 0:
		return "\u2212" + strconv.Itoa(-n)
	}
	return "0"
}

// minus writes a position with a minus sign for a reader.
func minus(s string) string { return strings.Replace(s, "-", "\u2212", 1) }

func itoa(n int) string { return strconv.Itoa(n) }

func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + many
}

// short gives the part of a hash that people compare.
func short(hash string) string { return hash[:min(len(hash), 10)] }

// revisionName names a side: as it was typed, with a tag or branch and the hash.
func revisionName(typed, name string, r assessment.Revision) string {
	switch {
	case r.Commit == "":
		return "the working tree (not committed)"
	case name != "":
		return name + " (" + short(r.Commit) + ")"
	case strings.HasPrefix(r.Commit, typed):
		return short(r.Commit)
	}
	return typed + " (" + short(r.Commit) + ")"
}

// trainNames lists the ids of trains, all of them or the first few.
func trainNames(c *assessment.Computed, trains []int, most int) string {
	var names []string
	for _, i := range trains {
		names = append(names, c.Trains[i].ID)
	}
	return fewNames(names, most)
}

// fewNames lists names, all of them or the first few.
func fewNames(names []string, most int) string {
	if most > 0 && len(names) > most+1 { // "and 1 more" is no shorter than its name
		return strings.Join(names[:most], ", ") + fmt.Sprintf(" and %d more", len(names)-most)
	}
	return strings.Join(names, ", ")
}
