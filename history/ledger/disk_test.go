package ledger_test

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"

	"github.com/psanford/sqlite3vfs"

	"speedtrail/history/ledger"
)

// diskName is the name under which SQLite knows the disk of these tests.
const diskName = "speedtrail-test-disk"

// callKind is the kind of a call that alters what a disk holds.
type callKind string

const (
	creation   callKind = "create"
	writing    callKind = "write"
	truncation callKind = "truncate"
	syncing    callKind = "sync"
	deletion   callKind = "delete"
)

// call is one such call.
type call struct {
	kind callKind
	file string // base name
	off  int64  // of a write; the size of a truncation
	data []byte
	// dir tells that the folder is synced as well: SQLite's own layer does so with
	// the first sync of a new journal, and for a deletion when it is asked to.
	dir bool
	// reported is not of a call: it names, after all calls before, what was
	// reported as recorded.
	reported string
}

// fault says which call fails and how.
type fault struct {
	at      int  // the number of the call, from 1; 0: none
	sticky  bool // and all later ones
	partly  bool // it does half its work before it fails
	noSpace bool // as a full disk; else as a broken one
	// hit is the call that failed first.
	hit call
}

// disk is a layer between SQLite and the files of one folder. It counts the calls
// that alter something, fails some, and writes them down. It knows no locks:
// these tests have one connection at a time.
type disk struct {
	lock    sync.Mutex
	calls   int
	fault   fault
	log     []call
	logging bool
	// between is called when a lock is given up, with the number of times it was:
	// where another process may come in.
	between func(n int)
	unlocks int
}

var (
	theDisk     = &disk{}
	registering sync.Once
)

// useDisk gives the disk, whole and with nothing written down.
func useDisk(t testing.TB) *disk {
	t.Helper()
	registering.Do(func() {
		if err := sqlite3vfs.RegisterVFS(diskName, theDisk); err != nil {
			t.Fatal(err)
		}
	})
	theDisk.set(fault{}, false)
	t.Cleanup(func() { theDisk.set(fault{}, false) })
	return theDisk
}

// onDisk gives options that go through the disk.
func onDisk(o ledger.Options) ledger.Options { return ledger.WithVFS(o, diskName) }

func (d *disk) set(f fault, logging bool) {
	d.lock.Lock()
	defer d.lock.Unlock()
	d.calls, d.fault, d.log, d.logging, d.between, d.unlocks = 0, f, nil, logging, nil, 0
}

// state gives the number of calls, the one that failed first, and the log.
func (d *disk) state() (calls int, hit call, log []call) {
	d.lock.Lock()
	defer d.lock.Unlock()
	return d.calls, d.fault.hit, d.log
}

// rivals lets others come in whenever the lock is given up.
func (d *disk) rivals(between func(n int)) {
	d.lock.Lock()
	defer d.lock.Unlock()
	d.between, d.unlocks = between, 0
}

// report writes down that something was reported as recorded.
func (d *disk) report(what string) {
	d.lock.Lock()
	defer d.lock.Unlock()
	d.log = append(d.log, call{reported: what})
}

// do counts a call, and does it unless it is to fail. half does a part of it.
func (d *disk) do(c call, whole, half func() error) error {
	d.lock.Lock()
	defer d.lock.Unlock()
	if c.kind != creation {
		d.calls++
		if f := &d.fault; f.at != 0 && (d.calls == f.at || f.sticky && d.calls > f.at) {
			if f.hit.kind == "" {
				f.hit = c
				f.hit.data = nil
			}
			if f.partly && half != nil {
				if err := half(); err != nil {
					return err
				}
			}
			if f.noSpace {
				return sqlite3vfs.FullError
			}
			return sqlite3vfs.IOError
		}
	}
	if err := whole(); err != nil {
		return err
	}
	if d.logging && c.file != "" {
		c.data = append([]byte(nil), c.data...)
		d.log = append(d.log, c)
	}
	return nil
}

// native is the name of a file as the system has it: of a URI with a drive letter
// SQLite gives the slash before it to a layer that is not its own.
func native(name string) string {
	if runtime.GOOS == "windows" {
		return filepath.FromSlash(strings.TrimPrefix(name, "/"))
	}
	return name
}

func (d *disk) Open(name string, flags sqlite3vfs.OpenFlag) (sqlite3vfs.File, sqlite3vfs.OpenFlag, error) {
	name = native(name)
	if name == "" {
		f, err := os.CreateTemp("", "speedtrail-test-")
		if err != nil {
			return nil, 0, sqlite3vfs.CantOpenError
		}
		os.Remove(f.Name())
		return &diskFile{disk: d, file: f}, flags, nil
	}
	mode := os.O_RDONLY
	if flags&sqlite3vfs.OpenReadWrite != 0 {
		mode = os.O_RDWR
	}
	if flags&sqlite3vfs.OpenCreate != 0 {
		mode |= os.O_CREATE
	}
	if flags&sqlite3vfs.OpenExclusive != 0 {
		mode |= os.O_EXCL
	}
	_, err := os.Stat(name)
	fresh := errors.Is(err, fs.ErrNotExist)
	var f *os.File
	open := func() error {
		f, err = os.OpenFile(name, mode, 0o644)
		return err
	}
	if fresh {
		err = d.do(call{kind: creation, file: filepath.Base(name)}, open, nil)
	} else {
		err = open()
	}
	if err != nil {
		return nil, 0, sqlite3vfs.CantOpenError
	}
	return &diskFile{disk: d, file: f, name: filepath.Base(name), newJournal: fresh && flags&sqlite3vfs.OpenMainJournal != 0}, flags, nil
}

func (d *disk) Delete(name string, dirSync bool) error {
	name = native(name)
	remove := func() error {
		if err := os.Remove(name); err != nil {
			return sqlite3vfs.IOError
		}
		return nil
	}
	// The half of it: the file is gone, and the sync of the folder fails.
	return d.do(call{kind: deletion, file: filepath.Base(name), dir: dirSync}, remove, remove)
}

// Access does as SQLite's own layer: an empty file does not count.
func (d *disk) Access(name string, _ sqlite3vfs.AccessFlag) (bool, error) {
	info, err := os.Stat(native(name))
	return err == nil && (!info.Mode().IsRegular() || info.Size() > 0), nil
}

func (d *disk) FullPathname(name string) string { return name } // the ledger gives full ones

type diskFile struct {
	disk       *disk
	file       *os.File
	name       string // empty for a temporary file
	newJournal bool   // its folder was not synced yet
}

func (f *diskFile) Close() error { return f.file.Close() }

func (f *diskFile) ReadAt(p []byte, off int64) (int, error) { return f.file.ReadAt(p, off) }

func (f *diskFile) WriteAt(p []byte, off int64) (n int, err error) {
	write := func(part []byte) func() error {
		return func() error {
			n, err = f.file.WriteAt(part, off)
			return err
		}
	}
	err = f.disk.do(call{kind: writing, file: f.name, off: off, data: p}, write(p), write(p[:len(p)/2]))
	return n, err
}

func (f *diskFile) Truncate(size int64) error {
	return f.disk.do(call{kind: truncation, file: f.name, off: size}, func() error { return f.file.Truncate(size) }, nil)
}

// Sync writes nothing down on the true disk: what would be lost is worked out
// from the log.
func (f *diskFile) Sync(sqlite3vfs.SyncType) error {
	return f.disk.do(call{kind: syncing, file: f.name, dir: f.newJournal}, func() error { f.newJournal = false; return nil }, nil)
}

func (f *diskFile) FileSize() (int64, error) {
	info, err := f.file.Stat()
	if err != nil {
		return 0, err
	}
	return info.Size(), nil
}

func (f *diskFile) Lock(sqlite3vfs.LockType) error { return nil }

func (f *diskFile) Unlock(to sqlite3vfs.LockType) error {
	d := f.disk
	d.lock.Lock()
	between := d.between
	if to == sqlite3vfs.LockNone {
		d.unlocks++
	}
	n := d.unlocks
	d.lock.Unlock()
	if between != nil && to == sqlite3vfs.LockNone {
		between(n)
	}
	return nil
}

// CheckReservedLock is asked only where this connection has no lock, and there is
// no other. The module hands the answer on turned round: true is "nobody has".
func (f *diskFile) CheckReservedLock() (bool, error) { return true, nil }

// SectorSize and DeviceCharacteristics are those that SQLite takes on Unix.
func (f *diskFile) SectorSize() int64 { return 4096 }
func (f *diskFile) DeviceCharacteristics() sqlite3vfs.DeviceCharacteristic {
	return sqlite3vfs.IocapPowersafeOverwrite
}

// String names a call for a message.
func (c call) String() string {
	if c.kind == "" {
		return "no call"
	}
	if strings.HasSuffix(c.file, "-journal") {
		return string(c.kind) + " of the journal"
	}
	if c.file == "" {
		return string(c.kind) + " of a temporary file"
	}
	return string(c.kind) + " of the database"
}
