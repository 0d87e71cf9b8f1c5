package schema

import "testing"

func TestDistance(t *testing.T) {
	for _, test := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"a", "", 1}, {"", "ab", 2}, {"trains", "trains", 0}, {"train", "trains", 1}, {"trians", "trains", 2},
		{"sign-off", "signoff", 1}, {"kitten", "sitting", 3}, {"abc", "xyz", 3},
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
