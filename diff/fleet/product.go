package fleet

import (
	"fmt"
	"math/bits"
	"slices"
	"strings"

	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
)

// Product is a set of trains that is a product of three sets: cant deficiency
// categories, sets of other categories, axle load categories.
type Product struct {
	Cant uint16 // bit i: codes.CantDeficiency(i)
	Sets uint8  // bit i: codes.CategorySet(i)
	Axle uint16 // bit i: codes.AxleLoad(i)
}

const (
	anyCant = 1<<codes.CantDeficiencies - 1
	anySets = 1<<codes.CategorySets - 1
	anyAxle = 1<<codes.AxleLoads - 1
)

// Has tells whether a class of trains is in the product.
func (p Product) Has(c profile.Class) bool {
	return p.Cant>>c.Cant&1 == 1 && p.Sets>>c.Categories&1 == 1 && p.Axle>>c.AxleLoad&1 == 1
}

// Size counts the classes in the product.
func (p Product) Size() int {
	return bits.OnesCount16(p.Cant) * bits.OnesCount8(p.Sets) * bits.OnesCount16(p.Axle)
}

// Example gives one class of the product: the one with the lowest numbers.
func (p Product) Example() profile.Class {
	return profile.Class{
		Cant:       codes.CantDeficiency(bits.TrailingZeros16(p.Cant)),
		Categories: codes.CategorySet(bits.TrailingZeros8(p.Sets)),
		AxleLoad:   codes.AxleLoad(bits.TrailingZeros16(p.Axle)),
	}
}

// String words the product for a board, as "cant deficiency 150 mm and above,
// not freight, any axle load".
func (p Product) String() string {
	sets := setWords(p.Sets)
	if strings.Contains(sets, "; ") {
		// Each alternative is of trains of that cant deficiency and axle load.
		sets = "(" + sets + ")"
	}
	return cantWords(p.Cant) + ", " + sets + ", " + axleWords(p.Axle)
}

func cantWords(mask uint16) string {
	if mask == anyCant {
		return "any cant deficiency"
	}
	var runs []string
	for c := 0; c < codes.CantDeficiencies; c++ {
		if mask>>c&1 == 0 {
			continue
		}
		first := c
		for c+1 < codes.CantDeficiencies && mask>>(c+1)&1 == 1 {
			c++
		}
		from, to := codes.CantDeficiency(first).MM(), codes.CantDeficiency(c).MM()
		switch {
		case c == codes.CantDeficiencies-1 && c > first:
			runs = append(runs, fmt.Sprintf("%d mm and above", from))
		case first == 0 && c > first:
			runs = append(runs, fmt.Sprintf("up to %d mm", to))
		case c > first:
			runs = append(runs, fmt.Sprintf("%d to %d mm", from, to))
		default:
			runs = append(runs, fmt.Sprintf("%d mm", from))
		}
	}
	return "cant deficiency " + strings.Join(runs, " or ")
}

func axleWords(mask uint16) string {
	if mask == anyAxle {
		return "any axle load"
	}
	list := func(mask uint16) string {
		var names []string
		for a := range codes.AxleLoad(codes.AxleLoads) {
			if mask>>a&1 == 1 {
				names = append(names, a.String())
			}
		}
		return strings.Join(names, ", ")
	}
	if bits.OnesCount16(mask) > codes.AxleLoads/2 {
		return "any axle load but " + list(anyAxle&^mask)
	}
	return "axle load " + list(mask)
}

// categoryWords says in words that a train has one of the other categories.
var categoryWords = [codes.Categories]string{"freight braked in P", "freight braked in G", "passenger"}

// setWords words a set of category sets as alternatives of conditions.
func setWords(mask uint8) string {
	if mask == anySets {
		return "any category"
	}
	var words []string
	list := conditions(mask)
	// What is asked for comes first: "not freight or passenger" would be read as
	// neither of them.
	slices.SortStableFunc(list, func(a, b condition) int {
		return min(bits.OnesCount8(uint8(b.has)), 1) - min(bits.OnesCount8(uint8(a.has)), 1)
	})
	negative := 0
	for _, c := range list {
		words = append(words, c.String())
		if c.has == 0 {
			negative++
		}
	}
	// A condition of several parts would run into the next one, and a "not" into
	// the one behind it.
	several := func(w string) bool { return strings.Contains(w, ", ") || strings.Contains(w, " and ") }
	if len(words) > 1 && (negative > 1 || slices.ContainsFunc(words, several)) {
		return strings.Join(words, "; or ")
	}
	return strings.Join(words, " or ")
}

// condition asks of a train some categories (has) and that it lacks others.
type condition struct{ has, lacks codes.CategorySet }

// covers lists, as a mask, the category sets that meet the condition.
func (c condition) covers() (mask uint8) {
	for s := range codes.CategorySet(codes.CategorySets) {
		if s&c.has == c.has && s&c.lacks == 0 {
			mask |= 1 << s
		}
	}
	return mask
}

const freight = codes.CategorySet(1<<codes.FreightP | 1<<codes.FreightG)

func (c condition) String() string {
	if c.has == 0 && c.lacks == codes.CategorySets-1 {
		return "no category"
	}
	var words []string
	for k, word := range categoryWords {
		if c.has.Has(codes.Category(k)) {
			words = append(words, word)
		}
	}
	text := strings.Join(words, " and ")
	words = nil
	lacks := c.lacks
	if lacks&freight == freight {
		words = append(words, "not freight")
		lacks &^= freight
	}
	for k, word := range categoryWords {
		if lacks.Has(codes.Category(k)) {
			words = append(words, "not "+word)
		}
	}
	if text != "" && len(words) > 0 {
		text += ", "
	}
	return text + strings.Join(words, ", ")
}

// conditions finds the fewest conditions that together are met by exactly the
// sets of the mask. There are only 27 conditions, so that trying more and more
// of them at once is quick.
func conditions(mask uint8) []condition {
	var fit []condition
	for fixed := range codes.CategorySet(codes.CategorySets) {
		for has := range codes.CategorySet(codes.CategorySets) {
			c := condition{has, fixed &^ has}
			if has&^fixed == 0 && c.covers()&^mask == 0 {
				fit = append(fit, c)
			}
		}
	}
	var search func(left uint8, from, most int) []condition
	search = func(left uint8, from, most int) []condition {
		if left == 0 {
			return []condition{}
		}
		if most == 0 {
			return nil
		}
		for i := from; i < len(fit); i++ {
			if fit[i].covers()&left == 0 {
				continue
			}
			if rest := search(left&^fit[i].covers(), i+1, most-1); rest != nil {
				return append([]condition{fit[i]}, rest...)
			}
		}
		return nil
	}
	for most := 1; ; most++ {
		if found := search(mask, 0, most); found != nil {
			return found
		}
	}
}
