package diff_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// moving is the train of ground with 0.5 m/s² of acceleration and braking.
var moving = ground["trains.toml"] + "acceleration_ms2 = 0.5\nbraking_ms2 = 0.5\n"

// Own profile, worked by hand: 104.222 + 60.000 + 131.667 s for a train without
// length, 104.222 + 72.000 + 125.667 s where 60 km/h are held for 200 m. Gained
// and lost on the one stretch around the change.
func TestRunningTimes(t *testing.T) {
	base := texts{"trains.toml": moving, "route.toml": strings.Replace(oneWay, "10", "6", 1), "speed.csv": "from_km,to_km,basic,train_length_delay\n0,2,100,\n2,3,60,no\n3,6,120,\n"}
	// 30 km at 120 km/h with two slow parts of 2 km in its first half.
	thirty := texts{"trains.toml": moving, "route.toml": strings.Replace(oneWay, "10", "30", 1)}
	slow := func(one, two int) string {
		return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,4,120,no\n4,6,%d,no\n6,10,120,no\n10,12,%d,no\n12,30,120,no\n", one, two)
	}
	held := texts{"speed.csv": "from_km,to_km,basic\n0,2,100\n2,3,60\n3,6,120\n"}
	// 10 km at 100 km/h, stop to stop: 360 s and 55.556 s for start and stop.
	even := texts{"trains.toml": moving, "route.toml": oneWay, "speed.csv": "from_km,to_km,basic\n0,10,100\n"}
	runAccounts(t, []accountTest{
		{"posts that come to repeat: 3 km more, and no change of speed", even, texts{"route.toml": oneWay + jump("9", "6")}, []string{"nominal T 4156>5236: "}},
		{"posts that go: 3 km less", even, texts{"route.toml": oneWay + jump("4", "7")}, []string{"nominal T 4156>3076: "}},
		{"the same in the reverse direction", over(even, texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1)}), texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1) + jump("4", "7")}, []string{"reverse T 4156>3076: "}},
		{"track that is added at the end", even, texts{"route.toml": strings.Replace(oneWay, "10", "11", 1), "speed.csv": "from_km,to_km,basic\n0,11,100\n"}, []string{"nominal T 4156>4516: "}},
		{"as much added as removed", even, texts{"route.toml": oneWay + jump("2", "2.5") + jump("7", "6.5")}, nil},
		{"a jump that both have, at another place", over(even, texts{"route.toml": oneWay + jump("4", "7")}), texts{"route.toml": oneWay + jump("4", "6")}, []string{"nominal T 3076>3436: "}},
		{"longer, and no acceleration given", over(even, texts{"trains.toml": ground["trains.toml"]}), texts{"route.toml": oneWay + jump("9", "6")}, nil},
		{"stop to stop", base, held, []string{"nominal T 2959>3019: 0.000-6.000 -60"}},
		{"in the reverse direction", texts{"trains.toml": moving, "route.toml": strings.NewReplacer("10", "6", "nominal", "reverse").Replace(oneWay), "speed.csv": "from_km,to_km,basic,train_length_delay\n0,3,120,\n3,4,60,no\n4,6,100,\n"},
			texts{"speed.csv": "from_km,to_km,basic\n0,3,120\n3,4,60\n4,6,100\n"}, []string{"reverse T 2959>3019: 0.000-6.000 -60"}},
		{"no acceleration given", over(base, texts{"trains.toml": ground["trains.toml"]}), held, nil},
		{"nothing changes for the train", base, texts{"speed.csv": "from_km,to_km,basic,cd300,train_length_delay\n0,2,100,,\n2,3,60,70,no\n3,6,120,,\n"}, nil},
		// Before: 26 km at 120, 4 km at 60, 66.667 s for start and stop and four
		// times 33.333 - 25 s for braking and accelerating: 1120 s. After: at 90,
		// and four times 16.667 - 14.583 s: 1015 s. Cut half way.
		{"two changes that lie apart", texts{"trains.toml": moving, "route.toml": strings.Replace(oneWay, "10", "30", 1), "speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,120,no\n4,6,60,no\n6,24,120,no\n24,26,60,no\n26,30,120,no\n"},
			texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,120,no\n4,6,90,no\n6,24,120,no\n24,26,90,no\n26,30,120,no\n"},
			[]string{"nominal T 11200>10150: 0.000-15.000 525, 15.000-30.000 525"}},
		// Braking from 120 to 90 and to 60 cost 2.083 and 8.333 s each way, and 2 km at
		// 90 in place of 60 gain 40 s: what the one change gains the other loses.
		{"a raise and a reduction that lie apart", over(thirty, texts{"speed.csv": slow(60, 90)}), texts{"speed.csv": slow(90, 60)}, []string{"nominal T 10675>10675: 0.000-8.000 525, 8.000-30.000 -525"}},
		{"against the running distance", over(thirty, texts{"route.toml": strings.Replace(thirty["route.toml"], "nominal", "reverse", 1), "speed.csv": slow(60, 90)}), texts{"speed.csv": slow(90, 60)},
			[]string{"reverse T 10675>10675: 0.000-8.000 525, 8.000-30.000 -525"}},
		{"other tracks have no parts", base, texts{"route.toml": strings.Replace(oneWay, "10", "7", 1), "speed.csv": "from_km,to_km,basic\n0,2,100\n2,3,60\n3,7,120\n"}, []string{"nominal T 2959>3319: "}},
	}, func(a *diff.Account) string {
		var lines []string
		for _, r := range a.Routes {
			for _, x := range r.Figures.Runs {
				var parts []string
				for _, p := range x.Parts {
					parts = append(parts, fmt.Sprintf("%s-%s %d", r.Target.Track.Begins(p.From), r.Target.Track.Ends(p.To), p.Gain))
				}
				lines = append(lines, fmt.Sprintf("%s %s %d>%d: %s", x.Direction, a.Trains[x.Train].ID, x.Before, x.After, strings.Join(parts, ", ")))
			}
		}
		return strings.Join(lines, "\n")
	})
}

// The parts of a running time cover the route and add up to what is gained,
// exactly.
func TestPartsOfRunningTimes(t *testing.T) {
	parts, several, reverse := 0, 0, 0
	check(t, 200, func(t *rapid.T) {
		base, target := drawTexts(t, 400*unit.Metre)
		a, err := diff.Compare(t.Context(), readRapid(t, base), readRapid(t, target), diff.Options{NoFleet: true, Rolling: rapid.Bool().Draw(t, "rolling")})
		if err != nil {
			t.Fatal(err)
		}
		for _, r := range a.Routes {
			for _, x := range r.Figures.Runs {
				if len(x.Parts) == 0 {
					continue
				}
				sum, at := int64(0), unit.Distance(0)
				for _, p := range x.Parts {
					if p.From != at || p.To <= p.From {
						t.Fatalf("parts do not touch: %v\n%s", x, showTexts(base, target))
					}
					sum, at = sum+p.Gain, p.To
				}
				if sum != x.Before-x.After || at != r.Target.Track.Length() {
					t.Fatalf("%v: the parts give %d up to %s m\n%s", x, sum, at.M(), showTexts(base, target))
				}
				parts++
				if len(x.Parts) > 1 {
					several++
				}
				if x.Direction == codes.Reverse {
					reverse++
				}
			}
		}
	})
	if !testing.Short() && (parts < 100 || several < 5 || reverse < 20) {
		t.Errorf("only %d running times with parts, %d with several, %d in reverse", parts, several, reverse)
	}
}

// jump is a place in route.toml at which posts are missing, or repeat.
func jump(arriving, leaving string) string {
	return "[[jump]]\narriving_km = " + arriving + "\nleaving_km = " + leaving + "\n"
}

// 120 km/h over 900 m take 27 s, 140 km/h 23.14 s, whatever the reference
// trains.
func TestCrossings(t *testing.T) {
	const place = "km,to_km,direction,kind,name,strike_in_m,warning_s\n"
	at := func(v int) string { return fmt.Sprintf("from_km,to_km,basic,cd150\n0,10,100,%d\n", v) }
	cross := texts{"trains.toml": trainText("S", 80, "", "C2", 200, 60), "speed.csv": at(120), "places.csv": place + "5,5.01,,crossing,Mill Lane,900,27\n"}
	// The line is slow up to the strike-in of Mill Lane, 900 m by the posts; of an
	// approach without 200 m of posts, 200 m are: 12 s.
	side := func(route, places string, v int) texts {
		return over(cross, texts{"route.toml": route, "places.csv": places, "speed.csv": fmt.Sprintf("from_km,to_km,basic,cd150\n0,4.1,60,\n4.1,10,100,%d\n", v)})
	}
	without := func(route string, v int) texts { return side(route, gone, v) }
	with := func(route string, v int) texts { return side(route, cross["places.csv"], v) }
	back := strings.Replace(oneWay, "nominal", "reverse", 1)
	runAccounts(t, []accountTest{
		{"faster, no reference train", cross, texts{"speed.csv": at(140)}, []string{"nominal Mill Lane 270>231", "reverse Mill Lane 270>231"}},
		{"one direction", over(cross, texts{"places.csv": place + "5,5.01,reverse,crossing,Mill Lane,900,27\n"}), texts{"speed.csv": at(140)}, []string{"reverse Mill Lane 270>231"}},
		{"nothing differs", cross, nil, nil},
		{"faster elsewhere", cross, texts{"speed.csv": "from_km,to_km,basic,cd150\n0,4.1,100,140\n4.1,5.91,100,120\n5.91,10,100,140\n"}, nil},
		{"over two steps: 450 m at 120 and 450 m at 60", over(cross, texts{"route.toml": oneWay}), texts{"speed.csv": "from_km,to_km,basic,cd150\n0,4.55,100,120\n4.55,10,60,\n"}, []string{"nominal Mill Lane 270>405"}},
		{"a temporary restriction hides it", over(cross, texts{"route.toml": oneWay, "temporary.csv": temporary("0,10,60")}), texts{"speed.csv": at(140)}, []string{"nominal Mill Lane 270>231 permanent"}},
		{"and ends", over(cross, texts{"route.toml": oneWay, "temporary.csv": temporary("0,10,60")}), texts{"speed.csv": at(140), "temporary.csv": gone}, []string{"nominal Mill Lane 540>231", "nominal Mill Lane 270>231 permanent"}},
		{"a strike-in that is shortened with it: 500 m at 140", over(cross, texts{"route.toml": oneWay}), texts{"speed.csv": at(140), "places.csv": place + "5,5.01,,crossing,Mill Lane,500,\n"}, []string{"nominal Mill Lane 270>128 27.0 s needed before"}},
		{"the strike-in alone", over(cross, texts{"route.toml": oneWay}), texts{"places.csv": place + "5,5.01,,crossing,Mill Lane,800,27\n"}, []string{"nominal Mill Lane 270>240"}},
		{"the warning time alone", over(cross, texts{"route.toml": oneWay}), texts{"places.csv": place + "5,5.01,,crossing,Mill Lane,900,30\n"}, []string{"nominal Mill Lane 270>270 27.0 s needed before"}},
		{"a new crossing, where the train is faster", over(cross, texts{"route.toml": oneWay, "places.csv": gone}), texts{"speed.csv": at(140), "places.csv": place + "5,5.01,,crossing,Mill Lane,900,27\n"}, []string{"nominal Mill Lane 270>231 new"}},
		{"a strike-in that was not given", over(cross, texts{"route.toml": oneWay, "places.csv": place + "5,5.01,,crossing,Mill Lane,,\n"}), texts{"places.csv": place + "5,5.01,,crossing,Mill Lane,900,27\n"}, []string{"nominal Mill Lane -1>270 0.0 s needed before"}},
		{"its own track before, which differs", over(cross, texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic,cd150\n0,4.6,100,120\n4.6,10,100,60\n"}),
			texts{"route.toml": oneWay + "[[jump]]\narriving_km = 4.5\nleaving_km = 4.7\n", "speed.csv": "from_km,to_km,basic,cd150\n0,10,100,120\n"}, []string{"nominal Mill Lane 324>270"}},
		// Where the base has no crossing, the same stretch of its track counts, and none
		// where that is not in one piece.
		{"a new crossing, posts that go in its approach", without(oneWay, 120), with(oneWay+jump("4.5", "4.7"), 120), []string{"nominal Mill Lane -1>330 new"}},
		{"a new crossing, posts that come in its approach", without(oneWay+jump("4.5", "4.7"), 120), with(oneWay, 120), []string{"nominal Mill Lane -1>270 new"}},
		{"a new crossing, posts that go in front of its approach", without(oneWay, 120), with(oneWay+jump("3.5", "4"), 140), []string{"nominal Mill Lane 270>231 new"}},
		{"a new crossing, posts that go right in front of its approach", without(oneWay, 120), with(oneWay+jump("3.5", "4.1"), 140), []string{"nominal Mill Lane 270>231 new"}},
		{"a new crossing, posts that go right behind its approach", without(back, 120), with(back+jump("5.91", "6.1"), 140), []string{"reverse Mill Lane 270>231 new"}},
		{"a new crossing, posts that go behind it", without(oneWay, 120), with(oneWay+jump("5.01", "5.2"), 140), []string{"nominal Mill Lane 270>231 new"}},
		{"a new crossing, posts that both lack in its approach", without(oneWay+jump("4.5", "4.7"), 120), with(oneWay+jump("4.5", "4.7"), 140), []string{"nominal Mill Lane 330>300 new"}},
		// One row a direction, each with a strike-in of its own.
		{"a row for each direction", over(cross, texts{"places.csv": place + "5,5.01,nominal,crossing,Mill Lane,900,27\n5,5.01,reverse,crossing,Mill Lane,600,18\n"}), texts{"speed.csv": at(140)},
			[]string{"nominal Mill Lane 270>231", "reverse Mill Lane 180>154"}},
		{"a row for each direction, in the other order", over(cross, texts{"places.csv": place + "5,5.01,reverse,crossing,Mill Lane,600,18\n5,5.01,nominal,crossing,Mill Lane,900,27\n"}), texts{"speed.csv": at(140)},
			[]string{"nominal Mill Lane 270>231", "reverse Mill Lane 180>154"}},
		{"a row for each direction, nothing differs", over(cross, texts{"places.csv": place + "5,5.01,nominal,crossing,Mill Lane,900,27\n5,5.01,reverse,crossing,Mill Lane,600,18\n"}),
			texts{"speed.csv": "from_km,to_km,basic,cd150\n0,1,100,140\n1,10,100,120\n"}, nil},
		{"the strike-in before the route", over(cross, texts{"places.csv": place + "0.8,0.81,nominal,crossing,Mill Lane,900,27\n"}), texts{"speed.csv": at(140)}, nil},
	}, func(a *diff.Account) string {
		var lines []string
		for _, r := range a.Routes {
			for _, x := range r.Figures.Crossings {
				text := fmt.Sprintf("%s %s %d>%d", x.Direction, x.Place.Name, x.Before, x.After)
				switch {
				case x.Permanent:
					text += " permanent"
				case x.Old == nil:
					text += " new"
				case x.Old.WarningDS != x.Place.WarningDS:
					text += fmt.Sprintf(" %d.%d s needed before", x.Old.WarningDS/10, x.Old.WarningDS%10)
				}
				lines = append(lines, text)
			}
		}
		return strings.Join(lines, "\n")
	})
}

// Curves are looked at where the highest speed of a train in them, or the curve
// itself, changes; trains of one category and the same speeds together.
func TestCurves(t *testing.T) {
	const head = "from_km,to_km,radius_m,cant_mm\n"
	trains := trainText("T", 150, "", "C2", 200, 200) + trainText("U", 150, "", "C2", 700, 200) + trainText("V", 80, "", "D4", 30, 60)
	base := texts{"route.toml": oneWay, "trains.toml": trains, "speed.csv": "from_km,to_km,basic,cd150,train_length_delay\n0,10,100,120,no\n", "curves.csv": head + "4.2,4.8,1000,100\n7,8,900,50\n"}
	runAccounts(t, []accountTest{
		{"faster through one of them", base, texts{"speed.csv": "from_km,to_km,basic,cd150,train_length_delay\n0,4.7,100,120,no\n4.7,6,100,140,no\n6,10,100,120,no\n"},
			[]string{"4.200 cd150 T U 120>140, lowest 60 V"}},
		{"another cant", base, texts{"curves.csv": head + "4.2,4.8,1000,110\n7,8,900,50\n"}, []string{"4.200 cd150 T U 120>120 cant 100>110, lowest 60 V", "4.200 cd80 V 60>60 cant 100>110, lowest 60 V"}},
		{"another radius", base, texts{"curves.csv": head + "4.2,4.8,900,100\n7,8,900,50\n"}, []string{"4.200 cd150 T U 120>120 radius 1000>900, lowest 60 V", "4.200 cd80 V 60>60 radius 1000>900, lowest 60 V"}},
		// What lies on track of the base in two pieces has neither a curve nor a speed
		// before.
		{"posts that go in a curve", base, texts{"route.toml": oneWay + jump("4.5", "4.7")}, []string{"4.200 cd150 T U 0>120 new, lowest 60 V", "4.200 cd80 V 0>60 new, lowest 60 V"}},
		{"posts that come in a curve", over(base, texts{"route.toml": oneWay + jump("4.5", "4.7")}), texts{"route.toml": oneWay}, []string{"4.200 cd150 T U 0>120 new, lowest 60 V", "4.200 cd80 V 0>60 new, lowest 60 V"}},
		{"posts that go between curves", base, texts{"route.toml": oneWay + jump("5", "6")}, nil},
		{"posts that go right behind a curve and in front of another", base, texts{"route.toml": oneWay + jump("4.8", "7")}, nil},
		{"a new curve", base, texts{"curves.csv": head + "4.2,4.8,1000,100\n7,8,900,50\n9,9.5,800,0\n"}, []string{"9.000 cd150 T U 120>120 new, lowest 60 V", "9.000 cd80 V 60>60 new, lowest 60 V"}},
		{"a curve that goes", base, texts{"curves.csv": head + "7,8,900,50\n"}, nil},
		{"a note", base, texts{"curves.csv": "from_km,to_km,radius_m,cant_mm,note\n4.2,4.8,1000,100,x\n7,8,900,50,\n"}, nil},
	}, func(a *diff.Account) string {
		var lines []string
		for _, r := range a.Routes {
			for _, x := range r.Figures.Curves {
				var names []string
				for _, i := range x.Trains {
					names = append(names, a.Trains[i].ID)
				}
				text := fmt.Sprintf("%s %s %s %d>%d", x.Row.From, x.Category.Column(), strings.Join(names, " "), x.Before, x.After)
				switch {
				case x.Old == nil:
					text += " new"
				case x.Old.RadiusM != x.Row.RadiusM:
					text += fmt.Sprintf(" radius %d>%d", x.Old.RadiusM, x.Row.RadiusM)
				case x.Old.CantMM != x.Row.CantMM:
					text += fmt.Sprintf(" cant %d>%d", x.Old.CantMM, x.Row.CantMM)
				}
				lines = append(lines, fmt.Sprintf("%s, lowest %d %s", text, x.Lowest, a.Trains[x.Slowest].ID))
			}
		}
		return strings.Join(lines, "\n")
	})
}

// A raise that is too short for a train. From 60 to 120 km/h and back with
// 0.5 m/s² take 2 x (33.33² - 16.67²) / (2 x 0.5) = 1666.667 m; in 500 m it
// reaches sqrt(16.67² + 0.5 x 500) = 22.97 m/s = 82 km/h.
func TestShortRaises(t *testing.T) {
	short := func(to string) texts {
		return texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,60,no\n4," + to + ",120,no\n" + to + ",10,60,no\n"}
	}
	base := texts{"trains.toml": moving, "route.toml": oneWay, "speed.csv": "from_km,to_km,basic,train_length_delay\n0,10,60,no\n"}
	runAccounts(t, []accountTest{
		{"too short", base, short("4.5"), []string{"nominal T 4.000-4.500 120, 82 reached, 1666.667 m needed"}},
		{"less than a metre too short", base, short("5.666"), []string{"nominal T 4.000-5.666 120, 119 reached, 1666.667 m needed"}},
		{"just long enough", base, short("5.666667"), nil},
		{"in the reverse direction", over(base, texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1)}), short("4.5"), []string{"reverse T 4.000-4.500 120, 82 reached, 1666.667 m needed"}},
		{"a reduction", over(base, short("4.5")), texts{"speed.csv": base["speed.csv"]}, nil},
		{"a reduction of a piece that was too short before", over(base, short("4.5")), texts{"speed.csv": strings.Replace(short("4.5")["speed.csv"], "120", "110", 1)}, nil},
		{"without acceleration", over(base, texts{"trains.toml": ground["trains.toml"]}), short("4.5"), nil},
	}, func(a *diff.Account) string {
		var lines []string
		for _, r := range a.Routes {
			for _, x := range r.Figures.Short {
				lines = append(lines, fmt.Sprintf("%s %s %s-%s %d, %d reached, %s m needed", x.Direction, a.Trains[x.Train].ID, r.Target.Track.Begins(x.From), r.Target.Track.Ends(x.To), x.Speed, x.Reached, x.Needed.M()))
			}
		}
		slices.Sort(lines)
		return strings.Join(lines, "\n")
	})
}
