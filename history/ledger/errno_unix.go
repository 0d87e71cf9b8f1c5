//go:build unix

package ledger

import "syscall"

// systemClass sorts what the system said of a failed call into a class, nil where
// it tells none. Numbers are those of errno(3).
func systemClass(errno syscall.Errno) error {
	switch errno {
	case syscall.ENOSPC, syscall.EFBIG, syscall.EDQUOT:
		return ErrFull
	case syscall.EACCES, syscall.EPERM, syscall.EROFS:
		return ErrReadOnly
	}
	return nil
}
