package main

import (
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"runtime"
	"slices"
	"strings"

	"golang.org/x/crypto/ssh"
	"golang.org/x/crypto/ssh/agent"

	"speedtrail/schema"
)

// agentKey finds the key of a principal in ssh-agent.
func agentKey(p *schema.Policy, signer, whose string) (ssh.Signer, func(), error) {
	conn, err := dialAgent(os.Getenv("SSH_AUTH_SOCK"))
	if err != nil {
		return nil, nil, badCall("start ssh-agent and add the key, or use --key", "ssh-agent does not answer: %v", err)
	}
	signers, err := agent.NewClient(conn).Signers()
	if err != nil {
		conn.Close()
		return nil, nil, fmt.Errorf("ssh-agent: %w", err)
	}
	for _, key := range signers {
		k := p.Key(ssh.FingerprintSHA256(key.PublicKey()))
		if k != nil && (signer == "" || k.Principal == signer) {
			return key, func() { conn.Close() }, nil
		}
	}
	conn.Close()
	var principals []string
	for _, k := range p.Keys {
		principals = append(principals, k.Principal)
	}
	hint := "add the key with ssh-add"
	if !slices.Contains(principals, signer) {
		hint = meant(signer, principals, hint)
	}
	return nil, nil, badCall(hint, "ssh-agent holds no key that the policy of %s allows to %s", whose, orAnyone(signer))
}

// agentPipe is where ssh-agent of OpenSSH for Windows listens.
const agentPipe = `\\.\pipe\openssh-ssh-agent`

// dialAgent connects to ssh-agent at a socket, or at a pipe of Windows.
func dialAgent(socket string) (io.ReadWriteCloser, error) {
	if socket == "" && runtime.GOOS == "windows" {
		socket = agentPipe
	}
	switch {
	case socket == "":
		return nil, errors.New("SSH_AUTH_SOCK is not set")
	case runtime.GOOS == "windows" && strings.HasPrefix(socket, `\\.\pipe\`):
		return os.OpenFile(socket, os.O_RDWR, 0)
	}
	return net.Dial("unix", socket)
}
