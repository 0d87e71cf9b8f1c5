package chainage

import (
	"errors"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/schema/unit"
)

func TestParsePoint(t *testing.T) {
	tests := []struct {
		text string
		want Point
		err  error
	}{
		{"12.4", Point{Chainage: 12_400_000}, nil},
		{"-0.350", Point{Chainage: -350_000}, nil},
		{"31.180#1", Point{31_180_000, 1}, nil},
		{"31.180#2", Point{31_180_000, 2}, nil},
		{"-1#99", Point{-1_000_000, 99}, nil},
		{"31.18#100", Point{}, ErrOccurrence},
		{"31.18#0", Point{}, ErrOccurrence},
		{"31.18#-1", Point{}, ErrOccurrence},
		{"31.18#+1", Point{}, ErrOccurrence},
		{"31.18#", Point{}, ErrOccurrence},
		{"31.18# 1", Point{}, ErrOccurrence},
		{"31.18#1#1", Point{}, ErrOccurrence},
		{"31.18#257", Point{}, ErrOccurrence}, // 257 is 1 in eight bits
		{"31.18 #1", Point{}, unit.ErrKM},
		{"#1", Point{}, unit.ErrKM},
		{"x#1", Point{}, unit.ErrKM},
		{"1,5#1", Point{}, unit.ErrKMComma},
		{"1.0000001#1", Point{}, unit.ErrKMDecimals},
		{"", Point{}, unit.ErrKM},
	}
	for _, c := range tests {
		got, err := ParsePoint(c.text)
		if got != c.want || !errors.Is(err, c.err) || (err == nil) != (c.err == nil) {
			t.Errorf("ParsePoint(%q) = %+v, %v, want %+v, %v", c.text, got, err, c.want, c.err)
		}
	}
}

// Law: ParsePoint(p.String()) == p.
func TestPointRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := Point{unit.Distance(rapid.Int64Range(-999_999_999_999, 999_999_999_999).Draw(t, "km")), rapid.IntRange(0, MaxOccurrence).Draw(t, "occurrence")}
		if got, err := ParsePoint(p.String()); got != p || err != nil {
			t.Fatalf("ParsePoint(%q) = %+v, %v, want %+v", p, got, err, p)
		}
	})
}

func FuzzParsePoint(f *testing.F) {
	for _, s := range []string{"12.4", "31.180#2", "-1#99", "1#0", "#", "1#1#1", "1,5#1", "0.0000001#1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		p, err := ParsePoint(s)
		if err != nil {
			if p != (Point{}) {
				t.Fatalf("%+v beside %v", p, err)
			}
			return
		}
		if p.Occurrence < 0 || p.Occurrence > MaxOccurrence {
			t.Fatalf("%q has the occurrence %d", s, p.Occurrence)
		}
		if again, err := ParsePoint(p.String()); again != p || err != nil {
			t.Fatalf("%q reads as %+v, %s as %+v, %v", s, p, p, again, err)
		}
	})
}
