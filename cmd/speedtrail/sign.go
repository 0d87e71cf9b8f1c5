package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/crypto/ssh"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

func (a *app) signCommand() *cobra.Command {
	var s signing
	c := &cobra.Command{
		Use:   "sign ID --role R --decision approve|reject --reason TEXT --key FILE",
		Short: "sign an assessment off",
		Long: `sign computes an assessment anew from Git, refuses it if anything differs, shows
what will be signed, asks, and records an OpenSSH signature over a statement in
plain text. Who may sign in which role is read from the policy of the base
revision, whose data has to be approved itself (speedtrail anchor is the root).

A statement can be signed elsewhere: --write FILE writes it, ssh-keygen -Y sign
-n speedtrail-signoff FILE signs it, --statement FILE --signature FILE.sig
brings both back and records it without a question.`,
		Example: `  speedtrail sign 3 --role checker --decision approve --reason "checked against BN-144" --key ~/.ssh/id_ed25519
  speedtrail sign 3 --role approver --decision reject --reason "km 12.4 is wrong" --agent --signer m.okoro@harbourline.example`,
		Args: arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			number, err := assessmentNumber(args[0])
			if err != nil {
				return err
			}
			if err := s.alone(c); err != nil {
				return err
			}
			if err := s.check(); err != nil {
				return err
			}
			if s.statement == "" && (s.role == "" || s.decision == "") {
				return badCall("for example --role checker --decision approve", "--role and --decision are needed")
			}
			if s.decision != "" {
				if err := chosen("--decision", s.decision, signoff.Approve, signoff.Reject); err != nil {
					return err
				}
			}
			return a.sign(c.Context(), number, &s)
		},
	}
	s.flags(c)
	c.Flags().StringVar(&s.role, "role", "", "the role of the policy in which you sign")
	c.Flags().StringVar(&s.decision, "decision", "", "approve or reject")
	return c
}

// assessmentNumber reads the number of an assessment.
func assessmentNumber(text string) (int64, error) {
	n, err := strconv.ParseInt(text, 10, 64)
	if err != nil || n < 1 {
		return 0, badCall("speedtrail register lists the assessments", "%q is not the number of an assessment", text)
	}
	return n, nil
}

func (a *app) sign(ctx context.Context, number int64, s *signing) error {
	l, err := a.openLedgerFor(ctx, s.write == "")
	if err != nil {
		return err
	}
	defer l.Close()
	r, err := a.recorded(ctx, l, number)
	if err != nil {
		return err
	}
	if err := a.recompute(ctx, r.doc, r.Digest); err != nil {
		return err
	}
	var result *signed
	if s.statement != "" {
		result, err = s.broughtOn(number)
	} else {
		result, err = s.signOff(ctx, a, r)
	}
	if err != nil || result == nil {
		return err
	}
	if err := a.recordSigned(ctx, l, r.line, chain.SignOff, result); err != nil {
		return err
	}
	return a.remarkState(ctx, l, r.line, number)
}

// broughtOn reads a sign-off of an assessment that was signed elsewhere.
func (s *signing) broughtOn(number int64) (*signed, error) {
	result, err := s.brought()
	if err != nil {
		return nil, err
	}
	if st, err := signoff.Parse(result.statement); err == nil && st.Assessment != number {
		return nil, refused(fmt.Errorf("the statement is about assessment %d, not %d", st.Assessment, number))
	}
	return result, nil
}

// signOff shows what decides about an assessment, asks, and signs; it gives nothing
// where the statement is only written.
func (s *signing) signOff(ctx context.Context, a *app, r *recorded) (*signed, error) {
	if r.Policy.Parsed == nil {
		return nil, badCall("README.md has a whole signoff.toml; speedtrail anchor puts the first policy in force", "the base of assessment %d has no valid policy (signoff.toml and allowed_signers): nothing was recorded", r.Number)
	}
	policy, whose := r.policyFor(s.role)
	key, done, err := s.signerKey(ctx, a, policy, whose)
	if err != nil {
		return nil, err
	}
	defer done()
	statement := signoff.Statement{
		Kind: signoff.SignOff, Ledger: r.ledger, Assessment: r.Number, Digest: r.Digest, Base: r.Base, Target: r.Target, Folder: r.Folder, Rules: r.Rules,
		Policy: r.Policy.Hash, Findings: r.Findings, Role: s.role, Decision: s.decision, Reason: s.reason, Time: time.Now().UTC().Truncate(time.Second), Head: seen(r.line),
	}
	if err := s.complete(&statement, key, policy, whose); err != nil {
		return nil, inTargetOnly(err, key, r.Assessment)
	}
	if err := a.foresee(r.line, statement, key); err != nil {
		return nil, err
	}
	a.remarkEarlier(r, &statement)
	if err := a.showForSigning(r); err != nil {
		return nil, err
	}
	a.remarkRolesLost(r, &statement)
	return s.finish(ctx, a, statement, key)
}

// policyFor gives the policy by which somebody signs in a role, and says whose it is:
// that of the base, but for a role that only the policy in force has, or one that is
// rejected and asks on.
func (r *recorded) policyFor(role string) (policy *schema.Policy, whose string) {
	if r.Policy.Parsed.Role(role) != nil {
		return r.Policy.Parsed, "the base"
	}
	if p := r.line.Newest(r.Folder).Parsed; p != nil && p.Role(role) != nil {
		return p, newestPolicy
	}
	for _, p := range r.line.Rejected(r.Assessment) {
		if p.Parsed != nil && p.Parsed.Role(role) != nil {
			return p.Parsed, "the release that was rejected"
		}
	}
	return r.Policy.Parsed, "the base"
}

// remarkEarlier names the decisions that a new one of the same person in the same role
// takes the place of.
func (a *app) remarkEarlier(r *recorded, now *signoff.Statement) {
	for _, d := range r.line.SignOffs() {
		if d.Assessment == r.Number && d.Role == now.Role && d.Signer == now.Signer {
			a.remark("%s has signed as %s already, in entry %d: %s; the later decision counts", source.Visible(d.Signer), source.Visible(d.Role), d.Entry.Seq, source.Visible(d.Decision))
		}
	}
}

// remarkRolesLost names the roles that the signer cannot take any more once this is
// signed.
func (a *app) remarkRolesLost(r *recorded, now *signoff.Statement) {
	p := r.Policy.Parsed
	for _, role := range p.Roles {
		if role.Name != now.Role && p.Independent(role.Name, now.Role) && role.May(now.Signer) {
			a.remark("who signs as %s cannot sign this data as %s as well", source.Visible(now.Role), source.Visible(role.Name))
		}
	}
}

// inTargetOnly adds to a refusal that the key stands in the target's policy, which
// decides about the next change.
func inTargetOnly(err error, key ssh.Signer, x *approval.Assessment) error {
	var call *callError
	if key == nil || x.Next.Parsed == nil || !errors.As(err, &call) {
		return err
	}
	fingerprint := ssh.FingerprintSHA256(key.PublicKey())
	if k := x.Next.Parsed.Key(fingerprint); k != nil && x.Policy.Parsed.Key(fingerprint) == nil {
		return badCall(call.hint+"; the policy of the target allows it to "+source.Visible(k.Principal)+", and counts only once the target is approved: others have to sign this change", "%s", call.problem)
	}
	return err
}

// showForSigning says what decides, before somebody signs.
func (a *app) showForSigning(r *recorded) error {
	style := a.style()
	style.Color = false // it goes to the standard error
	if err := render.BeforeSigning(a.err, r.doc, r.standing(), style); err != nil {
		return err
	}
	otherwise, err := a.calledOtherwise(r.doc)
	if err != nil {
		return err
	}
	if named := r.doc.Computed.Options.Requests; len(named) > 0 {
		// The statement says nothing of it where no finding is left.
		otherwise = append(otherwise, fmt.Sprintf("whoever assessed this chose the requests that count (--request %s); what else the change adds or alters in requests/ was not looked at", source.Visible(strings.Join(named, ", "))))
	}
	if text := oddTime(&r.doc.Computed, time.Now()); text != "" {
		otherwise = append(otherwise, text)
	}
	for _, text := range otherwise {
		fmt.Fprintf(a.err, "%s\n", wrap("! "+text, style.Width))
	}
	for _, email := range r.UnknownPreparers() {
		fmt.Fprintf(a.err, "! unknown-preparer %s is no person of the policy: the assessment cannot be approved\n", source.Visible(email))
	}
	fmt.Fprintf(a.err, "The whole report: %s\n\n", source.Visible(a.advise(fmt.Sprintf("speedtrail report %d --out report.html", r.Number))))
	return nil
}

// oddTime says where the time of the target cannot be right; empty where it can. Whoever
// commits writes what he likes, and the terms of acceptances are compared with it.
func oddTime(c *assessment.Computed, now time.Time) string {
	const why = ": by it the terms of acceptances and of temporary restrictions are judged"
	target, err := time.Parse(time.RFC3339, c.Target.Committed)
	base, baseErr := time.Parse(time.RFC3339, c.Base.Committed)
	switch {
	case err != nil:
		return ""
	case target.After(now.Add(approval.Tolerance)):
		return "the target's commit says that it is of " + c.Target.Committed + ", which is to come" + why
	case baseErr == nil && target.Before(base):
		return "the target's commit says that it is of " + c.Target.Committed + ", before its base of " + c.Base.Committed + why
	}
	return ""
}

// recompute computes an assessment anew and refuses any difference.
func (a *app) recompute(ctx context.Context, doc *assessment.Document, recorded string) error {
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	digest, err := (&checker{a: a}).recompute(ctx, repo, doc)
	if err != nil {
		return fmt.Errorf("the assessment cannot be computed anew, and what cannot be is not signed: %w", err)
	}
	if digest != recorded {
		return refused(fmt.Errorf("computed anew the assessment has another digest, %s, than the recorded one, %s", digest, recorded))
	}
	return nil
}

// calledOtherwise says where the names under which a document shows its revisions
// mean something else in this repository: no digest covers them, and whoever brings a
// ledger can write what he likes.
func (a *app) calledOtherwise(doc *assessment.Document) ([]string, error) {
	repo, err := a.openRepo()
	if err != nil {
		return nil, err
	}
	defer repo.Close()
	c := &doc.Computed
	var list []string
	for _, x := range []struct{ side, name, commit string }{
		{"base", cmp.Or(doc.Named.BaseName, doc.Named.Base), c.Base.Commit}, {"target", cmp.Or(doc.Named.TargetName, doc.Named.Target), c.Target.Commit},
	} {
		if strings.HasPrefix(x.commit, x.name) {
			continue // the hash is shown alone
		}
		switch here, err := repo.Resolve(x.name); {
		case err != nil:
			list = append(list, fmt.Sprintf("the assessment calls its %s %s, which this repository does not know; what is signed is about the commit %s", x.side, source.Visible(x.name), x.commit))
		case here.Hash != x.commit:
			list = append(list, fmt.Sprintf("the assessment calls its %s %s, which in this repository is the commit %s; what is signed is about the commit %s", x.side, source.Visible(x.name), here.Hash, x.commit))
		}
	}
	return list, nil
}

// remarkState says where an assessment stands at the end of the ledger.
func (a *app) remarkState(ctx context.Context, l *ledger.Ledger, line *approval.Line, number int64) error {
	if _, err := history.ReadOn(ctx, l, line); err != nil {
		return err
	}
	s := line.State(number)
	text := fmt.Sprintf("assessment %d is %s", number, s.Word)
	if len(s.Missing) > 0 && s.Word != approval.Rejected {
		text += fmt.Sprintf("; still to sign: %s", joined(s.Missing))
	}
	if len(s.Blocks) > 0 {
		text += fmt.Sprintf("; kept from approval: %s", render.BlockWords(s.Blocks))
	}
	a.remark("%s", text)
	for _, r := range decisionsOn(s, number) {
		if revoked := revocationOf(line, r.Fingerprint); revoked != nil {
			a.remark("! %s as %s by %s: %s", r.Decision, r.Role, r.Signer, revoked.Short())
		}
	}
	return nil
}
