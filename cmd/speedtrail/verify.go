package main

import (
	"context"
	"errors"
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/schema/source"
)

func (a *app) verifyCommand() *cobra.Command {
	var against, anchors []string
	var ledgerOnly bool
	c := &cobra.Command{
		Use:   "verify",
		Short: "prove that nothing in the ledger was altered",
		Long: `verify re-derives everything: the chain of the entries, the tables against the
entries, every signature against the policy of its time, and every assessment
against Git. It says what was proved, what was not, and why. Exit status 1 if
anything is wrong, 3 if there is no ledger in the place. An assessment for which
the clone lacks a commit is left open while nobody has signed it, and else wrong.

The chain cannot show that its end was removed, or that the whole was made anew:
--against SEQ:HASH, a head that was noted elsewhere, does. Commit authors and times
are claims.`,
		Example: `  speedtrail verify
  speedtrail verify --against 17:4be1...`,
		Args: arguments(0, 0),
		RunE: func(c *cobra.Command, _ []string) error {
			o := history.VerifyOptions{Anchors: anchors}
			for _, s := range against {
				h, err := chain.ParseHead(s)
				if err != nil {
					return badCall("a head is printed after every write, and by register", "%v", err)
				}
				o.Against = append(o.Against, h)
			}
			for _, s := range anchors {
				if !chain.IsHash(s) {
					return badCall("the hash of an anchor is printed when it is recorded", "%q is no hash of 64 lower-case hexadecimal digits", s)
				}
			}
			if !ledgerOnly {
				o.Checker = &checker{a}
			}
			return a.verify(c.Context(), o)
		},
	}
	a.outputFlags(c, "text", "json")
	c.Flags().StringArrayVar(&against, "against", nil, "a head `SEQ:HASH` that was noted elsewhere (repeatable)")
	c.Flags().StringArrayVar(&anchors, "anchor", nil, "the `hash` of an anchor that was noted elsewhere (repeatable)")
	c.Flags().BoolVar(&ledgerOnly, "ledger-only", false, "hold nothing against Git")
	return c
}

// verified is the JSON form of a verification.
type verified struct {
	Format   string            `json:"format"`
	Ledger   string            `json:"ledger"`
	Head     string            `json:"head"`
	Good     bool              `json:"good"`
	Problems []verifiedProblem `json:"problems"`
	Proved   []string          `json:"proved"`
	Unproved []string          `json:"not_proved"`
}

type verifiedProblem struct {
	Entry int64  `json:"entry"` // 0: the ledger as a whole
	Kind  string `json:"kind"`
	Text  string `json:"text"`
}

func (a *app) verify(ctx context.Context, o history.VerifyOptions) error {
	l, err := a.openLedger(ctx, false)
	if errors.Is(err, ledger.ErrForeign) || errors.Is(err, ledger.ErrDamaged) {
		// That the file is not as it was made is what verify is asked for; nothing
		// else in it can be relied on.
		r := &history.Result{Problems: []history.Problem{{Kind: "file", Text: err.Error()}}}
		if err := a.writeVerification(r, ""); err != nil {
			return err
		}
		return errFindings
	}
	if err != nil {
		return err
	}
	defer l.Close()
	o.Progress = a.progress("computing assessments anew")
	r, err := history.Verify(ctx, l, o)
	if err != nil {
		return err
	}
	if err := a.writeVerification(r, l.ID()); err != nil {
		return err
	}
	if !r.Good() {
		return errFindings
	}
	return nil
}

// writeVerification writes a result; the id is empty where the ledger could not
// be read.
func (a *app) writeVerification(r *history.Result, id string) error {
	head := ""
	if r.Head.Seq > 0 {
		head = r.Head.String()
	}
	out := verified{Format: "speedtrail-verification 1", Ledger: id, Head: head, Good: r.Good(), Problems: []verifiedProblem{}, Proved: append([]string{}, r.Proved...), Unproved: append([]string{}, r.Unproved...)}
	if id != "" {
		r.Unproved = append(r.Unproved, "whether what went into service was approved; speedtrail inforce says that")
		out.Unproved = append([]string{}, r.Unproved...)
	}
	for _, p := range r.Problems {
		out.Problems = append(out.Problems, verifiedProblem{p.Entry, p.Kind, p.Text})
	}
	return a.write(func(w io.Writer) error {
		if a.format == "json" {
			return indentedJSON(w, out)
		}
		return printVerification(w, r, id, a.style().Width)
	})
}

func printVerification(w io.Writer, r *history.Result, id string, width int) error {
	verdict := "Nothing is wrong."
	if n := len(r.Problems); n == 1 {
		verdict = "1 thing is wrong."
	} else if n > 1 {
		verdict = fmt.Sprintf("%d things are wrong.", n)
	}
	fmt.Fprintf(w, "%s\n\n", verdict)
	for _, p := range r.Problems {
		fmt.Fprintf(w, "%s\n", render.Hanging("! "+source.Visible(p.String()), width, "  "))
	}
	for _, s := range r.Proved {
		fmt.Fprintf(w, "%s\n", render.Hanging("proved: "+source.Visible(s), width, "  "))
	}
	for _, s := range r.Unproved {
		fmt.Fprintf(w, "%s\n", render.Hanging("left open: "+source.Visible(s), width, "  "))
	}
	if id == "" {
		return nil
	}
	fmt.Fprintf(w, "\nledger %s\n", id)
	if r.Head.Seq == 0 { // it was not reached
		return nil
	}
	_, err := fmt.Fprintf(w, "head %s\n", r.Head)
	return err
}
