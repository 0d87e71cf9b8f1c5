//go:build unix

package ledger

import "syscall"

// noQuota is the system's word for a full share of a disk.
const noQuota = syscall.EDQUOT
