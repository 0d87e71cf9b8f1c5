package source

import (
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"
	"unicode"
	"unicode/utf8"

	"pgregory.net/rapid"
)

func TestPosition(t *testing.T) {
	// In their order.
	tests := []struct {
		p    Position
		want string
	}{
		{Position{}, ""},
		{Position{File: "dataset.toml"}, "dataset.toml"},
		{Position{File: "dataset.toml", Line: 2}, "dataset.toml:2"},
		{Position{File: "dataset.toml", Line: 2, Column: 8}, "dataset.toml:2:8"},
		{Position{File: "dataset.toml", Line: 2, Column: 10}, "dataset.toml:2:10"},
		{Position{File: "dataset.toml", Line: 10, Column: 1}, "dataset.toml:10:1"},
		{Position{File: "routes/a\x1b[2Jb/speed.csv", Line: 1, Column: 1}, `routes/a\x1b[2Jb/speed.csv:1:1`},
		{Position{File: "routes/\u202ea", Line: 1}, `routes/\u202ea:1`},
	}
	for i, c := range tests {
		if got := c.p.String(); got != c.want {
			t.Errorf("%#v is written %q, want %q", c.p, got, c.want)
		}
		for k, other := range tests {
			want := 0
			if i < k {
				want = -1
			} else if i > k {
				want = 1
			}
			if got := c.p.Compare(other.p); got != want {
				t.Errorf("%v compared with %v: %d, want %d", c.p, other.p, got, want)
			}
		}
	}
	if (Position{File: "B"}).Compare(Position{File: "a"}) != -1 {
		t.Error("files are not in the order of their bytes")
	}
}

func TestQuote(t *testing.T) {
	tests := []struct{ text, want string }{
		{"", `""`},
		{"47", `"47"`},
		{`say "no"`, `"say \"no\""`},
		{"Ørvik – ö", `"Ørvik – ö"`},
		{"a\tb\nc\x00\x1b[31m", `"a\tb\nc\x00\x1b[31m"`},
		{"\xff", `"\xff"`},
		{"\u202eback", `"\u202eback"`},
		{"a\u200bb", `"a\u200bb"`}, // a blank of no width
		{"a\ufe0fb", `"a\ufe0fb"`}, // a selector that selects nothing
		{strings.Repeat("x", 80), `"` + strings.Repeat("x", 80) + `"`},
		{strings.Repeat("x", 81), `"` + strings.Repeat("x", 80) + `"...`},
		{strings.Repeat("x", 79) + "öö", `"` + strings.Repeat("x", 79) + `"...`},        // no half letter
		{strings.Repeat("x", 77) + "😀x", `"` + strings.Repeat("x", 77) + `"...`},        // three quarters of one
		{strings.Repeat("x", 76) + "😀x", `"` + strings.Repeat("x", 76) + `😀"...`},       // just a whole one
		{"\xff" + strings.Repeat("x", 100), `"\xff` + strings.Repeat("x", 79) + `"...`}, // a byte that is none
		{strings.Repeat("x", 79) + "\xe2x", `"` + strings.Repeat("x", 79) + `\xe2"...`}, // at the cut
		{strings.Repeat("x", 70) + strings.Repeat("\x80", 20), `"` + strings.Repeat("x", 70) + strings.Repeat(`\x80`, 10) + `"...`},
	}
	for _, c := range tests {
		if got := Quote(c.text); got != c.want {
			t.Errorf("Quote(%q) = %s, want %s", c.text, got, c.want)
		}
	}
}

func TestVisible(t *testing.T) {
	tests := []struct{ text, want string }{
		{"", ""},
		{"plain – ö 日本", "plain – ö 日本"},
		{`quotes " and \ stay`, `quotes " and \ stay`},
		{"a\nb\tc", `a\nb\tc`},
		{"\x1b]0;title\a", `\x1b]0;title\a`},
		{"\u202e\u2028\ufeff\u200b", `\u202e\u2028\ufeff\u200b`},
		{"bad \xff\xc3", `bad \xff\xc3`},
		{"\x7f\u0085\u00a0", `\x7f\u0085\u00a0`},
		{"\U000e0041", `\U000e0041`},
		// What Unicode counts among the characters that are printed, and nobody sees.
		{"\ufe0f\u034f\u115f\u3164\uffa0\u17b4\u180b\u2800\U000e0100", `\ufe0f\u034f\u115f\u3164\uffa0\u17b4\u180b\u2800\U000e0100`},
		{"e\u0301 \u0e01\u0e33", "e\u0301 \u0e01\u0e33"}, // marks that are seen
	}
	for _, c := range tests {
		if got := Visible(c.text); got != c.want {
			t.Errorf("Visible(%q) = %q, want %q", c.text, got, c.want)
		}
	}
	if got, want := VisibleLines("a\x07\nb\r\n\nc\u202e"), "a\\a\nb\\r\n\nc\\u202e"; got != want {
		t.Errorf("VisibleLines gives %q, want %q", got, want)
	}
}

// Whatever the text, what is shown of it is printable UTF-8.
func TestShownTextIsPrintable(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := string(rapid.SliceOfN(rapid.Byte(), 0, 200).Draw(t, "text")) + rapid.String().Draw(t, "more")
		for name, shown := range map[string]string{"Visible": Visible(s), "Quote": Quote(s), "VisibleLines": strings.ReplaceAll(VisibleLines(s), "\n", "")} {
			if !utf8.ValidString(shown) || strings.ContainsFunc(shown, func(r rune) bool { return !unicode.IsPrint(r) }) {
				t.Fatalf("%s(%q) = %q", name, s, shown)
			}
		}
	})
}

func TestCollector(t *testing.T) {
	var c Collector
	if err := c.Err(); err != nil || c.Count() != 0 {
		t.Fatalf("%v, %d faults", err, c.Count())
	}
	at := func(line, column int) Position { return Position{"f.csv", line, column} }
	c.Add(at(2, 1), "basic %s is %d", Quote("47"), 47)
	c.Add(at(1, 5), "second in its place")
	c.Add(at(1, 5), "third in its place")
	var other Collector
	other.Add(Position{File: "a.csv"}, "first file")
	other.Add(at(1, 5), "merged in its place")
	c.Merge(&other)
	want := `a.csv: first file
f.csv:1:5: second in its place
f.csv:1:5: third in its place
f.csv:1:5: merged in its place
f.csv:2:1: basic "47" is 47`
	err := c.Err()
	var faults *Faults
	if err.Error() != want || !errors.As(err, &faults) || faults.Count != 5 || c.Count() != 5 {
		t.Errorf("got %d faults\n%v\nwant\n%s", c.Count(), err, want)
	}
	// An error that was given does not change any more.
	c.Add(at(0, 0), "later")
	if err.Error() != want {
		t.Errorf("the error became\n%v", err)
	}
}

// Of many faults the first FaultLimit in the order of positions are listed,
// whichever reader found them, and the others counted.
func TestFaultLimit(t *testing.T) {
	var c, other Collector
	for i := FaultLimit; i > 0; i-- {
		c.Add(Position{"b.csv", i, 0}, "wrong")
		other.Add(Position{"a.csv", i, 0}, "wrong")
	}
	other.Add(Position{"a.csv", FaultLimit + 1, 0}, "wrong")
	c.Merge(&other)
	var faults *Faults
	if !errors.As(c.Err(), &faults) {
		t.Fatal("no faults")
	}
	if len(faults.List) != FaultLimit || faults.Count != 2*FaultLimit+1 {
		t.Errorf("%d listed of %d", len(faults.List), faults.Count)
	}
	if !slices.IsSortedFunc(faults.List, func(a, b Fault) int { return a.Compare(b.Position) }) || faults.List[FaultLimit-1].File != "a.csv" {
		t.Error("the listed ones are not the first ones")
	}
	if want := fmt.Sprintf("\n%d more faults not listed", FaultLimit+1); !strings.HasSuffix(faults.Error(), want) {
		t.Errorf("the text ends with %q", faults.Error()[len(faults.Error())-60:])
	}
}

// A fault that says what others come of takes their place.
func TestDrop(t *testing.T) {
	var c Collector
	for i := range 4 {
		c.Add(Position{File: "f", Line: i + 1}, "problem")
	}
	c.Drop(2)
	if err := c.Err(); c.Count() != 2 || err.Error() != "f:1: problem\nf:4: problem" {
		t.Errorf("%d faults: %v", c.Count(), err)
	}
	for range FaultLimit {
		c.Add(Position{File: "g", Line: 1}, "problem")
	}
	if c.Drop(1); c.Count() != FaultLimit+2 {
		t.Errorf("%d faults", c.Count())
	}
}
