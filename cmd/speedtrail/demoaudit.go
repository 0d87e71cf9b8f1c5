package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"speedtrail/cmd/speedtrail/internal/demo"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/history/signoff"
)

// demoAudit writes the year's audit trail of the demonstration: an anchor, the
// assessments of the earlier releases, sign-offs by invented people with test
// keys, and the log of what went into service. The entries carry the times of
// the story.
func (a *app) demoAudit(ctx context.Context, repo *revision.Repo, dir string) error {
	l, err := a.openLedgerAt(ctx, demo.AnchorTime.Add(-time.Hour))
	if err != nil {
		return err
	}
	defer l.Close()
	t := &demoTrail{a: a, repo: repo, l: l, numbers: map[string]int64{}}
	if err := t.anchor(ctx); err != nil {
		return err
	}
	// In the order of time, as it happened.
	signings, service := demo.Signings, demo.Service
	for len(signings) > 0 || len(service) > 0 {
		if len(signings) == 0 || len(service) > 0 && service[0].When.Before(signings[0].When) {
			s := service[0]
			service = service[1:]
			if err := t.service(ctx, s.Tag, s.Reason, s.Since, s.When); err != nil {
				return err
			}
			continue
		}
		s := signings[0]
		signings = signings[1:]
		if err := t.sign(ctx, s); err != nil {
			return err
		}
	}
	return writeDemoKeys(filepath.Join(repo.CommonDir(), "speedtrail", "demo-keys"))
}

// writeDemoKeys puts the test keys beside the ledger, so that signing can be
// tried.
func writeDemoKeys(dir string) error {
	if err := os.MkdirAll(dir, 0o700); err != nil {
		return err
	}
	for _, s := range demo.Signers {
		text, err := s.PEM()
		if err != nil {
			return err
		}
		if err := os.WriteFile(filepath.Join(dir, s.Key), text, 0o600); err != nil {
			return err
		}
	}
	return nil
}

type demoTrail struct {
	a       *app
	repo    *revision.Repo
	l       *ledger.Ledger
	numbers map[string]int64 // target tag -> assessment
}

func (t *demoTrail) anchor(ctx context.Context) error {
	commit, err := t.repo.Resolve("release-2025.1")
	if err != nil {
		return err
	}
	found, err := contentAt(t.repo, commit.Hash, ".")
	if err != nil {
		return err
	}
	line, _, err := history.ReadLine(ctx, t.l)
	if err != nil {
		return err
	}
	body := approval.AnchorBody{AllowedSigners: found.AllowedSigners, Format: approval.AnchorFormat, SignOff: found.SignOff}
	for _, x := range demo.Anchoring {
		s := signoff.Statement{
			Kind: signoff.Anchor, Ledger: t.l.ID(), Revision: commit.Hash, Folder: ".", Content: found.Tree, Policy: line.Policy(found.SignOff, found.AllowedSigners).Hash,
			Role: x.Role, Reason: "first release of the register", Signer: x.By.Principal, Time: demo.AnchorTime, Head: line.Head(),
		}
		signed, err := signAs(s, x.By)
		if err != nil {
			return err
		}
		body.Statements = append(body.Statements, approval.Signed{Format: approval.AnchorFormat, Signature: string(signed.signature), Statement: string(signed.statement)})
	}
	_, err = history.RecordAnchor(ctx, t.l, line, body, demo.AnchorTime)
	return err
}

// signAs signs a statement with a test key.
func signAs(s signoff.Statement, by demo.Signer) (*signed, error) {
	text, err := s.Text()
	if err != nil {
		return nil, err
	}
	key, err := by.SSH()
	if err != nil {
		return nil, err
	}
	signature, err := signoff.Sign(text, key)
	return &signed{text, signature}, err
}

// sign records an assessment if need be, and a decision on it.
func (t *demoTrail) sign(ctx context.Context, s demo.Signing) error {
	number, ok := t.numbers[s.Target]
	if !ok {
		doc, err := t.a.compute(ctx, t.repo, comparison{base: s.Base, target: s.Target, Options: assessment.Options{Requests: []string{}}, whole: true, since: fromBase})
		if err != nil {
			return err
		}
		body, digest, err := doc.Encode()
		if err != nil {
			return err
		}
		in, err := t.l.RecordAssessment(ctx, s.When.Add(-2*time.Hour), assessment.LedgerRecord(doc, body, digest))
		if err != nil {
			return err
		}
		number = in.Number
		t.numbers[s.Target] = number
	}
	line, _, err := history.ReadLine(ctx, t.l)
	if err != nil {
		return err
	}
	x := line.Assessment(number)
	statement := signoff.Statement{
		Kind: signoff.SignOff, Ledger: t.l.ID(), Assessment: number, Digest: x.Digest, Base: x.Base, Target: x.Target, Folder: x.Folder, Rules: x.Rules,
		Policy: x.Policy.Hash, Findings: x.Findings, Role: s.Role, Decision: s.Decision, Reason: s.Reason, Signer: s.By.Principal, Time: s.When, Head: line.Head(),
	}
	signed, err := signAs(statement, s.By)
	if err != nil {
		return err
	}
	_, err = history.RecordSigned(ctx, t.l, line, history.Statement{Kind: chain.SignOff, Text: signed.statement, Signature: signed.signature}, s.When)
	if s.Refused {
		if !errors.Is(err, approval.ErrRefused) {
			return fmt.Errorf("the demonstration expects a refusal, got %v", err)
		}
		t.a.remark("(part of the story: a sign-off of %s by %s was tried and is %s)", s.Target, s.By.Principal, err)
		return nil
	}
	return err
}

// service records that a release went into service.
func (t *demoTrail) service(ctx context.Context, tag, reason string, since, when time.Time) error {
	commit, err := t.repo.Resolve(tag)
	if err != nil {
		return err
	}
	files, err := t.repo.Snapshot(commit.Hash, ".")
	if err != nil {
		return err
	}
	line, _, err := history.ReadLine(ctx, t.l)
	if err != nil {
		return err
	}
	signed, err := signAs(signoff.Statement{
		Kind: signoff.InForce, Ledger: t.l.ID(), Revision: commit.Hash, Folder: ".", Content: content(files), Policy: line.Newest(".").Hash, Since: since,
		Corrects: approval.CorrectsNothing, Role: approval.InServiceRole, Reason: reason, Signer: demo.Sand.Principal, Time: when, Head: line.Head(),
	}, demo.Sand)
	if err != nil {
		return err
	}
	_, err = history.RecordSigned(ctx, t.l, line, history.Statement{Kind: chain.InForce, Text: signed.statement, Signature: signed.signature}, when)
	return err
}
