//go:build !unix && !windows

package ledger

import "syscall"

// systemClass knows no numbers of this system.
func systemClass(syscall.Errno) error { return nil }
