package main

import (
	"context"
	"fmt"
	"io"
	"maps"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
	"speedtrail/schema/source"
)

func (a *app) registerCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "register",
		Short: "the register of recorded assessments, newest first",
		Args:  arguments(0, 0),
		RunE:  func(c *cobra.Command, _ []string) error { return a.register(c.Context()) },
	}
	a.outputFlags(c, "text", "json")
	return c
}

// registered is the JSON form of a line of the register.
type registered struct {
	Number   int64                   `json:"number"`
	Recorded string                  `json:"recorded"`
	State    string                  `json:"state"`
	SignOffs []string                `json:"sign_offs"` // "approve checker m.okoro@harbourline.example"; " on assessment 3" behind the rejection of the same content there
	Revoked  []render.RevokedSignOff `json:"revoked"`   // of sign_offs, those by keys that were revoked later
	Base     string                  `json:"base"`
	Target   string                  `json:"target"`
	Folder   string                  `json:"folder"`
	Dataset  string                  `json:"dataset"`
	Requests []string                `json:"requests"`
	Changes  int64                   `json:"speed_changes"`
	Findings int64                   `json:"findings"`
	Digest   string                  `json:"digest"`
	Entry    string                  `json:"entry"` // SEQ:HASH
}

// registerList is the JSON form of the register.
type registerList struct {
	Format      string             `json:"format"`
	Ledger      string             `json:"ledger"`      // id
	Head        string             `json:"head"`        // SEQ:HASH
	Anchors     []registeredAnchor `json:"anchors"`     // by folder
	Assessments []registered       `json:"assessments"` // the newest first
}

// registeredAnchor is the JSON form of the root of a folder's line of approval.
type registeredAnchor struct {
	Folder   string                  `json:"folder"`
	Revision string                  `json:"revision"`
	Recorded string                  `json:"recorded"`
	Entry    string                  `json:"entry"`     // SEQ:HASH; verify --anchor takes the hash
	SignOffs []string                `json:"sign_offs"` // "checker m.okoro@harbourline.example"
	Revoked  []render.RevokedSignOff `json:"revoked"`   // of sign_offs, those by keys that were revoked later
	Reasons  []string                `json:"reasons"`   // of sign_offs
}

func anchorsOf(line *approval.Line) []registeredAnchor {
	list := []registeredAnchor{}
	anchors := line.Anchors()
	for _, folder := range slices.Sorted(maps.Keys(anchors)) {
		x := anchors[folder]
		out := registeredAnchor{folder, x.Revision, x.Records[0].Recorded.UTC().Format(signoff.TimeLayout), x.Entry.String(), anchoredBy(line, x), revokedOf(line, x.Records), []string{}}
		for _, r := range x.Records {
			out.Reasons = append(out.Reasons, r.Reason)
		}
		list = append(list, out)
	}
	return list
}

// printAnchors writes where the lines of approval begin: the hash is what an auditor
// compares with one that was noted elsewhere.
func printAnchors(w io.Writer, line *approval.Line, width int) {
	for _, x := range anchorsOf(line) {
		seq, hash, _ := strings.Cut(x.Entry, ":")
		by := render.WithRevoked(x.SignOffs, x.Revoked)
		fmt.Fprintf(w, "%s\n", render.Hanging(source.Visible(fmt.Sprintf("anchor of the folder %s: commit %s, recorded %s as entry %s, signed by %s (%s)", x.Folder, x.Revision, x.Recorded, seq, joined(by), x.Reasons[0])), width, "  "))
		fmt.Fprintf(w, "  verify --anchor %s\n\n", hash)
	}
}

func (a *app) register(ctx context.Context) error {
	l, err := a.openLedger(ctx, false)
	if err != nil {
		return err
	}
	defer l.Close()
	rows, err := l.Assessments(ctx)
	if err != nil {
		return err
	}
	line, err := a.readLine(ctx, l)
	if err != nil {
		return err
	}
	for _, r := range rows {
		if x := line.Assessment(r.Number); x != nil && x.Entry != r.Entry {
			return misled(r.Number)
		}
	}
	head := line.Head()
	return a.write(func(w io.Writer) error {
		if a.format == "json" {
			list := make([]registered, len(rows))
			for i, r := range rows {
				list[i] = registered{
					Number: r.Number, Recorded: r.Time, State: line.State(r.Number).Word, SignOffs: signedBy(line, r.Number), Revoked: revokedOf(line, decisionsOn(line.State(r.Number), r.Number)), Base: r.Base, Target: r.Target, Folder: r.Folder,
					Dataset: r.Dataset, Requests: r.Requests, Changes: r.Changes, Findings: r.Findings, Digest: r.Digest,
					Entry: r.Entry.String(),
				}
			}
			return indentedJSON(w, registerList{"speedtrail-register 1", l.ID(), head.String(), anchorsOf(line), list})
		}
		return a.printRegister(w, l, line, rows, head.String())
	})
}

func (a *app) printRegister(w io.Writer, l *ledger.Ledger, line *approval.Line, rows []ledger.AssessmentRow, head string) error {
	width := a.style().Width
	if len(rows) == 0 {
		printAnchors(w, line, width)
		_, err := fmt.Fprintf(w, "No assessment is recorded yet. Record one with: %s\nhead %s\n", source.Visible(a.advise("speedtrail assess BASE TARGET")), head)
		return err
	}
	for i, r := range rows {
		if i > 0 {
			fmt.Fprintln(w)
		}
		state := line.State(r.Number)
		fmt.Fprintf(w, "%4d  %s UTC  %s\n", r.Number, strings.Replace(strings.TrimSuffix(r.Time, "Z"), "T", " ", 1), state.Word)
		requests := "no change request"
		if len(r.Requests) > 0 {
			requests = strings.Join(r.Requests, ", ")
		}
		lines := []string{
			source.Visible(a.named(r.Base) + " to " + a.named(r.Target)),
			source.Visible(r.Dataset + ", folder " + r.Folder),
			source.Visible(requests),
			fmt.Sprintf("speed changes %d, findings %d", r.Changes, r.Findings),
		}
		for _, x := range decisionsOn(state, r.Number) {
			text := fmt.Sprintf("%s as %s by %s, %s", x.Decision, x.Role, x.Signer, x.Time.UTC().Format(time.DateOnly))
			if x.Assessment != r.Number {
				text += fmt.Sprintf(" (on assessment %d, which has the same content)", x.Assessment)
			}
			text += elsewhereBehind(line, x)
			if revoked := revocationOf(line, x.Fingerprint); revoked != nil {
				text += " (! " + revoked.Short() + ")"
			}
			lines = append(lines, source.Visible(text))
		}
		if len(state.Missing) > 0 && state.Word != approval.Rejected {
			lines = append(lines, "still to sign: "+joined(state.Missing))
		}
		if len(state.Blocks) > 0 {
			lines = append(lines, "kept from approval: "+source.Visible(render.BlockWords(state.Blocks)))
		}
		if state.Superseded != 0 {
			lines = append(lines, fmt.Sprintf("superseded by assessment %d", state.Superseded))
		}
		for _, text := range lines {
			fmt.Fprintf(w, "      %s\n", render.Hanging(text, width, "      "))
		}
	}
	for _, r := range line.Revocations() {
		fmt.Fprintf(w, "\n%s\n", render.Hanging(source.Visible(fmt.Sprintf("key %s is out of use since entry %d, %s: %s", r.Key, r.Entry.Seq, r.Signer, r.Reason)), width, "  "))
		for _, text := range toReview(line, r.Key) {
			fmt.Fprintf(w, "      %s\n", render.Hanging(text, width, "      "))
		}
	}
	fmt.Fprintln(w)
	printAnchors(w, line, width)
	_, err := fmt.Fprintf(w, "ledger %s\nhead %s\nnext: %s\n", l.ID(), head, source.Visible(a.advise(fmt.Sprintf("speedtrail report %d --out report.html", rows[0].Number))))
	return err
}

// decisionsOn gives the decisions that the state of an assessment comes from: those on
// it, and rejections of the same content on another one.
func decisionsOn(s approval.State, number int64) []approval.Record {
	list := slices.Clone(s.Signed)
	for _, r := range s.RejectedBy {
		if r.Assessment != number {
			list = append(list, r)
		}
	}
	return list
}

// signedBy lists these decisions.
func signedBy(line *approval.Line, number int64) []string {
	list := []string{}
	for _, r := range decisionsOn(line.State(number), number) {
		text := r.Decision + " " + r.Role + " " + r.Signer
		if r.Assessment != number {
			text += fmt.Sprintf(" on assessment %d", r.Assessment)
		}
		text += elsewhereBehind(line, r)
		list = append(list, text)
	}
	return list
}

// named writes a commit that the ledger names: the part of its hash that people compare,
// and a tag that the repository has for it now. A ledger can be read without a repository.
func (a *app) named(hash string) string {
	if a.tags == nil {
		a.tags = map[string]string{}
		if repo, err := a.openRepo(); err == nil {
			a.tags = repo.Tags()
			repo.Close()
		}
	}
	tag := a.tags[hash]
	switch {
	case tag == "":
		return short(hash)
	case strings.ContainsAny(tag, "(),;"):
		tag = source.Quote(tag) // it shall not pass for words of ours
	}
	return short(hash) + " (" + tag + ")"
}

// short gives the part of a hash that people compare.
func short(hash string) string { return hash[:min(len(hash), 10)] }
