package render

import (
	"encoding/base64"
	"fmt"
	"html/template"
	"path"
	"slices"
	"strings"
	"time"

	"speedtrail/schema/source"
)

// VerifyCommand writes the command that checks a signature with ssh-keygen alone,
// at the time that the signer states.
func VerifyCommand(signer string, at time.Time) string {
	return fmt.Sprintf("ssh-keygen -Y verify -f allowed_signers -I '%s' -n speedtrail-signoff -O verify-time=%s -s statement.sig < statement", signer, at.UTC().Format("20060102150405Z"))
}

// inLines cuts such a command into lines that are short enough to be printed whole,
// and to be copied from what was printed.
func inLines(command string) string {
	for _, option := range []string{" -I ", " -n ", " -s "} {
		command = strings.Replace(command, option, " \\\n "+option, 1)
	}
	return command
}

// BlockWords says what keeps an assessment from being approved.
func BlockWords(blocks []string) string {
	var parts []string
	for _, b := range blocks {
		id, rest, _ := strings.Cut(b, ": ")
		switch id {
		case "base-not-approved":
			b = "its base is not approved (base-not-approved)"
		case "base-not-ancestor":
			b = "its base is not part of its history (base-not-ancestor)"
		case "unknown-preparer":
			b = "nobody knows who prepared it (unknown-preparer): " + rest
		case "no policy is anchored":
			b = "no policy is anchored (speedtrail anchor puts one in force)"
		}
		parts = append(parts, b)
	}
	return strings.Join(parts, "; ")
}

// stateWords says where an assessment stands, with what is missing.
func stateWords(r Record) string {
	s := r.State
	if len(r.Missing) > 0 && (r.State == "open" || r.State == "partly signed") {
		s += "; still to sign: " + strings.Join(r.Missing, ", ")
	}
	if len(r.Blocks) > 0 {
		s += "; kept from approval: " + BlockWords(r.Blocks)
	}
	if r.Superseded != 0 {
		s += fmt.Sprintf("; superseded by assessment %d", r.Superseded)
	}
	return s + reviewWords(r)
}

// reviewWords follows the state where a signature behind it is by a key that was
// revoked later, or by one that another folder does not have for its name: whoever
// reads the state only has to learn of it.
func reviewWords(r Record) string {
	words := ""
	if slices.ContainsFunc(r.SignOffs, func(x SignOff) bool { return x.Revoked != nil }) {
		words += "; ! signed with a key that was revoked later"
	}
	if slices.ContainsFunc(r.SignOffs, func(x SignOff) bool { return x.Elsewhere != nil }) {
		words += "; ! signed with a key that an older folder of this ledger does not have for the name"
	}
	return words
}

// signedWords words a decision.
func signedWords(r Record, s SignOff) string {
	text := fmt.Sprintf("%s as %s by %s at %s: %s", s.Decision, s.Role, s.Signer, s.Time, s.Reason)
	if s.Assessment != r.Number {
		text += fmt.Sprintf(" (on assessment %d, which has the same content)", s.Assessment)
	}
	return text
}

// signOffs lists the decisions in the terminal.
func (p *textWriter) signOffs() {
	if p.r.Number == 0 {
		return
	}
	p.heading("Sign-off")
	p.paragraph("", stateWords(p.r))
	for _, s := range p.r.SignOffs {
		p.paragraph("  ", signedWords(p.r, s))
		p.paragraph("    ", s.keyWords())
	}
}

type pageSigned struct {
	Words, Key, Statement, Signature, Command string
	// The bytes that were signed, and their signature: what is copied from a page lacks
	// the last line feed, and marks that nobody sees are shown by their numbers there.
	StatementFile, SignatureFile template.URL
}

// fileURL holds a file for a page that asks the network for nothing.
func fileURL(content string) template.URL {
	return template.URL("data:application/octet-stream;base64," + base64.StdEncoding.EncodeToString([]byte(content)))
}

func (p *page) fillSigned() {
	if p.R.Number == 0 {
		return
	}
	p.Standing = source.Visible(stateWords(p.R))
	p.SignersCommand = source.Visible("git show " + shellWord(p.C.Base.Commit+":"+path.Join(p.C.Folder, "allowed_signers")))
	for _, s := range p.R.SignOffs {
		p.Signed = append(p.Signed, pageSigned{
			Words: source.Visible(signedWords(p.R, s)), Key: source.Visible(s.keyWords()),
			Statement: source.VisibleLines(s.Statement), Signature: source.VisibleLines(s.Signature), Command: source.VisibleLines(inLines(s.Command)),
			StatementFile: fileURL(s.Statement), SignatureFile: fileURL(s.Signature),
		})
	}
}
