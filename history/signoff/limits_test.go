package signoff

import (
	"errors"
	"fmt"
	"strings"
	"testing"
)

// A reason, a statement and a signature of as many bytes as are allowed, and of
// one more.
func TestLimits(t *testing.T) {
	good := example(SignOff)
	good.Reason = strings.Repeat("ö", MaxReason/2)
	text, err := good.Text()
	if err != nil {
		t.Fatal(err)
	}
	if again, err := Parse(text); err != nil || again.Reason != good.Reason {
		t.Errorf("a reason of %d bytes: %v", MaxReason, err)
	}
	good.Reason += "x"
	want := "malformed statement: the reason has 501 bytes, at most 500 are allowed"
	if _, err := good.Text(); !errors.Is(err, ErrMalformed) || err.Error() != want {
		t.Errorf("written: %v, want %s", err, want)
	}
	if _, err := Parse([]byte(strings.Replace(string(text), "reason: ", "reason: x", 1))); !errors.Is(err, ErrMalformed) || err.Error() != want {
		t.Errorf("read: %v, want %s", err, want)
	}

	good.Reason = "r"
	good.Folder = "f"
	if text, err = good.Text(); err != nil {
		t.Fatal(err)
	}
	good.Folder = strings.Repeat("f", MaxStatement-len(text)+1)
	if text, err = good.Text(); err != nil || len(text) != MaxStatement {
		t.Fatalf("%d bytes, %v", len(text), err)
	}
	if again, err := Parse(text); err != nil || again.Folder != good.Folder {
		t.Errorf("a statement of %d bytes: %v", len(text), err)
	}
	good.Folder += "f"
	want = "malformed statement: longer than 65536 bytes"
	if _, err := good.Text(); err == nil || err.Error() != want {
		t.Errorf("written: %v, want %s", err, want)
	}
	if _, err := Parse([]byte(strings.Replace(string(text), "folder: ", "folder: f", 1))); err == nil || err.Error() != want {
		t.Errorf("read: %v, want %s", err, want)
	}

	// No key of today fills a signature up to its limit; at it the form is looked
	// at, past it only the length.
	padded := func(n int) []byte {
		return []byte(armorBegin + strings.Repeat("A", n-len(armorBegin)-len(armorEnd)) + armorEnd)
	}
	for n, past := range map[int]bool{MaxSignature: false, MaxSignature + 1: true} {
		_, _, err := Key(padded(n))
		if !errors.Is(err, ErrSignature) || strings.Contains(err.Error(), "longer than 16384 bytes") != past {
			t.Errorf("%d bytes: %v", n, err)
		}
	}
}

// Characters that can deceive a reader (signoff.md, Signing): each by itself, in
// a value that is else the same, written and read.
func TestDeceivingCharacters(t *testing.T) {
	text, err := example(SignOff).Text()
	if err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]rune{
		"a tab": '\t', "a carriage return": '\r', "an escape": 0x1b, "delete": 0x7f, "a next line": 0x85,
		"a line separator": 0x2028, "a paragraph separator": 0x2029, "a byte order mark": 0xFEFF,
		"a right-to-left override": 0x202E, "a left-to-right mark": 0x200E, "an Arabic letter mark": 0x061C, "the end of an isolate": 0x2069,
	} {
		want := fmt.Sprintf("holds the character %U, which can deceive a reader", c)
		s := example(SignOff)
		s.Reason = "checked" + string(c) + "it"
		if _, err := s.Text(); !errors.Is(err, ErrMalformed) || !strings.Contains(err.Error(), "reason "+want) {
			t.Errorf("%s, written: %v", name, err)
		}
		forged := strings.Replace(string(text), "checked", "checked"+string(c), 1)
		if _, err := Parse([]byte(forged)); !errors.Is(err, ErrMalformed) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s, read: %v", name, err)
		}
	}
	// What only looks unusual may stand.
	s := example(SignOff)
	s.Reason = "Prüfung über 3 Blätter – naïve, 軌道, 🚆"
	if _, err := s.Text(); err != nil {
		t.Error(err)
	}
}

// The names of routes that would stand for something else in the list of a statement.
func TestRoutesOfStatement(t *testing.T) {
	for name, routes := range map[string][]string{
		"the word for all": {AllRoutes}, "two in one": {"R1,R2"}, "none beside one": {"R1", ""}, "none": {""}, "a blank before": {"R1", " R2"}, "a blank behind": {"R1 ", "R2"},
	} {
		s := example(InForce)
		s.Routes = routes
		if _, err := s.Text(); !errors.Is(err, ErrMalformed) {
			t.Errorf("%s, written: %v", name, err)
		}
	}
	s := example(InForce)
	s.Routes = []string{"R1"}
	text, err := s.Text()
	if err != nil {
		t.Fatal(err)
	}
	for _, list := range []string{"R1,", ",R1", "R1,,R2", "R1, R2", "R1 ,R2"} {
		forged := strings.Replace(string(text), "routes: R1\n", "routes: "+list+"\n", 1)
		if _, err := Parse([]byte(forged)); forged == string(text) || !errors.Is(err, ErrMalformed) {
			t.Errorf("%q, read: %v", list, err)
		}
	}
}

// A folder has one form, so that there is one line of approval for it.
func TestFolderOfStatement(t *testing.T) {
	for _, folder := range []string{"./", "a/", "/a", "a//b", "./a", "a/..", "..", "../a", "a/./b"} {
		s := example(SignOff)
		s.Folder = folder
		if _, err := s.Text(); !errors.Is(err, ErrMalformed) {
			t.Errorf("%q: %v", folder, err)
		}
	}
	for _, folder := range []string{".", "a", "a/b", "..a", "a b/c", `a\b`} {
		s := example(SignOff)
		s.Folder = folder
		if _, err := s.Text(); err != nil {
			t.Errorf("%q: %v", folder, err)
		}
	}
}
