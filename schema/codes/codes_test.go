package codes

import (
	"slices"
	"testing"
)

// The value lists are those of SUBSET-026 issue 4.0.0, 7.5.1, by the name of the
// variable.

func TestNC_CDDIFF(t *testing.T) {
	want := []int{80, 100, 130, 150, 165, 180, 210, 225, 245, 275, 300}
	columns := []string{"cd80", "cd100", "cd130", "cd150", "cd165", "cd180", "cd210", "cd225", "cd245", "cd275", "cd300"}
	if len(want) != CantDeficiencies {
		t.Fatalf("%d categories, want %d", CantDeficiencies, len(want))
	}
	for code, mm := range want {
		c := CantDeficiency(code)
		if c.MM() != mm || c.Column() != columns[code] {
			t.Errorf("category %d is %d mm in column %s, want %d and %s", code, c.MM(), c.Column(), mm, columns[code])
		}
	}
	for mm := -1; mm <= 310; mm++ {
		c, ok := CantDeficiencyOf(mm)
		if i := slices.Index(want, mm); ok != (i >= 0) || ok && int(c) != i || !ok && c != 0 {
			t.Errorf("CantDeficiencyOf(%d) = %d, %v", mm, c, ok)
		}
	}
}

func TestNC_DIFF(t *testing.T) {
	want := []string{"freight_p", "freight_g", "passenger"}
	if len(want) != Categories || FreightP != 0 || FreightG != 1 || Passenger != 2 {
		t.Fatalf("%d categories %d, %d, %d", Categories, FreightP, FreightG, Passenger)
	}
	for code, name := range want {
		if c, ok := ParseCategory(name); !ok || int(c) != code || c.String() != name {
			t.Errorf("ParseCategory(%s) = %d (%s), %v, want %d", name, c, c, ok, code)
		}
	}
	for _, name := range []string{"", "freight", "Passenger", "freight_p ", "0"} {
		if c, ok := ParseCategory(name); ok {
			t.Errorf("ParseCategory(%q) = %s", name, c)
		}
	}
}

// 3.11.3.3.2: a train has any number of other categories.
func TestCategorySets(t *testing.T) {
	names := []string{"", "freight_p", "freight_g", "freight_p, freight_g", "passenger", "freight_p, passenger", "freight_g, passenger",
		"freight_p, freight_g, passenger"}
	if len(names) != CategorySets {
		t.Fatalf("%d sets, want %d", CategorySets, len(names))
	}
	for i, name := range names {
		s := CategorySet(i)
		if s.String() != name {
			t.Errorf("set %d is %q, want %q", i, s, name)
		}
		for c := range Category(Categories) {
			if has := i>>c&1 == 1; s.Has(c) != has || !s.With(c).Has(c) || has && s.With(c) != s {
				t.Errorf("set %d: has %s %v, with it %d", i, c, s.Has(c), s.With(c))
			}
			for other := range Category(Categories) {
				if other != c && s.With(c).Has(other) != s.Has(other) {
					t.Errorf("set %d with %s: has %s %v", i, c, other, s.With(c).Has(other))
				}
			}
		}
	}
}

// The letters of the categories are those of EN 15528.
func TestM_AXLELOADCAT(t *testing.T) {
	want := []string{"A", "HS17", "B1", "B2", "C2", "C3", "C4", "D2", "D3", "D4", "D4XL", "E4", "E5"}
	if len(want) != AxleLoads {
		t.Fatalf("%d categories, want %d", AxleLoads, len(want))
	}
	for code, name := range want {
		if a, ok := ParseAxleLoad(name); !ok || int(a) != code || a.String() != name {
			t.Errorf("ParseAxleLoad(%s) = %d (%s), %v, want %d", name, a, a, ok, code)
		}
	}
	for _, name := range []string{"", "a", "D5", "D4xl", "E", "HS", "12"} {
		if a, ok := ParseAxleLoad(name); ok {
			t.Errorf("ParseAxleLoad(%q) = %s", name, a)
		}
	}
}

// Q_DIR has 0 reverse, 1 nominal, 2 both, 3 spare. The sets here are bits, not
// the variable's codes: each of its three values has one set, the spare none.
func TestQ_DIR(t *testing.T) {
	tests := []struct {
		name             string
		set              Directions
		nominal, reverse bool
	}{
		{"reverse", OnlyReverse, false, true},
		{"nominal", OnlyNominal, true, false},
		{"both", Both, true, true},
	}
	for _, c := range tests {
		s, ok := ParseDirections(c.name)
		if !ok || s != c.set || s.String() != c.name || s.Has(Nominal) != c.nominal || s.Has(Reverse) != c.reverse {
			t.Errorf("ParseDirections(%s) = %d (%s), %v", c.name, s, s, ok)
		}
	}
	for _, name := range []string{"", "Both", "up", "spare", "nominal "} {
		if s, ok := ParseDirections(name); ok {
			t.Errorf("ParseDirections(%q) = %s", name, s)
		}
	}
	if got := Directions(0).String(); got != "" {
		t.Errorf("no direction is %q", got)
	}
	if AllDirections != [...]Direction{Nominal, Reverse} || Nominal.String() != "nominal" || Reverse.String() != "reverse" {
		t.Errorf("directions %v", AllDirections)
	}
}
