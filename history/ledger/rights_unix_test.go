//go:build unix

package ledger_test

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"

	"speedtrail/history/ledger"
)

// plainly makes a process run without the rights of root, to whom no file is
// read-only.
func plainly(t testing.TB, cmd *exec.Cmd) *exec.Cmd {
	t.Helper()
	if os.Geteuid() != 0 {
		return cmd
	}
	if runtime.GOOS != "linux" {
		t.Skip("root may write everything, and the test program is out of the reach of others")
	}
	// The program lies in a folder of root's; this way to it asks for no rights.
	cmd.Path = "/proc/self/exe"
	cmd.Dir = "/"
	const nobody = 65534
	cmd.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: nobody, Gid: nobody, NoSetGroups: true}}
	return cmd
}

// What somebody meets who may not write: the ledger, its folder, or either; for
// recording, reading and making a new one.
func TestRights(t *testing.T) {
	for _, test := range []struct {
		name         string
		file, folder os.FileMode
		record, read error // nil: it works
	}{
		{"all rights", 0o666, 0o777, nil, nil},
		{"read-only file", 0o444, 0o777, ledger.ErrReadOnly, nil},
		{"read-only folder", 0o666, 0o555, ledger.ErrReadOnly, nil},
		{"both read-only", 0o444, 0o555, ledger.ErrReadOnly, nil},
		{"file of somebody else", 0o600, 0o777, ledger.ErrReadOnly, ledger.ErrReadOnly},
		{"folder of somebody else", 0o666, 0o700, ledger.ErrReadOnly, ledger.ErrReadOnly},
	} {
		t.Run(test.name, func(t *testing.T) {
			outer := quickDir(t)
			dir := filepath.Join(outer, "folder")
			file := filepath.Join(dir, "ledger.db")
			if err := os.Mkdir(dir, 0o755); err != nil {
				t.Fatal(err)
			}
			anchored(t, file)
			if os.Geteuid() != 0 && (test.file == 0o600 || test.folder == 0o700) {
				t.Skip("only root can give a file to somebody else")
			}
			for path, mode := range map[string]os.FileMode{file: test.file, dir: test.folder, outer: 0o755} {
				if err := os.Chmod(path, mode); err != nil {
					t.Fatal(err)
				}
			}
			t.Cleanup(func() { os.Chmod(dir, 0o755) })
			for _, work := range []struct {
				work, file string
				want       error
			}{{"read", file, test.read}, {"record", file, test.record}, {"make", filepath.Join(dir, "below", "new.db"), folderError(test.folder)}} {
				out, err := plainly(t, process(t, work.work, work.file, "plain", 2)).Output()
				if err != nil {
					t.Fatal(err)
				}
				told := answerOf(string(out))
				switch {
				case work.want == nil && told.head == "":
					t.Errorf("%s: %s", work.work, out)
				case work.want != nil && told.class != work.want.Error():
					t.Errorf("%s: class %q, %q is right\n%s", work.work, told.class, work.want, out)
				case work.want != nil && !strings.Contains(told.hint, "rights"):
					t.Errorf("%s: hint %q", work.work, told.hint)
				}
			}
			l := opened(t, file, ledger.Options{ReadOnly: true})
			want := int64(3)
			if test.record == nil {
				want = 4
			}
			if head, err := verified(t.Context(), l); err != nil || head.Seq != want {
				t.Error(head, err)
			}
		})
	}
}

func folderError(mode os.FileMode) error {
	if mode == 0o777 {
		return nil
	}
	return ledger.ErrReadOnly
}

// A ledger of the first format that may not be written is read all the same, and
// opening it for writing says why that does not work.
func TestRightsOfFirstFormat(t *testing.T) {
	dir := quickDir(t)
	file := filepath.Join(dir, "ledger.db")
	ledger.CreateFormat(t, file, 1, when, strings.Repeat("ab", 16), recordOf("one", 2))
	for path, mode := range map[string]os.FileMode{file: 0o444, dir: 0o755} {
		if err := os.Chmod(path, mode); err != nil {
			t.Fatal(err)
		}
	}
	for work, want := range map[string]string{"read": "", "record": fmt.Sprint(ledger.ErrReadOnly)} {
		out, err := plainly(t, process(t, work, file, "plain", 2)).Output()
		if err != nil {
			t.Fatal(err)
		}
		if told := answerOf(string(out)); told.class != want || want == "" && told.head == "" {
			t.Errorf("%s: %s", work, out)
		}
	}
}

// A journal that was left behind in a place that may not be written: the error
// says so, and the ledger is not read as it must not be.
func TestRightsWithHotJournal(t *testing.T) {
	dir := quickDir(t)
	file := filepath.Join(dir, "ledger.db")
	hotJournal(t, file)
	for path, mode := range map[string]os.FileMode{file: 0o444, file + "-journal": 0o444, dir: 0o555} {
		if err := os.Chmod(path, mode); err != nil {
			t.Fatal(err)
		}
	}
	t.Cleanup(func() { os.Chmod(dir, 0o755) })
	for _, work := range []string{"read", "record"} {
		out, err := plainly(t, process(t, work, file, "plain", 2)).Output()
		if err != nil {
			t.Fatal(err)
		}
		if told := answerOf(string(out)); told.class != ledger.ErrReadOnly.Error() || told.hint == "" {
			t.Errorf("%s: %s", work, out)
		}
	}
}
