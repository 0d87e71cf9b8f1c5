package main

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"strings"

	"github.com/jedib0t/go-pretty/v6/table"
	"github.com/jedib0t/go-pretty/v6/text"
	"github.com/spf13/cobra"

	"speedtrail/history"
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
	Number   int64    `json:"number"`
	Recorded string   `json:"recorded"`
	State    string   `json:"state"`
	SignOffs []string `json:"sign_offs"` // "approve checker m.okoro@harbourline.example"
	Base     string   `json:"base"`
	Target   string   `json:"target"`
	Folder   string   `json:"folder"`
	Dataset  string   `json:"dataset"`
	Requests []string `json:"requests"`
	Changes  int64    `json:"speed_changes"`
	Findings int64    `json:"findings"`
	Digest   string   `json:"digest"`
	Entry    string   `json:"entry"` // SEQ:HASH
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
	line, _, err := history.ReadLine(ctx, l)
	if err != nil {
		return err
	}
	head := line.Head()
	return a.write(func(w io.Writer) error {
		if a.format == "json" {
			list := make([]registered, len(rows))
			for i, r := range rows {
				list[i] = registered{
					Number: r.Number, Recorded: r.Time, State: line.State(r.Number).Word, SignOffs: signedBy(line, r.Number), Base: r.Base, Target: r.Target, Folder: r.Folder,
					Dataset: r.Dataset, Requests: r.Requests, Changes: r.Changes, Findings: r.Findings, Digest: r.Digest,
					Entry: r.Entry.String(),
				}
			}
			e := json.NewEncoder(w)
			e.SetIndent("", "  ")
			return e.Encode(struct {
				Format      string       `json:"format"`
				Ledger      string       `json:"ledger"`
				Head        string       `json:"head"`
				Assessments []registered `json:"assessments"`
			}{"speedtrail-register 1", l.ID(), head.String(), list})
		}
		return a.printRegister(w, l, line, rows, head.String())
	})
}

func (a *app) printRegister(w io.Writer, l *ledger.Ledger, line *approval.Line, rows []ledger.AssessmentRow, head string) error {
	if len(rows) == 0 {
		_, err := fmt.Fprintf(w, "No assessment is recorded yet. Record one with: speedtrail assess BASE TARGET\nhead of the ledger %s\n", head)
		return err
	}
	t := table.NewWriter()
	t.SetStyle(table.StyleLight)
	t.Style().Options.DrawBorder = false
	t.Style().Options.SeparateColumns = false
	t.Style().Format.Header = text.FormatDefault
	t.AppendHeader(table.Row{"no.", "recorded (UTC)", "state", "base", "target", "requests", "changes", "findings", "signed"})
	for _, r := range rows {
		requests := strings.Join(r.Requests, ", ")
		if requests == "" {
			requests = "none"
		}
		t.AppendRow(table.Row{
			r.Number, strings.Replace(strings.TrimSuffix(r.Time, "Z"), "T", " ", 1), line.State(r.Number).Word, short(r.Base), short(r.Target),
			source.Visible(requests), r.Changes, r.Findings, source.VisibleLines(strings.Join(signedBy(line, r.Number), "\n")),
		})
	}
	t.SetColumnConfigs([]table.ColumnConfig{{Number: 6, WidthMax: 24, WidthMaxEnforcer: text.WrapSoft}})
	_, err := fmt.Fprintf(w, "%s\n\nledger %s, head %s\nnext: speedtrail report %d --out report.html\n", t.Render(), l.ID(), head, rows[0].Number)
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
