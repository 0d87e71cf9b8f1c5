package ledger_test

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"unsafe"

	"speedtrail/history/ledger"
)

// refusal says which system call the kernel refuses and with what.
type refusal struct {
	number uintptr
	fd     int // the call's first argument; -1: any
	mask   uint32
	bits   uint32 // of the call's third argument, of those in mask
	errno  syscall.Errno
}

// refuse makes the kernel refuse a system call of this process from now on
// (seccomp(2)): the one way to have SQLite's own layer see an error of a disk
// that no test can break.
func refuse(r refusal) error {
	const (
		seccomp       = 317
		setFilter     = 1
		allThreads    = 1
		setNoNewPrivs = 38
		allow         = 0x7fff0000
		refuseWith    = 0x00050000
		load, equal   = syscall.BPF_LD | syscall.BPF_W | syscall.BPF_ABS, syscall.BPF_JMP | syscall.BPF_JEQ | syscall.BPF_K
		and, ret      = syscall.BPF_ALU | syscall.BPF_AND | syscall.BPF_K, syscall.BPF_RET | syscall.BPF_K
		first, third  = 16, 32 // arguments in struct seccomp_data
	)
	program := []syscall.SockFilter{{Code: load, K: 0}, {Code: equal, Jt: 1, Jf: 0, K: uint32(r.number)}, {Code: ret, K: allow}}
	if r.fd >= 0 {
		program = append(program, []syscall.SockFilter{{Code: load, K: first}, {Code: equal, Jt: 1, Jf: 0, K: uint32(r.fd)}, {Code: ret, K: allow}}...)
	}
	if r.mask != 0 {
		program = append(program, []syscall.SockFilter{{Code: load, K: third}, {Code: and, K: r.mask}, {Code: equal, Jt: 1, Jf: 0, K: r.bits}, {Code: ret, K: allow}}...)
	}
	program = append(program, syscall.SockFilter{Code: ret, K: refuseWith | uint32(r.errno)})
	runtime.LockOSThread()
	if _, _, e := syscall.RawSyscall6(syscall.SYS_PRCTL, setNoNewPrivs, 1, 0, 0, 0, 0); e != 0 {
		return e
	}
	list := syscall.SockFprog{Len: uint16(len(program)), Filter: &program[0]}
	if _, _, e := syscall.RawSyscall(seccomp, setFilter, allThreads, uintptr(unsafe.Pointer(&list))); e != 0 {
		return e
	}
	return nil
}

// A process with this variable records one assessment with a system call refused.
const refuseEnv = "SPEEDTRAIL_TEST_REFUSE"

func init() {
	if args := strings.Split(os.Getenv(refuseEnv), "\n"); len(args) == 3 {
		errno, _ := strconv.Atoi(args[2])
		refused(args[0], args[1], syscall.Errno(errno))
		os.Exit(0)
	}
}

func refused(file, what string, errno syscall.Errno) {
	l, err := ledger.Open(context.Background(), file, ledger.Options{Now: clock})
	if err != nil {
		fmt.Println("error", err)
		return
	}
	defer l.Close()
	record := recordOf("refused", 50)
	// The journal gets the least number that is free, as every new file does.
	free, err := syscall.Open("/dev/null", syscall.O_RDONLY, 0)
	if err != nil {
		fmt.Println("error", err)
		return
	}
	_ = syscall.Close(free)
	fds := map[string]int{"journal": free, "database": -1}
	for fd := range 100 {
		if to, err := os.Readlink(fmt.Sprint("/proc/self/fd/", fd)); err == nil && to == file {
			fds["database"] = fd
		}
	}
	call, of, _ := strings.Cut(what, " ")
	r := refusal{fd: -1, errno: errno}
	if of != "" {
		r.fd = fds[of]
	}
	switch call {
	case "write":
		r.number = syscall.SYS_PWRITE64
	case "sync":
		r.number = syscall.SYS_FSYNC
	case "delete":
		r.number = syscall.SYS_UNLINK
	case "create":
		r.number, r.mask, r.bits = syscall.SYS_OPENAT, syscall.O_CREAT, syscall.O_CREAT
	}
	if err := refuse(r); err != nil {
		fmt.Println("no seccomp:", err)
		return
	}
	in, err := l.RecordAssessment(context.Background(), when, record)
	tell(in.Head, err)
}

// What the errors of the system itself become: the class by which a program
// decides, and the hint by which a user does. The meaning of the numbers is that
// of errno(3).
func TestSystemErrors(t *testing.T) {
	for _, test := range []struct {
		what  string
		errno syscall.Errno
		want  error
	}{
		{"write journal", syscall.ENOSPC, ledger.ErrFull},
		{"write journal", syscall.EDQUOT, ledger.ErrFull},
		{"write journal", syscall.EFBIG, ledger.ErrFull},
		{"write database", syscall.ENOSPC, ledger.ErrFull},
		{"write database", syscall.EDQUOT, ledger.ErrFull},
		{"write journal", syscall.EIO, ledger.ErrDamaged},
		{"write database", syscall.EIO, ledger.ErrDamaged},
		{"write journal", syscall.EROFS, ledger.ErrReadOnly},
		{"sync journal", syscall.EIO, ledger.ErrDamaged},
		{"sync journal", syscall.ENOSPC, ledger.ErrFull},
		{"sync journal", syscall.EDQUOT, ledger.ErrFull},
		{"sync database", syscall.EIO, ledger.ErrDamaged},
		{"sync database", syscall.ENOSPC, ledger.ErrFull},
		{"create", syscall.EACCES, ledger.ErrReadOnly},
		{"create", syscall.EROFS, ledger.ErrReadOnly},
		// SQLite tries to open the journal for reading next, and that error is
		// all that is left to see.
		{"create", syscall.ENOSPC, ledger.ErrReadOnly},
		{"delete", syscall.EIO, ledger.ErrDamaged},
		{"delete", syscall.EACCES, ledger.ErrReadOnly},
		{"delete", syscall.EPERM, ledger.ErrReadOnly},
		{"delete", syscall.EROFS, ledger.ErrReadOnly},
	} {
		t.Run(fmt.Sprintf("%s %v", test.what, test.errno), func(t *testing.T) {
			file := filepath.Join(quickDir(t), "ledger.db")
			anchored(t, file)
			eyes := newInspector(t)
			before, err := eyes.files(t.Context(), file)
			if err != nil {
				t.Fatal(err)
			}
			cmd := process(t, "", "", "", 0)
			cmd.Env = append(os.Environ(), refuseEnv+"="+strings.Join([]string{file, test.what, strconv.Itoa(int(test.errno))}, "\n"), quickExit)
			out, err := cmd.Output()
			if err != nil {
				t.Fatal(err)
			}
			if strings.HasPrefix(string(out), "no seccomp") {
				t.Skip(string(out))
			}
			after, err := eyes.files(t.Context(), file)
			if err != nil || after != before {
				t.Errorf("the ledger before was %v, now it is %v, %v", before, after, err)
			}
			told := answerOf(string(out))
			if told.class != test.want.Error() {
				t.Errorf("class %q, %q is right\n%s", told.class, test.want, out)
			}
			if told.hint == "" {
				t.Errorf("no hint: %s", out)
			}
		})
	}
}
