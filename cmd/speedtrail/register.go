package main

import (
	"context"
	"fmt"
	"io"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/ledger"
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
	SignOffs []string                `json:"sign_offs"` // "approve checker m.okoro@harbourline.example"
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
	Format      string       `json:"format"`
	Ledger      string       `json:"ledger"`      // id
	Head        string       `json:"head"`        // SEQ:HASH
	Assessments []registered `json:"assessments"` // the newest first
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
					Number: r.Number, Recorded: r.Time, State: line.State(r.Number).Word, SignOffs: signedBy(line, r.Number), Revoked: revokedOf(line, line.State(r.Number).Signed), Base: r.Base, Target: r.Target, Folder: r.Folder,
					Dataset: r.Dataset, Requests: r.Requests, Changes: r.Changes, Findings: r.Findings, Digest: r.Digest,
					Entry: r.Entry.String(),
				}
			}
			return indentedJSON(w, registerList{"speedtrail-register 1", l.ID(), head.String(), list})
		}
		return a.printRegister(w, l, line, rows, head.String())
	})
}

func (a *app) printRegister(w io.Writer, l *ledger.Ledger, line *approval.Line, rows []ledger.AssessmentRow, head string) error {
	if len(rows) == 0 {
		_, err := fmt.Fprintf(w, "No assessment is recorded yet. Record one with: %s\nhead %s\n", source.Visible(a.advise("speedtrail assess BASE TARGET")), head)
		return err
	}
	width := a.style().Width
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
			fmt.Sprintf("%s to %s, %s, folder %s", short(r.Base), short(r.Target), source.Visible(r.Dataset), source.Visible(r.Folder)),
			source.Visible(requests),
			fmt.Sprintf("speed changes %d, findings %d", r.Changes, r.Findings),
		}
		for _, x := range state.Signed {
			text := fmt.Sprintf("%s as %s by %s, %s", x.Decision, x.Role, x.Signer, x.Time.UTC().Format(time.DateOnly))
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
	_, err := fmt.Fprintf(w, "\nledger %s\nhead %s\nnext: %s\n", l.ID(), head, source.Visible(a.advise(fmt.Sprintf("speedtrail report %d --out report.html", rows[0].Number))))
	return err
}

// signedBy lists the decisions on an assessment.
func signedBy(line *approval.Line, number int64) []string {
	list := []string{}
	for _, r := range line.State(number).Signed {
		list = append(list, r.Decision+" "+r.Role+" "+r.Signer)
	}
	return list
}

// short gives the part of a hash that people compare.
func short(hash string) string { return hash[:min(len(hash), 10)] }
