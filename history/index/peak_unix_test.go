//go:build unix

package index_test

import (
	"os"
	"syscall"
)

// peakOf is the largest resident memory of a process, in KiB where the system
// counts so, as Linux does.
func peakOf(p *os.ProcessState) int64 {
	if u, ok := p.SysUsage().(*syscall.Rusage); ok {
		return int64(u.Maxrss)
	}
	return 0
}
