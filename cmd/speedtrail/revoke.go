package main

import (
	"context"
	"fmt"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema/source"
)

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
