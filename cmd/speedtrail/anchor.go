package main

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/crypto/ssh"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

func (a *app) anchorCommand() *cobra.Command {
	var signs, brings []string
	var write, role, signer, reason string
	var yes bool
	c := &cobra.Command{
		Use:   "anchor REV --sign ROLE=KEYFILE ... --reason TEXT",
		Short: "put a policy in force as the root of the line of approval",
		Long: `anchor records the policy (signoff.toml and allowed_signers) and the data of a
revision as the root from which approvals start. There is one for each ledger
and data set folder. It is signed by people who satisfy every role of the policy:
with their keys at hand (--sign ROLE=KEYFILE, repeated), or each elsewhere: --write
FILE --role ROLE --signer PRINCIPAL writes a statement, ssh-keygen -Y sign -n
speedtrail-signoff FILE signs it, --bring FILE takes it and FILE.sig up.

Its hash is printed. Note it elsewhere: verify --anchor HASH proves by it that the
root is still this one.`,
		Example: `  speedtrail anchor release-1 --sign checker=holm --sign approver=brand --sign in-service=sand --reason "first release"
  speedtrail anchor release-1 --write holm.txt --role checker --signer r.holm@brackwater.example --reason "first release"
  speedtrail anchor release-1 --bring holm.txt --bring brand.txt --bring sand.txt`,
		Args: arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			switch {
			case write == "" && len(signs)+len(brings) == 0:
				return badCall("--sign ROLE=KEYFILE for each role, or in two steps --write FILE and --bring FILE", "nobody signs the anchor")
			case write != "" && (role == "" || signer == ""):
				return badCall("--write FILE --role ROLE --signer PRINCIPAL", "for whom the statement is written is not said")
			case (write != "" || len(signs) > 0) && reason == "":
				return badCall("--reason says why, for everyone who reads it later", "--reason is missing")
			}
			return a.anchor(c.Context(), args[0], &anchoring{signs, brings, write, role, signer, reason, yes})
		},
	}
	f := c.Flags()
	f.StringArrayVar(&signs, "sign", nil, "sign in a role with a private key: `ROLE=KEYFILE` (repeatable)")
	f.StringArrayVar(&brings, "bring", nil, "take up the statement in a `file` and its signature in FILE.sig (repeatable)")
	f.StringVar(&write, "write", "", "write a statement to a `file` to be signed elsewhere, and record nothing")
	f.StringVar(&role, "role", "", "the role of --write")
	f.StringVar(&signer, "signer", "", "the `principal` of --write")
	f.StringVar(&reason, "reason", "", "why, one line of at most 500 bytes")
	f.BoolVarP(&yes, "yes", "y", false, "do not ask")
	return c
}

type anchoring struct {
	signs, brings               []string
	write, role, signer, reason string
	yes                         bool
}

// anchor puts the policy of a revision in force. Everything that can be refused is
// before anybody signs, and before a ledger is made.
func (a *app) anchor(ctx context.Context, rev string, o *anchoring) error {
	root, err := a.rootAt(ctx, rev)
	if err != nil {
		return err
	}
	l, line, err := a.ledgerToAnchor(ctx, len(o.brings) > 0)
	if err != nil {
		return err
	}
	defer func() {
		if l != nil {
			l.Close()
		}
	}()
	p, err := root.policy(line)
	if err != nil {
		return err
	}
	statement := root.statement(p, o.reason)
	if l != nil {
		statement.Ledger, statement.Head = l.ID(), seen(line)
	}
	body := approval.AnchorBody{AllowedSigners: p.AllowedSigners, Format: approval.AnchorFormat, SignOff: p.SignOff}
	if body.Statements, err = o.brought(root); err != nil {
		return err
	}
	unsigned, keys, err := o.unsigned(ctx, a, statement, p.Parsed)
	if err != nil {
		return err
	}
	if err := line.ForeseeAnchor(body, unsigned, o.write == "", time.Now()); err != nil {
		return anchorError(err)
	}
	if len(unsigned) > 0 {
		if o.write == "" && !o.yes && !asks(a) {
			return errNobodyToAsk
		}
		a.showPolicy(p.Parsed)
	}
	if l == nil {
		// Before the ledger is there a passphrase can still be mistyped.
		if err := unlock(ctx, a, keys); err != nil {
			return err
		}
		if l, line, err = a.ledgerFor(ctx, unsigned); err != nil {
			return err
		}
	}
	for i, u := range unsigned {
		result, err := (&signing{yes: o.yes, write: o.write}).finish(ctx, a, u.Statement, keys[i])
		if err != nil || result == nil {
			return err
		}
		body.Statements = append(body.Statements, anchored(result))
	}
	head, err := history.RecordAnchor(ctx, l, line, body, time.Now())
	if err != nil {
		return anchorError(err)
	}
	a.remark("the policy of %s is in force; anchor %s (note it elsewhere: verify --anchor proves by it that the root is still this one); head of the ledger %s", source.Visible(rev), head.Hash, head)
	return nil
}

// root is the revision that an anchor names, with the files of its policy.
type root struct {
	rev, label     string // as it was typed, and as a reader knows it
	commit, folder string
	content        history.Content
}

// rootAt reads a revision whose data loads.
func (a *app) rootAt(ctx context.Context, rev string) (*root, error) {
	if rev == workingTree {
		return nil, badCall("commit the policy first", "the working tree cannot be anchored")
	}
	repo, err := a.openRepo()
	if err != nil {
		return nil, err
	}
	defer repo.Close()
	folder, err := a.folder()
	if err != nil {
		return nil, err
	}
	s, err := a.openSide(repo, rev)
	if err != nil {
		return nil, err
	}
	if _, err := s.load(ctx); err != nil {
		return nil, err
	}
	r := &root{rev: rev, label: s.label(), commit: s.commit.Hash, folder: folder}
	r.content, err = contentAt(repo, r.commit, folder)
	return r, err
}

// policy gives the policy of the revision, or says why none can be put in force.
func (r *root) policy(line *approval.Line) (approval.Policy, error) {
	p := line.Policy(r.content.SignOff, r.content.AllowedSigners)
	switch {
	case p.Hash == "":
		return p, refused(fmt.Errorf("%s has no policy (signoff.toml and allowed_signers) in the folder %s", r.rev, r.folder))
	case p.Problem != nil:
		return p, &sideError{r.label, p.Problem}
	}
	return p, nil
}

// statement gives what all who sign the anchor state, in a ledger that is still to be
// made.
func (r *root) statement(p approval.Policy, reason string) signoff.Statement {
	return signoff.Statement{
		Kind: signoff.Anchor, Ledger: noLedger, Revision: r.commit, Folder: r.folder, Content: r.content.Tree, Policy: p.Hash,
		Reason: reason, Time: time.Now().UTC().Truncate(time.Second), Head: chain.Head{Seq: 1, Hash: chain.Origin},
	}
}

// ledgerToAnchor opens the ledger and follows its line. Where there is none so far it
// gives no ledger and an empty line: a call that is refused makes none. One that
// statements were made for has to be there.
func (a *app) ledgerToAnchor(ctx context.Context, mustBe bool) (*ledger.Ledger, *approval.Line, error) {
	l, err := a.openLedgerFor(ctx, true)
	switch {
	case errors.Is(err, ledger.ErrNoLedger) && !mustBe:
		return nil, approval.New(noLedger), nil
	case err != nil:
		return nil, nil, err
	}
	line, err := a.readLine(ctx, l)
	if err != nil {
		l.Close()
		return nil, nil, err
	}
	return l, line, nil
}

// ledgerFor makes the ledger, and has the statements name it.
func (a *app) ledgerFor(ctx context.Context, unsigned []approval.Unsigned) (*ledger.Ledger, *approval.Line, error) {
	l, err := a.openLedger(ctx, true)
	if err != nil {
		return nil, nil, err
	}
	line, _, err := history.ReadLine(ctx, l)
	if err != nil {
		l.Close()
		return nil, nil, err
	}
	now := time.Now().UTC().Truncate(time.Second) // not before the entry that the statements name
	for i := range unsigned {
		unsigned[i].Ledger, unsigned[i].Head, unsigned[i].Time = l.ID(), seen(line), now
	}
	return l, line, nil
}

// unlock opens the keys that have a passphrase.
func unlock(ctx context.Context, a *app, keys []ssh.Signer) (err error) {
	for i, key := range keys {
		if locked, ok := key.(*lockedKey); ok {
			if keys[i], err = locked.open(ctx, a); err != nil {
				return err
			}
		}
	}
	return nil
}

// brought reads the statements that were signed elsewhere.
func (o *anchoring) brought(r *root) ([]approval.Signed, error) {
	var list []approval.Signed
	for _, file := range o.brings {
		result, err := (&signing{statement: file, signature: file + ".sig", anchor: true}).brought()
		if err == nil {
			err = broughtAbout(result, r.commit, r.folder, r.content.Tree, nil)
		}
		if err != nil {
			return nil, err
		}
		list = append(list, anchored(result))
	}
	return list, nil
}

// noLedger stands for the id of a ledger that is still to be made.
const noLedger = "00000000000000000000000000000000"

// unsigned gives the statements that are to be signed here, or written to be signed
// elsewhere, and their keys.
func (o *anchoring) unsigned(ctx context.Context, a *app, statement signoff.Statement, p *schema.Policy) (list []approval.Unsigned, keys []ssh.Signer, err error) {
	if o.write != "" {
		statement.Role, statement.Signer = o.role, o.signer
		return []approval.Unsigned{{Statement: statement}}, []ssh.Signer{nil}, nil
	}
	for _, sign := range o.signs {
		role, file, ok := strings.Cut(sign, "=")
		if !ok {
			return nil, nil, badCall("--sign ROLE=KEYFILE, for example --sign checker=key", "unknown value %q for --sign", sign)
		}
		key, err := readKey(ctx, a, file, signOption)
		if err != nil {
			return nil, nil, err
		}
		one := statement
		one.Role = role
		if err := (&signing{anchor: true}).complete(&one, key, p, "the revision that is anchored"); err != nil {
			return nil, nil, err
		}
		list, keys = append(list, approval.Unsigned{Statement: one, Fingerprint: ssh.FingerprintSHA256(key.PublicKey())}), append(keys, key)
	}
	return list, keys, nil
}

func anchored(s *signed) approval.Signed {
	return approval.Signed{Format: approval.AnchorFormat, Signature: string(s.signature), Statement: string(s.statement)}
}

func anchorError(err error) error {
	switch {
	case errors.Is(err, approval.ErrRefused), errors.Is(err, signoff.ErrMalformed), errors.Is(err, signoff.ErrSignature):
		return refused(err)
	}
	return fmt.Errorf("the anchor was not recorded: %w", err)
}
