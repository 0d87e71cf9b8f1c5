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

func (a *app) anchor(ctx context.Context, rev string, o *anchoring) error {
	if rev == workingTree {
		return badCall("commit the policy first", "the working tree cannot be anchored")
	}
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	folder, err := a.folder()
	if err != nil {
		return err
	}
	s, err := a.openSide(repo, rev)
	if err != nil {
		return err
	}
	if _, err := schema.Load(ctx, s.files); err != nil {
		return &sideError{s.label(), err}
	}
	tree, signOff, signers, err := (&checker{a: a}).content(ctx, repo, s.commit.Hash, folder)
	if err != nil {
		return err
	}
	// A call that is refused makes no ledger.
	l, err := a.openLedgerFor(ctx, true)
	line := approval.New(noLedger)
	switch {
	case errors.Is(err, ledger.ErrNoLedger) && len(o.brings) == 0:
	case err != nil:
		return err
	default:
		defer l.Close()
		if line, err = a.readLine(ctx, l); err != nil {
			return err
		}
	}
	p := line.Policy(signOff, signers)
	switch {
	case p.Hash == "":
		return refused(fmt.Errorf("%s has no policy (signoff.toml and allowed_signers) in the folder %s", rev, folder))
	case p.Problem != nil:
		return &sideError{s.label(), p.Problem}
	}
	statement := signoff.Statement{
		Kind: signoff.Anchor, Ledger: noLedger, Revision: s.commit.Hash, Folder: folder, Content: tree, Policy: p.Hash,
		Reason: o.reason, Time: time.Now().UTC().Truncate(time.Second), Head: chain.Head{Seq: 1, Hash: strings.Repeat("0", 64)},
	}
	if l != nil {
		statement.Ledger, statement.Head = l.ID(), seen(line)
	}
	body := approval.AnchorBody{AllowedSigners: signers, Format: approval.AnchorFormat, SignOff: signOff}
	for _, file := range o.brings {
		result, err := (&signing{statement: file, signature: file + ".sig", anchor: true}).brought()
		if err == nil {
			err = broughtAbout(result, s.commit.Hash, folder, tree, nil)
		}
		if err != nil {
			return err
		}
		body.Statements = append(body.Statements, anchored(result))
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
		for i, key := range keys {
			if locked, ok := key.(*lockedKey); ok {
				if keys[i], err = locked.open(ctx, a); err != nil {
					return err
				}
			}
		}
		if l, err = a.openLedger(ctx, true); err != nil {
			return err
		}
		defer l.Close()
		if line, _, err = history.ReadLine(ctx, l); err != nil {
			return err
		}
		now := time.Now().UTC().Truncate(time.Second) // not before the entry that the statements name
		for i := range unsigned {
			unsigned[i].Ledger, unsigned[i].Head, unsigned[i].Time = l.ID(), seen(line), now
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

func (a *app) revokeCommand() *cobra.Command {
	var s signing
	c := &cobra.Command{
		Use:   "revoke FINGERPRINT --role ROLE --reason TEXT --key FILE",
		Short: "take a key out of use",
		Long: `revoke records that nothing that a key signs from now on counts. It is signed by
the key's owner (--role owner), or by somebody who may sign in a role that is
independent of preparer. What the key has signed before is listed for review, here
and below the list of register, and every report says of each signature whether its
key was revoked later.

FINGERPRINT is what ssh-keygen -lf KEY.pub prints, with SHA256: in front.`,
		Example: `  speedtrail revoke SHA256:Xa0c... --role owner --reason "laptop stolen" --key ~/.ssh/id_ed25519`,
		Args:    arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			if err := s.alone(c); err != nil {
				return err
			}
			if err := s.check(); err != nil {
				return err
			}
			if s.statement == "" && s.role == "" {
				return badCall("--role owner, or a role of the policy", "--role is missing")
			}
			return a.revoke(c.Context(), args[0], &s)
		},
	}
	s.flags(c)
	c.Flags().StringVar(&s.role, "role", "", "owner, or a role of the policy")
	return c
}

func (a *app) revoke(ctx context.Context, fingerprint string, s *signing) error {
	folder, err := a.folder()
	if err != nil {
		return err
	}
	l, err := a.openLedgerFor(ctx, s.write == "")
	if err != nil {
		return err
	}
	defer l.Close()
	line, err := a.readLine(ctx, l)
	if err != nil {
		return err
	}
	if s.statement != "" {
		brought, err := s.brought()
		if err != nil {
			return err
		}
		if st, err := signoff.Parse(brought.statement); err == nil && (st.Key != fingerprint || st.Folder != folder) {
			return refused(fmt.Errorf("the statement is about the key %s and the folder %s, not %s and %s", source.Visible(st.Key), source.Visible(st.Folder), source.Visible(fingerprint), folder))
		}
		return a.recordSigned(ctx, l, line, chain.Revocation, brought)
	}
	p := line.Newest(folder)
	if p.Parsed == nil {
		return refused(fmt.Errorf("no policy is anchored for the folder %s; speedtrail anchor puts one in force", folder))
	}
	key, done, err := s.signerKey(ctx, a, p.Parsed, newestPolicy)
	if err != nil {
		return err
	}
	defer done()
	statement := signoff.Statement{
		Kind: signoff.Revocation, Ledger: l.ID(), Folder: folder, Policy: p.Hash, Key: fingerprint, Role: s.role, Reason: s.reason,
		Time: time.Now().UTC().Truncate(time.Second), Head: seen(line),
	}
	if err := s.complete(&statement, key, p.Parsed, newestPolicy); err != nil {
		return err
	}
	if err := a.foresee(line, statement, key); err != nil {
		return err
	}
	result, err := s.finish(ctx, a, statement, key)
	if err != nil || result == nil {
		return err
	}
	if err := a.recordSigned(ctx, l, line, chain.Revocation, result); err != nil {
		return err
	}
	for _, text := range toReview(line, fingerprint) {
		fmt.Fprintln(a.out, text)
	}
	return nil
}

func joined(list []string) string { return strings.Join(list, ", ") }
