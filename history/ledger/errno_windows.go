package ledger

import (
	"syscall"

	"golang.org/x/sys/windows"
)

// systemClass sorts what the system said of a failed call into a class, nil where
// it tells none. Numbers are the system error codes of winerror.h.
func systemClass(errno syscall.Errno) error {
	switch errno {
	case windows.ERROR_DISK_FULL, windows.ERROR_HANDLE_DISK_FULL, windows.ERROR_DISK_QUOTA_EXCEEDED, windows.ERROR_FILE_TOO_LARGE:
		return ErrFull
	case windows.ERROR_ACCESS_DENIED, windows.ERROR_WRITE_PROTECT:
		return ErrReadOnly
	case windows.ERROR_SHARING_VIOLATION, windows.ERROR_LOCK_VIOLATION:
		return ErrLocked
	}
	return nil
}
