package lines

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestHunks(t *testing.T) {
	show := func(hunks []Hunk) string {
		var b strings.Builder
		for _, h := range hunks {
			fmt.Fprintf(&b, "@%d,%d", h.OldLine, h.NewLine)
			for _, l := range h.Lines {
				fmt.Fprintf(&b, " %c%s", l.Op, l.Text)
			}
			b.WriteByte('\n')
		}
		return b.String()
	}
	tests := []struct{ name, old, now, want string }{
		{"equal", "a\nb\n", "a\nb\n", ""},
		{"empty", "", "", ""},
		{"new file", "", "a\n", "@1,1 +a\n"},
		{"removed file", "a\nb\n", "", "@1,1 -a -b\n"},
		{"altered", "a\nb\nc\n", "a\nx\nc\n", "@1,1 =a -b +x =c\n"},
		{"two places", "a\nb\nc\nd\ne\nf\n", "A\nb\nc\nd\ne\nF\n", "@1,1 -a +A =b\n@5,5 =e -f +F\n"},
		{"line ends and byte order mark", "a\nb\n", "\uFEFFa\r\nb", ""},
		{"blank lines count", "a\n\nb\n", "a\nb\n", "@1,1 =a - =b\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := show(Hunks(test.old, test.now, 1)); got != test.want {
				t.Errorf("got %q, want %q", got, test.want)
			}
		})
	}
}

// Law: the kept and removed lines are the old text, the kept and added ones the
// new text.
func TestCompareGivesBothTextsBack(t *testing.T) {
	text := rapid.Custom(func(t *rapid.T) string {
		return strings.Join(rapid.SliceOfN(rapid.SampledFrom([]string{"a", "b", "c", "", "40,50,90"}), 1, 30).Draw(t, "lines"), "\n") + "\n"
	})
	rapid.Check(t, func(t *rapid.T) {
		old, now := text.Draw(t, "old"), text.Draw(t, "new")
		var a, b []string
		for _, l := range Compare(old, now) {
			if l.Op != Added {
				a = append(a, l.Text)
			}
			if l.Op != Removed {
				b = append(b, l.Text)
			}
		}
		if !slices.Equal(a, split(old)) || !slices.Equal(b, split(now)) {
			t.Fatalf("got %q and %q", a, b)
		}
	})
}

func TestCompareLargeTexts(t *testing.T) {
	// More distinct lines than there are code points below the surrogates, and
	// two texts too different to compare finely.
	var a, b strings.Builder
	for i := range 70_000 {
		fmt.Fprintf(&a, "old %d\n", i)
		fmt.Fprintf(&b, "new %d\n", i)
	}
	for name, pair := range map[string][2]string{
		"one line":  {a.String(), "first\n" + a.String()},
		"all lines": {a.String(), b.String()},
	} {
		added, removed := 0, 0
		for _, l := range Compare(pair[0], pair[1]) {
			switch l.Op {
			case Added:
				added++
			case Removed:
				removed++
			}
		}
		want := [2]int{1, 0}
		if name == "all lines" {
			want = [2]int{70_000, 70_000}
		}
		if got := [2]int{added, removed}; got != want {
			t.Errorf("%s: %d added, %d removed, want %v", name, added, removed, want)
		}
	}
}

// The git program finds the same number of added and removed lines in a file of
// rows (git-diff(1), --numstat, minimal).
func TestAgainstGit(t *testing.T) {
	git, err := exec.LookPath("git")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the git program is not installed")
	}
	var rows []string
	for i := range 60 {
		rows = append(rows, fmt.Sprintf("%d.000,%d.000,%d", i, i+1, 40+5*(i%20)))
	}
	now := slices.Clone(rows)
	now[7] = "7.000,8.000,160"
	now = slices.Delete(now, 20, 22)
	now = slices.Insert(now, 40, "40.500,40.700,50")
	dir := t.TempDir()
	oldText, newText := strings.Join(rows, "\n")+"\n", strings.Join(now, "\n")+"\n"
	for name, text := range map[string]string{"old": oldText, "new": newText} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	cmd := exec.Command(git, "diff", "--no-index", "--minimal", "--numstat", "old", "new")
	cmd.Dir = dir
	out, _ := cmd.Output() // status 1: they differ
	added, removed := 0, 0
	for _, h := range Hunks(oldText, newText, 3) {
		for _, l := range h.Lines {
			switch l.Op {
			case Added:
				added++
			case Removed:
				removed++
			}
		}
	}
	if want := fmt.Sprintf("%d\t%d\t", added, removed); !strings.HasPrefix(string(out), want) {
		t.Errorf("git says %q, got %q", out, want)
	}
}
