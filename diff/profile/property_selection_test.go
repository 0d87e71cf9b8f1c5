package profile_test

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Category numbers by cant deficiency in mm (SUBSET-026 7.5.1, NC_CDDIFF).
const (
	cd80, cd100, cd130, cd165, cd180, cd225, cd300 = 0, 1, 2, 4, 5, 7, 10
)

// SUBSET-026 3.11.3.2.3, .5, .6 on a row that has everything; the figures are
// our own.
func TestSelection(t *testing.T) {
	row := schema.SpeedRow{Basic: 140}
	row.Cant[cd130], row.Cant[cd225] = 150, 170
	row.Other[codes.FreightP], row.Replaces[codes.FreightP] = 100, true
	row.Other[codes.Passenger] = 160
	// The highest category below counts, even if a lower one is faster.
	falling := schema.SpeedRow{Basic: 140}
	falling.Cant[cd130], falling.Cant[cd165] = 120, 110
	// What replaces may raise, what limits may not.
	raising := schema.SpeedRow{Basic: 60}
	raising.Other[codes.Passenger], raising.Replaces[codes.Passenger] = 90, true
	raising.Other[codes.FreightG] = 90
	p, g, pass := codes.CategorySet(0).With(codes.FreightP), codes.CategorySet(0).With(codes.FreightG), codes.CategorySet(0).With(codes.Passenger)
	tests := []struct {
		name   string
		row    *schema.SpeedRow
		cant   codes.CantDeficiency
		others codes.CategorySet
		want   unit.Speed
	}{
		{"3.11.3.2.3 nothing at or below: basic", &row, cd80, 0, 140},
		{"3.11.3.2.3 below the lowest given", &row, cd100, 0, 140},
		{"3.11.3.2.3 exact", &row, cd130, 0, 150},
		{"3.11.3.2.3 next lower", &row, cd165, 0, 150},
		{"3.11.3.2.3 exact, the second", &row, cd225, 0, 170},
		{"3.11.3.2.3 next lower, the second", &row, cd300, 0, 170},
		{"3.11.3.2.3 the nearest lower, not the fastest", &falling, cd180, 0, 110},
		{"3.11.3.2.6 the other is the lowest", &row, cd225, pass, 160},
		{"3.11.3.2.6 cant deficiency is the lowest", &row, cd130, pass, 150},
		{"3.11.3.2.6 replaces", &row, cd100, p, 100},
		{"3.11.3.2.6 replaces, the lowest of the others", &row, cd225, p | pass, 100},
		{"3.11.3.2.6 replacing raises", &raising, cd80, pass, 90},
		{"3.11.3.2.6 limiting does not raise", &raising, cd80, g, 60},
		{"3.11.3.2.6 one that replaces suffices", &raising, cd80, g | pass, 90},
		{"3.11.3.2.5 not given", &row, cd225, g, 170},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			class := profile.Class{Cant: test.cant, Categories: test.others}
			if got := profile.StaticSpeedOf(test.row, class); got != test.want {
				t.Errorf("%d, want %d", got, test.want)
			}
		})
	}
}

// The laws of the selection, for any row and class.
func TestSelectionLaws(t *testing.T) {
	check(t, 1000, func(t *rapid.T) {
		n := func(low, high int) int { return rapid.IntRange(low, high).Draw(t, "") }
		speed := func() unit.Speed { return 5 * unit.Speed(n(1, 120)) }
		row := schema.SpeedRow{Basic: speed()}
		for c := range row.Cant {
			row.Cant[c] = speed() * unit.Speed(n(0, 1))
		}
		replaced, own := false, []unit.Speed{}
		class := profile.Class{Cant: codes.CantDeficiency(n(0, codes.CantDeficiencies-1)), Categories: codes.CategorySet(n(0, codes.CategorySets-1))}
		for c := range row.Other {
			row.Other[c], row.Replaces[c] = speed()*unit.Speed(n(0, 1)), n(0, 1) == 1
			if row.Other[c] != 0 && class.Categories.Has(codes.Category(c)) {
				own = append(own, row.Other[c])
				replaced = replaced || row.Replaces[c]
			}
		}
		v := profile.StaticSpeedOf(&row, class)
		cant := profile.StaticSpeedOf(&row, profile.Class{Cant: class.Cant})
		if len(own) > 0 && v > slices.Min(own) {
			t.Fatalf("%d is above %v of %+v", v, own, row)
		}
		if !replaced && v > cant {
			t.Fatalf("limits only, but %d is above the cant deficiency speed %d of %+v", v, cant, row)
		}
		if !slices.Contains(own, v) && (replaced || v != cant) {
			t.Fatalf("%d is none of %v, %d of %+v", v, own, cant, row)
		}
		// 3.11.3.2.3: a cant deficiency above the train's own is never used;
		// 3.11.3.2.5: nor is a category that the train does not have.
		other := row
		for c := int(class.Cant) + 1; c < len(other.Cant); c++ {
			other.Cant[c] = speed()
		}
		for c := range other.Other {
			if !class.Categories.Has(codes.Category(c)) {
				other.Other[c], other.Replaces[c] = speed(), true
			}
		}
		if got := profile.StaticSpeedOf(&other, class); got != v {
			t.Fatalf("%+v changes %d to %d", other, v, got)
		}
	})
}

// SUBSET-026 3.11.4.3, .5: an axle load entry for another category, higher or
// lower, does not bind; without an entry there is no restriction.
func TestOnlyTheOwnAxleLoadBinds(t *testing.T) {
	check(t, 300, func(t *rapid.T) {
		w := draw(t)
		old := w.compile()
		route := *w.route
		route.AxleLoad = slices.Clone(route.AxleLoad)
		for i := range route.AxleLoad {
			for a := range route.AxleLoad[i].Limit {
				if codes.AxleLoad(a) != w.train.AxleLoad {
					route.AxleLoad[i].Limit[a] = 5 * unit.Speed(w.dice(0, 20))
				}
			}
		}
		w.route = &route
		if now := w.compile(); !slices.Equal(now, old) {
			t.Fatalf("%v%v, without other categories %v", w, now, old)
		}
	})
}
