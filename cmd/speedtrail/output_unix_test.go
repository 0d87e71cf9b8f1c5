//go:build unix

package main

import (
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
	"testing"
)

// A new file is open to whom the user has new files open to, and one that is
// replaced stays so.
func TestWriteFileRights(t *testing.T) {
	defer syscall.Umask(syscall.Umask(0))
	for _, x := range []struct {
		name   string
		umask  int
		before fs.FileMode // 0: there is none
		want   fs.FileMode
	}{
		{"the usual umask", 0o022, 0, 0o644},
		{"nobody else", 0o077, 0, 0o600},
		{"the group may write", 0o002, 0, 0o664},
		{"one that was closed", 0o022, 0o600, 0o600},
		{"one that was open", 0o077, 0o664, 0o664},
	} {
		t.Run(x.name, func(t *testing.T) {
			name := filepath.Join(t.TempDir(), "out.txt")
			if x.before != 0 {
				if err := os.WriteFile(name, []byte("old"), 0o600); err != nil {
					t.Fatal(err)
				}
				if err := os.Chmod(name, x.before); err != nil {
					t.Fatal(err)
				}
			}
			syscall.Umask(x.umask)
			err := writeBytes(name, []byte("new"))
			syscall.Umask(0)
			if err != nil {
				t.Fatal(err)
			}
			info, err := os.Stat(name)
			if err != nil {
				t.Fatal(err)
			}
			if got := info.Mode().Perm(); got != x.want {
				t.Errorf("mode %o, want %o", got, x.want)
			}
			if content, err := os.ReadFile(name); err != nil || string(content) != "new" {
				t.Errorf("%q, %v", content, err)
			}
		})
	}
}
