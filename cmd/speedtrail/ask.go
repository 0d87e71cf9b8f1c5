package main

import (
	"bufio"
	"bytes"
	"context"
	"crypto/x509"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"golang.org/x/crypto/ssh"
	"golang.org/x/term"

	"speedtrail/schema/source"
)

// keyHints is what to do about a key, by the option that names it.
type keyHints struct{ unread, noTerminal, wrong string }

var (
	keyOption = keyHints{
		"name the file of a private key with --key", "use ssh-agent (--agent), or sign in two steps (--write)", "--key is a private key of OpenSSH",
	}
	signOption = keyHints{
		"name the file of a private key: --sign ROLE=KEYFILE", "sign in two steps: --write FILE --role ROLE --signer PRINCIPAL, then --bring FILE", "--sign ROLE=KEYFILE names a private key of OpenSSH",
	}
)

// readKey reads a private key. One with a passphrase is opened only to sign: most of
// what would be refused is known before anybody is asked for it.
func readKey(ctx context.Context, a *app, file string, hints keyHints) (ssh.Signer, error) {
	content, err := os.ReadFile(file)
	if err != nil {
		return nil, badCall(hints.unread, "the key cannot be read: %v", err)
	}
	key, err := ssh.ParsePrivateKey(content)
	var locked *ssh.PassphraseMissingError
	if errors.As(err, &locked) {
		if _, ok := terminal(a); !ok {
			return nil, badCall(hints.noTerminal, "the key %s has a passphrase, and there is no terminal to ask for it", file)
		}
		l := &lockedKey{file, content, locked.PublicKey, hints}
		if locked.PublicKey != nil {
			return l, nil
		}
		return l.open(ctx, a) // forms other than that of OpenSSH hide their public key, too
	}
	if err != nil {
		return nil, badCall(hints.wrong, "the key %s cannot be used: %v", file, err)
	}
	return key, nil
}

// lockedKey is a private key whose passphrase nobody was asked for so far.
type lockedKey struct {
	file    string
	content []byte
	public  ssh.PublicKey
	hints   keyHints
}

// PublicKey gives what the file says openly; opening the key proves it.
func (k *lockedKey) PublicKey() ssh.PublicKey { return k.public }

// Sign refuses: a locked key signs nothing.
func (k *lockedKey) Sign(io.Reader, []byte) (*ssh.Signature, error) {
	return nil, errors.New("the key " + k.file + " is locked")
}

// open asks for the passphrase on the terminal.
func (k *lockedKey) open(ctx context.Context, a *app) (ssh.Signer, error) {
	in, ok := terminal(a)
	if !ok {
		return nil, errors.New("there is no terminal to ask for the passphrase of " + k.file)
	}
	fmt.Fprintf(a.err, "passphrase of %s: ", source.Visible(k.file))
	passphrase, err := answer(ctx, in, func() ([]byte, error) { return term.ReadPassword(int(in.Fd())) })
	fmt.Fprintln(a.err)
	if err != nil {
		return nil, err
	}
	key, err := ssh.ParsePrivateKeyWithPassphrase(k.content, passphrase)
	if errors.Is(err, x509.IncorrectPasswordError) {
		return nil, badCall("nothing was signed; do it again with the right one", "the passphrase of %s is wrong", k.file)
	}
	if err == nil && k.public != nil && !bytes.Equal(key.PublicKey().Marshal(), k.public.Marshal()) {
		err = errors.New("its public half is that of another key")
	}
	if err != nil {
		return nil, badCall(k.hints.wrong, "the key %s cannot be used: %v", k.file, err)
	}
	return key, nil
}

// errNobodyToAsk says that there is no terminal.
var errNobodyToAsk = &callError{"there is no terminal to ask on", "--yes signs without asking"}

// asks tells whether anybody can be asked.
func asks(a *app) bool {
	_, ok := terminal(a)
	return ok
}

// ask asks for a yes.
func (s *signing) ask(ctx context.Context, a *app) error {
	if s.yes {
		return nil
	}
	in, ok := terminal(a)
	if !ok {
		return errNobodyToAsk
	}
	fmt.Fprint(a.err, "Sign this statement? Type yes: ")
	said, err := answer(ctx, in, func() (string, error) {
		line, _ := bufio.NewReader(in).ReadString('\n')
		return strings.TrimSpace(line), nil
	})
	if err != nil {
		fmt.Fprintln(a.err)
		return err
	}
	if said != "yes" {
		return badCall("nothing was signed", "not signed")
	}
	return nil
}

// terminal is where a person can be asked, if there is one.
func terminal(a *app) (*os.File, bool) {
	in, ok := a.in.(*os.File)
	return in, ok && term.IsTerminal(int(in.Fd()))
}

// answer waits for what a person types. Where the work is stopped meanwhile it
// waits no longer, and gives the terminal the state back that reading took from it,
// the echo above all; what reads goes with the process.
func answer[T any](ctx context.Context, in *os.File, read func() (T, error)) (T, error) {
	type answered struct {
		said T
		err  error
	}
	fd := int(in.Fd())
	state, stateErr := term.GetState(fd)
	got := make(chan answered, 1)
	go func() {
		said, err := read()
		got <- answered{said, err}
	}()
	select {
	case a := <-got:
		return a.said, a.err
	case <-ctx.Done():
		if stateErr == nil {
			_ = term.Restore(fd, state)
		}
		var none T
		return none, ctx.Err()
	}
}
