package ledger_test

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// rivalEnv makes this program a process that works on a ledger; see rival.
const rivalEnv = "SPEEDTRAIL_TEST_RIVAL"

// A process with rivalEnv does what it says and ends. That takes no TestMain,
// which a package has one of only.
func init() {
	if args := strings.Split(os.Getenv(rivalEnv), "\n"); len(args) == 4 {
		number, _ := strconv.Atoi(args[3])
		rival(args[0], args[1], args[2], number)
		os.Exit(0)
	}
}

// rival does a piece of work and prints every head that was reported to it, or
// the class, hint and text of an error.
func rival(work, file, name string, number int) {
	ctx := context.Background()
	o := ledger.Options{Now: clock, Wait: time.Minute}
	switch work {
	case "import in place":
		ledger.WithoutLinks()
		fallthrough
	case "import":
		tell(history.Import(ctx, file, os.Stdin))
		return
	case "read":
		o.ReadOnly = true
	case "make":
		o.Create = true
	}
	l, err := ledger.Open(ctx, file, o)
	if err != nil {
		tell(chain.Head{}, err)
		return
	}
	defer l.Close()
	fmt.Println("ready")
	switch work {
	case "work": // assessments and sign-offs in turn
		for i := range number {
			in, err := l.RecordAssessment(ctx, when, recordOf(fmt.Sprint(name, "-", i), 20))
			if !tell(in.Head, err) || !tell(signOff(ctx, l, when, in.Number, i%people)) {
				return
			}
		}
	case "record", "make":
		tell(assess(ctx, l, when, name, number))
	case "read":
		tell(verified(ctx, l))
	case "hold": // the lock for writing, until the standard input ends
		_, err := l.Append(ctx, when, chain.Assessment, func() ([]byte, []ledger.Row, error) {
			fmt.Println("locked")
			_, err := io.Copy(io.Discard, os.Stdin)
			return nil, nil, errors.Join(err, errors.New("given up"))
		})
		fmt.Println(err)
	}
}

// tell prints the head that was reported, or the class, hint and text of an error.
func tell(head chain.Head, err error) bool {
	if err == nil {
		fmt.Println("recorded", head)
		return true
	}
	var e *ledger.Error
	if errors.As(err, &e) {
		fmt.Printf("class %s\nhint %s\n", e.Class, e.Hint())
	}
	fmt.Println("error", err)
	return false
}

// answer is what a process was told last.
type answer struct{ head, class, hint, text string }

func answerOf(out string) (a answer) {
	for line := range strings.Lines(out) {
		name, value, _ := strings.Cut(strings.TrimSuffix(line, "\n"), " ")
		switch name {
		case "recorded":
			a = answer{head: value}
		case "class":
			a.class = value
		case "hint":
			a.hint = value
		case "error":
			a.text = value
		}
	}
	return a
}

// quickExit spares a process under the race detector the second for which it
// waits at its end.
var quickExit = strings.TrimSpace("GORACE=" + os.Getenv("GORACE") + " atexit_sleep_ms=0")

// process prepares a rival.
func process(t testing.TB, work, file, name string, number int) *exec.Cmd {
	cmd := exec.CommandContext(t.Context(), os.Args[0])
	cmd.Env = append(os.Environ(), rivalEnv+"="+strings.Join([]string{work, file, name, strconv.Itoa(number)}, "\n"), quickExit)
	cmd.Stderr = os.Stderr
	return cmd
}

// heads reads what a rival was told; a last line that was cut off does not count.
func heads(t testing.TB, out string) (list []chain.Head) {
	t.Helper()
	for line := range strings.Lines(out) {
		text, found := strings.CutPrefix(line, "recorded ")
		text, whole := strings.CutSuffix(text, "\n")
		if !found || !whole {
			continue
		}
		h, err := chain.ParseHead(text)
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, h)
	}
	return list
}

// untilKilled starts a rival, and kills it a while after it has opened the
// ledger; 0: not at all. It gives what it printed.
func untilKilled(t testing.TB, cmd *exec.Cmd, after time.Duration) string {
	pipe, err := cmd.StdoutPipe()
	if err == nil {
		err = cmd.Start()
	}
	if err != nil {
		t.Error(err)
		return ""
	}
	out := bufio.NewReader(pipe)
	first, _ := out.ReadString('\n')
	if after > 0 {
		time.Sleep(after)
		_ = cmd.Process.Kill()
	}
	rest, _ := io.ReadAll(out)
	_ = cmd.Wait()
	if first != "ready\n" {
		t.Errorf("the process did not open the ledger: %s%s", first, rest)
	}
	return string(rest)
}

// A process that records assessments and sign-offs in turn is killed at random:
// each entry is whole or not there, and what was reported to it is there.
func TestKillWhileSigning(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	anchored(t, file)
	random := rand.New(rand.NewPCG(3, 4))
	var noted []chain.Head
	journals := 0
	for round := range 20 {
		cmd := process(t, "work", file, fmt.Sprint("k", round), 1000)
		noted = append(noted, heads(t, untilKilled(t, cmd, time.Duration(1+random.IntN(60_000))*time.Microsecond))...)
		if _, err := os.Stat(file + "-journal"); err == nil {
			journals++
		}
		l, err := ledger.Open(t.Context(), file, ledger.Options{Now: clock})
		if err != nil {
			t.Fatal("round ", round, ": ", err)
		}
		head, err := verified(t.Context(), l, noted...)
		l.Close()
		if err != nil || len(noted) > 0 && head.Seq < noted[len(noted)-1].Seq {
			t.Fatalf("round %d: head %v, reported last %v: %v", round, head, noted[len(noted)-1], err)
		}
	}
	t.Logf("%d heads were reported, %d journals were left behind", len(noted), journals)
	if len(noted) == 0 {
		t.Error("nothing was recorded before the kills")
	}
}

// Several processes record and sign at once, and some of them are killed: every
// head that was reported to any of them stands in the one chain.
func TestRivals(t *testing.T) {
	for _, test := range []struct{ processes, rounds, killed int }{{2, 6, 0}, {8, 3, 3}} {
		t.Run(fmt.Sprint(test.processes), func(t *testing.T) {
			file := filepath.Join(t.TempDir(), "ledger.db")
			anchored(t, file)
			random := rand.New(rand.NewPCG(5, 6))
			outputs := make([]string, test.processes)
			var group sync.WaitGroup
			for i := range test.processes {
				rounds, after := test.rounds, time.Duration(0)
				if i < test.killed {
					rounds, after = 1000, time.Duration(20+random.IntN(400))*time.Millisecond
				}
				cmd := process(t, "work", file, fmt.Sprint("p", i), rounds)
				group.Go(func() { outputs[i] = untilKilled(t, cmd, after) })
			}
			group.Wait()
			var noted []chain.Head
			for i, out := range outputs {
				list := heads(t, out)
				if i >= test.killed && len(list) != 2*test.rounds {
					t.Errorf("process %d was told of %d entries: %s", i, len(list), out)
				}
				noted = append(noted, list...)
			}
			l := opened(t, file, ledger.Options{})
			head, err := verified(t.Context(), l, noted...)
			if err != nil {
				t.Fatal(err)
			}
			line, problems, err := history.ReadLine(t.Context(), l)
			if err != nil || len(problems) > 0 {
				t.Fatal(problems, err)
			}
			unreported := int(head.Seq) - 3 - len(noted)
			if unreported < 0 || unreported > test.killed {
				t.Errorf("%d entries, %d were reported", head.Seq-3, len(noted))
			}
			if n := len(line.SignOffs()); n < (test.processes-test.killed)*test.rounds {
				t.Errorf("%d sign-offs", n)
			}
			t.Logf("%d entries, %d reported", head.Seq, len(noted))
		})
	}
}

// Somebody who verifies, or reads the register, while others record and sign sees
// a whole ledger every time.
func TestReaderAmongWriters(t *testing.T) {
	file := filepath.Join(quickDir(t), "ledger.db")
	anchored(t, file)
	var group sync.WaitGroup
	for i := range 2 {
		cmd := process(t, "work", file, fmt.Sprint("w", i), 12)
		group.Go(func() { untilKilled(t, cmd, 0) })
	}
	done := make(chan struct{})
	go func() { group.Wait(); close(done) }()
	wrong := map[string]int{}
	runs := 0
	for running := true; running; runs++ {
		select {
		case <-done:
			running = false
		default:
		}
		l := opened(t, file, ledger.Options{ReadOnly: true, Wait: time.Minute})
		if _, problems, err := history.ReadLine(t.Context(), l); err != nil || len(problems) > 0 {
			wrong[fmt.Sprint(problems, err)]++
		}
		if _, err := verified(t.Context(), l); err != nil {
			wrong[err.Error()]++
		}
		l.Close()
	}
	t.Log(runs, "times")
	for text, times := range wrong {
		t.Errorf("%d of %d times: %s", times, runs, text)
	}
}

// The same with others coming in at every single moment at which they can: after
// each time that the reader has given up its lock.
func TestReaderBetweenReads(t *testing.T) {
	disk := useDisk(t)
	dir := quickDir(t)
	template := filepath.Join(dir, "template.db")
	anchored(t, template)
	content, err := os.ReadFile(template)
	if err != nil {
		t.Fatal(err)
	}
	for n, last := 1, false; !last; n++ {
		file := filepath.Join(dir, fmt.Sprint(n, ".db"))
		if err := os.WriteFile(file, content, 0o644); err != nil {
			t.Fatal(err)
		}
		l := opened(t, file, onDisk(ledger.Options{ReadOnly: true}))
		last = true
		disk.rivals(func(i int) {
			if i != n {
				return
			}
			last = false
			rival, err := ledger.Open(t.Context(), file, ledger.Options{})
			if err != nil {
				t.Error(err)
				return
			}
			defer rival.Close()
			if _, err := assess(t.Context(), rival, when, "two", 2); err != nil {
				t.Error(err)
			}
			if _, err := signOff(t.Context(), rival, when, 1, 3); err != nil {
				t.Error(err)
			}
		})
		_, err := verified(t.Context(), l)
		if err != nil {
			t.Errorf("others record after read %d: %v", n, err)
		}
		disk.rivals(nil)
		l.Close()
		os.Remove(file)
	}
}
