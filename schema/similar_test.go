package schema

import (
	"slices"
	"strings"
	"testing"
)

func TestDistance(t *testing.T) {
	for _, test := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"a", "", 1}, {"", "ab", 2}, {"trains", "trains", 0}, {"train", "trains", 1}, {"trians", "trains", 2},
		{"sign-off", "signoff", 1}, {"kitten", "sitting", 3}, {"abc", "xyz", 3}, {"\u5317\u7ebf", "\u5357\u7ebf", 1},
	} {
		if got := distance(test.a, test.b); got != test.want {
			t.Errorf("%q %q: %d, want %d", test.a, test.b, got, test.want)
		}
		if distance(test.a, test.b) != distance(test.b, test.a) {
			t.Errorf("%q %q: not the same both ways", test.a, test.b)
		}
	}
}

func TestNear(t *testing.T) {
	for _, test := range []struct {
		a, b string
		want bool
	}{
		{"train.toml", "trains.toml", true}, {"accepted.tml", "accepted.toml", true}, {"sign-off.toml", "signoff.toml", true},
		{"request", "requests", true}, {"route", "routes", true}, {"speed.cvs", "speed.csv", true}, {"speed.md", "speed.csv", false},
		{"notes.toml", "trains.toml", false}, {"pyproject.toml", "dataset.toml", false}, {"readme.md", "routes", false}, {"tools", "routes", false},
	} {
		if got := near(test.a, test.b); got != test.want {
			t.Errorf("%q %q: %t", test.a, test.b, got)
		}
	}
}

func TestNearest(t *testing.T) {
	for _, test := range []struct {
		name  string
		known []string
		want  []string
	}{
		{"bw1", []string{"BW2", "BW1", "HL1"}, []string{"BW1"}},
		{"WB1", []string{"BW1", "HL1"}, []string{"BW1"}},
		{"relase-2026.1", []string{"main", "release-2025.1", "release-2026.1"}, []string{"release-2026.1"}},
		{"release", []string{"main", "release-2026.1"}, []string{"release-2026.1"}},
		{"norminal", []string{"nominal", "reverse", "both"}, []string{"nominal"}},
		{"\u5317\u7ebf", []string{"\u5357\u7ebf", "BW1"}, []string{"\u5357\u7ebf"}},
		{"A9", []string{"A1", "A2", "A3", "A4", "A5"}, []string{"A1", "A2", "A3"}},
		{"IC", []string{"IC-2", "TILT", "EXP"}, []string{"IC-2"}},
		{"BW1-up", []string{"BW1", "HL1"}, []string{"BW1"}},
		{"TRAM", []string{"IC-2", "TILT", "EXP"}, nil},
		{"7", []string{"4", "5"}, nil},
		{"", []string{"A"}, nil},
		{"A", nil, nil},
		{"BW1", []string{"", "BW2", "BW2"}, []string{"BW2"}},
		{strings.Repeat("x", 1<<20), []string{strings.Repeat("x", 1<<20-1)}, nil},
	} {
		if got := Nearest(test.name, test.known); !slices.Equal(got, test.want) {
			t.Errorf("%.20q: %q, want %q", test.name, got, test.want)
		}
	}
}
