package fleet

import (
	"math/bits"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
)

// The words of categories, by the numbers of SUBSET-026 7.5.1 (NC_CDTRAIN,
// NC_DIFF, M_AXLELOADCAT).
var (
	cantMM    = []string{"80", "100", "130", "150", "165", "180", "210", "225", "245", "275", "300"}
	others    = []string{"freight braked in P", "freight braked in G", "passenger"}
	axleLoads = []string{"A", "HS17", "B1", "B2", "C2", "C3", "C4", "D2", "D3", "D4", "D4XL", "E4", "E5"}
)

func TestProductString(t *testing.T) {
	// Sets of other categories are numbered by their bits: P 1, G 2, passenger 4.
	sets := func(list ...int) (mask uint8) {
		for _, s := range list {
			mask |= 1 << s
		}
		return mask
	}
	const all = "any axle load"
	tests := []struct {
		name string
		p    Product
		want string
	}{
		{"everything", Product{anyCant, anySets, anyAxle}, "any cant deficiency, any category, " + all},
		{"the example of the rules", Product{anyCant &^ 7, sets(0, 4), anyAxle}, "cant deficiency 150 mm and above, not freight, " + all},
		{"lowest cant deficiency only", Product{1, anySets, anyAxle}, "cant deficiency 80 mm, any category, " + all},
		{"highest cant deficiency only", Product{1 << 10, anySets, anyAxle}, "cant deficiency 300 mm, any category, " + all},
		{"up to", Product{3, anySets, anyAxle}, "cant deficiency up to 100 mm, any category, " + all},
		{"all but the highest", Product{anyCant >> 1, anySets, anyAxle}, "cant deficiency up to 275 mm, any category, " + all},
		{"all but the lowest", Product{anyCant &^ 1, anySets, anyAxle}, "cant deficiency 100 mm and above, any category, " + all},
		{"a range", Product{7 << 2, anySets, anyAxle}, "cant deficiency 130 to 165 mm, any category, " + all},
		{"two apart", Product{1<<2 | 1<<4, anySets, anyAxle}, "cant deficiency 130 mm or 165 mm, any category, " + all},
		{"ranges apart", Product{3 | 1<<4 | 3<<9, anySets, anyAxle}, "cant deficiency up to 100 mm or 165 mm or 275 mm and above, any category, " + all},
		{"all but one in the middle", Product{anyCant &^ 8, anySets, anyAxle}, "cant deficiency up to 130 mm or 165 mm and above, any category, " + all},
		{"no category", Product{anyCant, sets(0), anyAxle}, "any cant deficiency, no category, " + all},
		{"braked in P", Product{anyCant, sets(1, 3, 5, 7), anyAxle}, "any cant deficiency, freight braked in P, " + all},
		{"braked in G", Product{anyCant, sets(2, 3, 6, 7), anyAxle}, "any cant deficiency, freight braked in G, " + all},
		{"passenger", Product{anyCant, sets(4, 5, 6, 7), anyAxle}, "any cant deficiency, passenger, " + all},
		{"not passenger", Product{anyCant, sets(0, 1, 2, 3), anyAxle}, "any cant deficiency, not passenger, " + all},
		{"not braked in P", Product{anyCant, sets(0, 2, 4, 6), anyAxle}, "any cant deficiency, not freight braked in P, " + all},
		{"freight", Product{anyCant, sets(1, 2, 3, 5, 6, 7), anyAxle}, "any cant deficiency, freight braked in P or freight braked in G, " + all},
		{"at least one", Product{anyCant, anySets &^ 1, anyAxle}, "any cant deficiency, freight braked in P or freight braked in G or passenger, " + all},
		{"passenger, and what is no freight", Product{anyCant, sets(0, 4, 5, 6, 7), anyAxle}, "any cant deficiency, passenger or not freight, " + all},
		{"not both", Product{anyCant, sets(0, 1, 2, 4, 5, 6), anyAxle}, "any cant deficiency, (not freight braked in P; or not freight braked in G), " + all},
		{"several parts", Product{anyCant, sets(3, 4, 5, 6, 7), anyAxle}, "any cant deficiency, (freight braked in P and freight braked in G; or passenger), " + all},
		{"passenger and nothing else", Product{anyCant, sets(4), anyAxle}, "any cant deficiency, passenger, not freight, " + all},
		{"both and nothing else", Product{anyCant, sets(3), anyAxle}, "any cant deficiency, freight braked in P and freight braked in G, not passenger, " + all},
		{"all three", Product{anyCant, sets(7), anyAxle}, "any cant deficiency, freight braked in P and freight braked in G and passenger, " + all},
		{"one axle load", Product{anyCant, anySets, 1 << 9}, "any cant deficiency, any category, axle load D4"},
		{"all but one axle load", Product{anyCant, anySets, anyAxle &^ (1 << 9)}, "any cant deficiency, any category, any axle load but D4"},
		{"six axle loads", Product{anyCant, anySets, 63}, "any cant deficiency, any category, axle load A, HS17, B1, B2, C2, C3"},
		{"seven axle loads", Product{anyCant, anySets, 127}, "any cant deficiency, any category, any axle load but D2, D3, D4, D4XL, E4, E5"},
		{"one class", Product{1 << 3, sets(2), 1 << 12}, "cant deficiency 150 mm, freight braked in G, not freight braked in P, not passenger, axle load E5"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := test.p.String(); got != test.want {
				t.Errorf("%q, want %q", got, test.want)
			}
		})
	}
}

// A text says one thing only: a reader of its grammar finds the very set, so
// that no two sets have the same text.
func TestWordsAreReadBack(t *testing.T) {
	t.Run("cant deficiency", func(t *testing.T) {
		for mask := 1; mask <= anyCant; mask++ {
			if got := readCant(cantWords(uint16(mask))); int(got) != mask {
				t.Errorf("%011b: %q reads as %011b", mask, cantWords(uint16(mask)), got)
			}
		}
	})
	t.Run("other categories", func(t *testing.T) {
		for mask := 1; mask <= anySets; mask++ {
			if got := readSets(setWords(uint8(mask))); int(got) != mask {
				t.Errorf("%08b: %q reads as %08b", mask, setWords(uint8(mask)), got)
			}
		}
	})
	t.Run("axle load", func(t *testing.T) {
		for mask := 1; mask <= anyAxle; mask++ {
			if got := readAxle(axleWords(uint16(mask))); int(got) != mask {
				t.Errorf("%013b: %q reads as %013b", mask, axleWords(uint16(mask)), got)
			}
		}
	})
	t.Run("products", func(t *testing.T) {
		check(t, 2000, func(t *rapid.T) {
			d := diceOf(t)
			p := Product{uint16(d(1, anyCant)), uint8(d(1, anySets)), uint16(d(1, anyAxle))}
			text := p.String()
			cant, rest, _ := strings.Cut(text, ", ")
			at := max(strings.LastIndex(rest, ", axle load "), strings.LastIndex(rest, ", any axle load"))
			if at < 0 {
				t.Fatalf("%q ends without axle loads", text)
			}
			if got := (Product{readCant(cant), readSets(strings.Trim(rest[:at], "()")), readAxle(rest[at+2:])}); got != p {
				t.Fatalf("%+v: %q reads as %+v", p, text, got)
			}
		})
	})
}

func readCant(text string) (mask uint16) {
	if text == "any cant deficiency" {
		return 1<<len(cantMM) - 1
	}
	for _, part := range strings.Split(strings.TrimPrefix(text, "cant deficiency "), " or ") {
		from, to := 0, len(cantMM)-1
		number := func(s string) int { return slices.Index(cantMM, s) }
		if s, ok := strings.CutSuffix(part, " mm and above"); ok {
			from = number(s)
		} else if s, ok := strings.CutPrefix(part, "up to "); ok {
			to = number(strings.TrimSuffix(s, " mm"))
		} else if a, b, ok := strings.Cut(strings.TrimSuffix(part, " mm"), " to "); ok {
			from, to = number(a), number(b)
		} else {
			from = number(a)
			to = from
		}
		for c := from; c >= 0 && c <= to; c++ {
			mask |= 1 << c
		}
	}
	return mask
}

func readSets(text string) (mask uint8) {
	if text == "any category" {
		return 255
	}
	between := " or "
	if strings.Contains(text, "; or ") {
		between = "; or "
	}
	alternatives := strings.Split(text, between)
	if between == " or " {
		// A hasty reader takes a "not" for one of all that follows, and does not
		// know whether "and" or "or" joins more closely.
		at := slices.IndexFunc(alternatives, func(s string) bool { return strings.HasPrefix(s, "not ") })
		if at >= 0 && at < len(alternatives)-1 || len(alternatives) > 1 && strings.Contains(text, " and ") {
			return 0
		}
	}
	for _, alternative := range alternatives {
		for set := range 8 {
			if meets(set, alternative) {
				mask |= 1 << set
			}
		}
	}
	return mask
}

// meets tells whether trains of a set of categories meet each of the
// conditions of an alternative.
func meets(set int, alternative string) bool {
	if alternative == "no category" {
		return set == 0
	}
	has := func(word string) bool { return set>>slices.Index(others, word)&1 == 1 }
	for _, condition := range strings.Split(alternative, ", ") {
		lacked, not := strings.CutPrefix(condition, "not ")
		switch {
		case lacked == "freight" && not:
			if set&3 != 0 {
				return false
			}
		case not:
			if has(lacked) {
				return false
			}
		default:
			for _, word := range strings.Split(condition, " and ") {
				if !has(word) {
					return false
				}
			}
		}
	}
	return true
}

func readAxle(text string) (mask uint16) {
	const all = 1<<13 - 1
	if text == "any axle load" {
		return all
	}
	but, without := strings.CutPrefix(text, "any axle load but ")
	for _, name := range strings.Split(strings.TrimPrefix(but, "axle load "), ", ") {
		mask |= 1 << slices.Index(axleLoads, name)
	}
	if without {
		return all &^ mask
	}
	return mask
}

// The words of other categories are as few alternatives as there can be: as
// many as the least number of subcubes whose union is the set.
func TestFewestConditions(t *testing.T) {
	// The 27 conditions, each as the sets that meet it: of every category it is
	// asked for, lacked or left open.
	var cubes []uint8
	for n := range 27 {
		var mask uint8
		for set := range 8 {
			ok, rest := true, n
			for k := range 3 {
				ok = ok && (rest%3 == 2 || rest%3 == set>>k&1)
				rest /= 3
			}
			if ok {
				mask |= 1 << set
			}
		}
		cubes = append(cubes, mask)
	}
	least := [256]int{}
	for mask := 1; mask < 256; mask++ {
		least[mask] = 9
	}
	for changed := true; changed; {
		changed = false
		for mask := range 256 {
			for _, cube := range cubes {
				if m := mask | int(cube); least[mask]+1 < least[m] {
					least[m], changed = least[mask]+1, true
				}
			}
		}
	}
	for mask := 1; mask < 256; mask++ {
		if got := len(conditions(uint8(mask))); got != least[mask] {
			t.Errorf("%08b: %d conditions, %d suffice: %s", mask, got, least[mask], setWords(uint8(mask)))
		}
	}
}

// An example is a class of the product; its size is the number of classes in
// it.
func TestProductClasses(t *testing.T) {
	check(t, 300, func(t *rapid.T) {
		d := diceOf(t)
		p := Product{uint16(d(1, anyCant)), uint8(d(1, anySets)), uint16(d(1, anyAxle))}
		n := 0
		for _, c := range everyClass() {
			if p.Has(c) {
				n++
			}
		}
		if p.Size() != n || !p.Has(p.Example()) {
			t.Fatalf("%+v: size %d, want %d; example %+v", p, p.Size(), n, p.Example())
		}
		want := profile.Class{Cant: codes.CantDeficiency(lowest(p.Cant)), Categories: codes.CategorySet(lowest(uint16(p.Sets))), AxleLoad: codes.AxleLoad(lowest(p.Axle))}
		if p.Example() != want {
			t.Fatalf("%+v: example %+v, want %+v", p, p.Example(), want)
		}
	})
}

func lowest(mask uint16) int { return bits.Len16(mask&-mask) - 1 }
