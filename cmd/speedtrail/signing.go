package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
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

// signing is the options that all commands share with which people sign.
type signing struct {
	role, reason         string
	decision             string // of a sign-off
	key, signer          string
	agent, yes           bool
	write                string
	statement, signature string
	anchor               bool // of an anchor, whose options have other names
}

// flags adds the options. Commands differ in whether the role can be chosen.
func (s *signing) flags(c *cobra.Command) {
	f := c.Flags()
	f.StringVar(&s.reason, "reason", "", "why, one line of at most 500 bytes")
	f.StringVar(&s.key, "key", "", "the private key `file` to sign with")
	f.BoolVar(&s.agent, "agent", false, "sign with a key of ssh-agent, that of --signer")
	f.StringVar(&s.signer, "signer", "", "the `principal` who signs; by default the one that the key belongs to")
	f.StringVar(&s.write, "write", "", "write the statement to a `file`, and its signature beside it if a key is given, and record nothing")
	f.StringVar(&s.statement, "statement", "", "record the statement in this `file`, which --write made")
	f.StringVar(&s.signature, "signature", "", "its signature, made with ssh-keygen -Y sign -n "+signoff.Namespace)
	f.BoolVarP(&s.yes, "yes", "y", false, "do not ask")
}

// check refuses combinations that make no sense.
func (s *signing) check() error {
	brought := s.statement != "" || s.signature != ""
	switch {
	case brought && (s.statement == "" || s.signature == ""):
		return badCall("give both files: --statement FILE --signature FILE.sig", "--statement and --signature belong together")
	case brought && (s.key != "" || s.agent || s.write != ""):
		return badCall("what is brought back is signed already", "--statement goes without --key, --agent and --write")
	case s.key != "" && s.agent:
		return badCall("choose one", "--key and --agent are both given")
	case !brought && s.key == "" && !s.agent && s.write == "":
		return badCall("--key FILE, --agent, or in two steps: --write FILE, then --statement FILE --signature FILE.sig", "nothing to sign with")
	case !brought && s.reason == "":
		return badCall("--reason says why, for everyone who reads it later", "--reason is missing")
	}
	return nil
}

// signerKey opens the key to sign with; nil where there is none to be used. done
// releases it.
func (s *signing) signerKey(ctx context.Context, a *app, p *schema.Policy, whose string) (key ssh.Signer, done func(), err error) {
	done = func() {}
	switch {
	case s.key != "":
		key, err = readKey(ctx, a, s.key, keyOption)
	case s.agent:
		key, done, err = agentKey(p, s.signer, whose)
	}
	return key, done, err
}

// newestPolicy is whose policy decides about what is no sign-off.
const newestPolicy = "the newest approved revision"

func orAnyone(signer string) string {
	if signer == "" {
		return "anyone"
	}
	return signer
}

// complete fills in who signs, by a policy; whose says which one that is.
func (s *signing) complete(statement *signoff.Statement, key ssh.Signer, p *schema.Policy, whose string) error {
	statement.Signer = s.signer
	if key == nil {
		if s.signer == "" {
			return badCall("--signer PRINCIPAL, as in allowed_signers", "who will sign the statement is not said")
		}
		return nil
	}
	fingerprint := ssh.FingerprintSHA256(key.PublicKey())
	k := p.Key(fingerprint)
	if k == nil {
		return refused(fmt.Errorf("the key %s is not allowed to anyone by the policy of %s", fingerprint, whose))
	}
	if s.signer != "" && s.signer != k.Principal {
		return refused(fmt.Errorf("the key %s belongs to %s, not to %s", fingerprint, k.Principal, s.signer))
	}
	statement.Signer = k.Principal
	return nil
}

// signed is a statement with its signature.
type signed struct{ statement, signature []byte }

// finish shows the statement, asks, and signs it; with --write it writes the
// files and gives nothing.
func (s *signing) finish(ctx context.Context, a *app, statement signoff.Statement, key ssh.Signer) (*signed, error) {
	text, err := statement.Text()
	if err != nil {
		return nil, badCall("values are one line of visible text; the reason has at most 500 bytes", "%v", err)
	}
	if locked, ok := key.(*lockedKey); ok {
		if key, err = locked.open(ctx, a); err != nil {
			return nil, err
		}
	}
	// A mark without width would let one name pass for another.
	fmt.Fprintf(a.err, "The statement:\n\n%s\n", source.VisibleLines(string(text)))
	var signature []byte
	if key != nil {
		if err := s.ask(ctx, a); err != nil {
			return nil, err
		}
		if signature, err = signoff.Sign(text, key); err != nil {
			return nil, fmt.Errorf("signing: %w", err)
		}
	}
	if s.write == "" {
		return &signed{text, signature}, nil
	}
	if err := writeBytes(s.write, text); err != nil {
		return nil, fmt.Errorf("the statement was not written: %w", err)
	}
	if signature != nil {
		if err := writeBytes(s.write+".sig", signature); err != nil {
			return nil, fmt.Errorf("the signature was not written: %w", err)
		}
		a.remark("written to %s and %s.sig; nothing was recorded", s.write, s.write)
		return nil, nil
	}
	back := fmt.Sprintf("--statement %s --signature %s", shellWord(s.write), shellWord(s.write+".sig"))
	if statement.Kind == signoff.Anchor {
		back = "--bring " + shellWord(s.write)
	}
	a.remark("written to %s; nothing was recorded. Sign it with\n  ssh-keygen -Y sign -f KEY -n %s %s\nand bring both files back with %s", s.write, signoff.Namespace, shellWord(s.write), back)
	return nil, nil
}

// alone refuses options beside --statement that say what the statement says already.
func (s *signing) alone(c *cobra.Command) error {
	if s.statement == "" {
		return nil
	}
	for _, name := range []string{"role", "decision", "reason", "signer", "since", "routes", "replaces", "voids"} {
		if c.Flags().Changed(name) {
			return badCall("leave it out", "--%s does not go with --statement, which says it", name)
		}
	}
	return nil
}

// brought reads the files of --statement and --signature.
func (s *signing) brought() (*signed, error) {
	out := &signed{}
	for _, f := range []struct {
		name string
		to   *[]byte
		most int64
	}{{s.statement, &out.statement, signoff.MaxStatement}, {s.signature, &out.signature, signoff.MaxSignature}} {
		info, err := os.Stat(f.name)
		if err == nil && info.Size() > f.most {
			err = fmt.Errorf("it has %d bytes, at most %d are allowed", info.Size(), f.most)
		}
		if err == nil {
			*f.to, err = os.ReadFile(f.name)
		}
		if err != nil {
			hint := "--statement and --signature are files that --write and ssh-keygen made"
			if s.anchor {
				hint = "--bring FILE takes FILE, which --write made, and FILE.sig, which ssh-keygen made"
			}
			return nil, badCall(hint, "%s cannot be read: %v", f.name, err)
		}
		// Neither file has a CR of its own, so that without them it is what was signed.
		if bytes.Contains(*f.to, []byte("\r\n")) {
			return nil, badCall(fmt.Sprintf("send it in an archive, or take each CR out: tr -d '\\r' < %s > FILE", shellWord(f.name)), "the lines of %s end with CR LF, as mail and some editors leave them; what was signed ends them with LF alone", f.name)
		}
	}
	return out, nil
}

// broughtAbout checks that a statement that was signed elsewhere is about a revision
// as Git has it, and that its routes are there; data is nil where it names none.
// What cannot be read at all, its recording says.
func broughtAbout(s *signed, commit, folder, tree string, data *schema.Dataset) error {
	st, err := signoff.Parse(s.statement)
	if err != nil {
		return nil
	}
	for _, x := range []struct{ name, have, want string }{{"commit", st.Revision, commit}, {"folder", st.Folder, folder}, {"content", st.Content, tree}} {
		if x.have != x.want {
			return refused(fmt.Errorf("the statement is about the %s %s, the revision that is named has %s", x.name, source.Visible(x.have), x.want))
		}
	}
	for _, id := range st.Routes {
		if data != nil && routeByID(data, id) == nil {
			return refused(fmt.Errorf("the statement names the route %s, which the revision does not have", source.Visible(id)))
		}
	}
	return nil
}

// refused gives an error of the call for what a policy does not allow.
func refused(err error) error {
	hint := "nothing was recorded"
	if todo := hintOf(err); todo != "" {
		hint += "; " + todo
	}
	return &callError{err.Error(), hint}
}

// foresee refuses what could not be recorded, before anybody is asked to sign it.
func (a *app) foresee(line *approval.Line, s signoff.Statement, key ssh.Signer) error {
	fingerprint := ""
	if key != nil {
		fingerprint = ssh.FingerprintSHA256(key.PublicKey())
	}
	if err := line.Foresee(s, fingerprint, time.Now()); errors.Is(err, approval.ErrRefused) {
		return refused(err)
	}
	return nil // what else is wrong, its signing says
}

// recordSigned checks and appends a signed statement. line is what was read of the
// ledger before.
func (a *app) recordSigned(ctx context.Context, l *ledger.Ledger, line *approval.Line, kind chain.Kind, s *signed) error {
	head, err := history.RecordSigned(ctx, l, line, history.Statement{Kind: kind, Text: s.statement, Signature: s.signature}, time.Now())
	switch {
	case errors.Is(err, approval.ErrRefused), errors.Is(err, signoff.ErrMalformed), errors.Is(err, signoff.ErrSignature):
		return refused(err)
	case err != nil:
		return fmt.Errorf("it was not recorded: %w", err)
	}
	a.remark("recorded as entry %d; head of the ledger %s (note it elsewhere: it proves later that nothing was removed)", head.Seq, head)
	return nil
}

// seen is the head that a signer has seen: the newest.
func seen(line *approval.Line) chain.Head { return line.Head() }
