package main

import (
	"errors"
	"os"
	"os/exec"
	"runtime"
	"strconv"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"speedtrail": func() { os.Exit(interruptible(os.Args[1:])) }})
}

// The stories of testdata/scripts run the command as a user does, in a folder
// of their own, with the git program to make repositories.
func TestScripts(t *testing.T) {
	for _, name := range []string{"git", "sqlite3"} {
		if _, err := exec.LookPath(name); err != nil {
			if os.Getenv("CI") == "true" {
				t.Fatal(err)
			}
			t.Skipf("the %s program is not installed", name)
		}
	}
	testscript.Run(t, testscript.Params{
		Dir: "../../testdata/scripts",
		Setup: func(e *testscript.Env) error {
			e.Vars = append(e.Vars,
				"GIT_AUTHOR_NAME=Ada Lund", "GIT_AUTHOR_EMAIL=ada@example.example", "GIT_AUTHOR_DATE=2026-03-01T12:00:00Z",
				"GIT_COMMITTER_NAME=Ada Lund", "GIT_COMMITTER_EMAIL=ada@example.example", "GIT_COMMITTER_DATE=2026-03-01T12:00:00Z",
				"GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_NOSYSTEM=1", "HOME="+e.WorkDir,
			)
			return nil
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){"status": status},
		Condition: func(cond string) (bool, error) {
			if cond == "unix" {
				return runtime.GOOS != "windows", nil
			}
			return false, errors.New("unknown condition " + cond)
		},
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
	})
}

// status runs speedtrail and wants an exit status: status 2 validate nope.
func status(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: status N ARGS...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	got := 0
	if err := ts.Exec("speedtrail", args[1:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%v", err)
		}
		got = exit.ExitCode()
	}
	if got != want {
		ts.Fatalf("exit status %d, want %d", got, want)
	}
}
