package chain

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strings"
	"testing"
	"time"
)

var when = time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)

func sample(n int) []Entry {
	var list []Entry
	var head Head
	for i := range n {
		e := Next(head, when.Add(time.Duration(i)*time.Minute), Assessment, fmt.Appendf(nil, `{"n":%d}`, i))
		head = e.Head()
		list = append(list, e)
	}
	return list
}

// check walks a chain and gives the first error.
func check(list []Entry) error {
	var head Head
	for _, e := range list {
		if err := Check(head, e); err != nil {
			return err
		}
		head = e.Head()
	}
	return nil
}

func TestChain(t *testing.T) {
	if err := check(sample(100)); err != nil {
		t.Fatal(err)
	}
	if got, want := sample(1)[0].Previous, strings.Repeat("0", 64); got != want {
		t.Errorf("the first entry names %s", got)
	}
}

func TestCheckFindsTampering(t *testing.T) {
	tests := []struct {
		name   string
		tamper func([]Entry) []Entry
		want   error
	}{
		{"body", func(l []Entry) []Entry { l[3].Body = []byte(`{"n":9}`); return l }, ErrHash},
		{"time", func(l []Entry) []Entry { l[3].Time = "2026-03-01T12:09:00Z"; return l }, ErrHash},
		{"time's form", func(l []Entry) []Entry { l[3].Time = "2026-03-01 12:03:00"; return l }, ErrTime},
		{"time that is none", func(l []Entry) []Entry { l[3].Time = "2026-02-30T12:03:00Z"; return l }, ErrTime},
		{"time with a fraction, hashed again", func(l []Entry) []Entry { return retimed(l, "2026-03-01T12:03:00.5Z") }, ErrTime},
		{"time with a comma, hashed again", func(l []Entry) []Entry { return retimed(l, "2026-03-01T12:03:00,5Z") }, ErrTime},
		{"time with a short hour, hashed again", func(l []Entry) []Entry { return retimed(l, "2026-03-01T2:03:00Z") }, ErrTime},
		{"time of another zone, hashed again", func(l []Entry) []Entry { return retimed(l, "2026-03-01T13:03:00+01:00") }, ErrTime},
		{"kind", func(l []Entry) []Entry { l[3].Kind = Ledger; return l }, ErrHash},
		{"hash", func(l []Entry) []Entry { l[3].Hash = l[2].Hash; return l }, ErrHash},
		{"previous", func(l []Entry) []Entry { l[3].Previous = l[1].Hash; return l }, ErrPrevious},
		{"removed", func(l []Entry) []Entry { return append(l[:3], l[4:]...) }, ErrSequence},
		{"first removed", func(l []Entry) []Entry { return l[1:] }, ErrSequence},
		{"twice", func(l []Entry) []Entry { return append(l[:4], l[3:]...) }, ErrSequence},
		{"reordered", func(l []Entry) []Entry { l[3], l[4] = l[4], l[3]; return l }, ErrSequence},
		{"renumbered after a removal", func(l []Entry) []Entry {
			l = append(l[:3], l[4:]...)
			for i := range l {
				l[i].Seq = int64(i + 1)
			}
			return l
		}, ErrPrevious},
		{"altered and hashed again", func(l []Entry) []Entry {
			l[3].Body = []byte(`{"n":9}`)
			l[3].Hash = l[3].sum()
			return l
		}, ErrPrevious},
	}
	for _, test := range tests {
		if err := check(test.tamper(sample(6))); !errors.Is(err, test.want) {
			t.Errorf("%s: got %v, want %v", test.name, err, test.want)
		}
	}
}

// retimed gives an entry another time and the hash that goes with it: only the form
// of the time is wrong.
func retimed(l []Entry, time string) []Entry {
	l[3].Time = time
	l[3].Hash = l[3].sum()
	return l
}

// The same hash by the sha256sum program, from the package comment alone.
func TestAgainstSHA256Sum(t *testing.T) {
	program, err := exec.LookPath("sha256sum")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the sha256sum program is not installed")
	}
	sum := func(b []byte) string {
		cmd := exec.Command(program)
		cmd.Stdin = bytes.NewReader(b)
		out, err := cmd.Output()
		if err != nil {
			t.Fatal(err)
		}
		return string(out[:64])
	}
	previous := strings.Repeat("0", 64)
	for i, e := range sample(3) {
		text := fmt.Sprintf("speedtrail-entry 1\n%d\n%s\nassessment\n%s\n%s\n", i+1, e.Time, sum(e.Body), previous)
		if previous = sum([]byte(text)); previous != e.Hash {
			t.Fatalf("entry %d: %s, sha256sum gives %s", i+1, e.Hash, previous)
		}
	}
}

func TestParseHead(t *testing.T) {
	h := sample(2)[1].Head()
	if got, err := ParseHead(h.String()); err != nil || got != h {
		t.Errorf("got %v, %v", got, err)
	}
	for _, s := range []string{"", "2", "2:abc", "0:" + h.Hash, "-1:" + h.Hash, "02:" + h.Hash, "2:" + strings.ToUpper(h.Hash), h.String() + "0"} {
		if _, err := ParseHead(s); err == nil {
			t.Errorf("%q was read", s)
		}
	}
}

func Example() {
	first := Next(Head{}, time.Date(2026, 3, 1, 0, 0, 0, 0, time.UTC), Ledger, []byte(`{"format":1,"id":"00"}`))
	second := Next(first.Head(), time.Date(2026, 3, 2, 0, 0, 0, 0, time.UTC), Assessment, []byte(`{}`))
	fmt.Println(second.Seq, second.Previous == first.Hash, Check(first.Head(), second))
	// Output: 2 true <nil>
}
