package diff_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/diff"
)

// effects writes what came of each difference: the file and lines, then
// "changes", "track", "hidden" or the reason why nothing did.
func effects(a *diff.Account) string {
	reasons := map[diff.Reason]string{
		diff.SameValue: "same value", diff.OnlyText: "only text", diff.OnlyValidity: "only validity", diff.SameForAll: "same for all", diff.NoSuchTrain: "no such train",
		diff.LowerElsewhere: "lower elsewhere", diff.HiddenToday: "hidden today", diff.NoSpeed: "no speed", diff.NotTheTrack: "not the track", diff.TrackUnaffected: "track unaffected", diff.OtherZone: "other zone",
	}
	var lines []string
	add := func(f *diff.File, d *diff.RowDifference, where string) {
		var came []string
		for _, x := range []struct {
			is   bool
			text string
		}{{d.Causes, "changes"}, {d.Track, "track"}, {d.Masks, "masked"}, {d.Reason != diff.NoReason, reasons[d.Reason]}} {
			if x.is {
				came = append(came, x.text)
			}
		}
		lines = append(lines, fmt.Sprintf("%s: %s", where, strings.Join(came, ", ")))
		if d.Reason != diff.NoReason && d.Reason.String() == "" {
			lines = append(lines, "a reason without words")
		}
	}
	for i := range a.Frame {
		f := &a.Frame[i]
		for k := range f.Rows {
			d := &f.Rows[k]
			add(f, d, fmt.Sprintf("%s %s %s", f.Path(), f.Tables[d.Table].Name, d.Kind))
		}
	}
	for i := range a.Routes {
		r := &a.Routes[i]
		for k := range r.Files {
			for n := range r.Files[k].Rows {
				add(&r.Files[k], &r.Files[k].Rows[n], causeText(r, diff.Cause{File: k, Row: n}))
			}
		}
	}
	return strings.Join(lines, "\n")
}

const tsr = "id,from_km,to_km,direction,speed,valid_from,valid_to,reason,train_length_delay,note\n"

// A difference of which no change comes has its reason; every reason is here.
func TestReasons(t *testing.T) {
	free := strings.ReplaceAll(ground["speed.csv"], "basic", "basic,passenger,passenger_rule,cd300,note")
	cells := func(text string) texts {
		return texts{"speed.csv": strings.Replace(free, "4,6,80", "4,6,80,"+text, 1)}
	}
	runAccounts(t, []accountTest{
		{"same value", nil, texts{"speed.csv": strings.Replace(ground["speed.csv"], "4,6,", "4.000,6.0,", 1)}, []string{"speed.csv -3 +3: same value"}},
		{"same value in route.toml", nil, texts{"route.toml": strings.Replace(ground["route.toml"], "= 0", "= 0.0", 1)}, []string{"route.toml -1 +1: same value"}},
		{"another text that looks like the same number", over(ground, texts{"route.toml": strings.Replace(ground["route.toml"], "One", "7", 1)}), texts{"route.toml": strings.Replace(ground["route.toml"], "One", "7.0", 1)}, []string{"route.toml -1 +1: only text"}},
		{"same value in the frame", texts{"requests/a.toml": requestText("CR-1", "R1", 1, 2, "any", "")}, texts{"requests/a.toml": strings.Replace(requestText("CR-1", "R1", 1, 2, "any", ""), "= 2", "= 2.00", 1)},
			[]string{"requests/a.toml declares altered: same value"}},
		{"a note", cells(",,,"), cells(",,,checked"), []string{"speed.csv -3 +3: only text"}},
		{"the reason and the id of a temporary restriction", texts{"temporary.csv": tsr + "A,4,6,,60,,,,,\n"}, texts{"temporary.csv": tsr + "B,4,6,,60,,,works,,x\n"}, []string{"temporary.csv -2 +2: only text"}},
		{"the name of the route", nil, texts{"route.toml": strings.Replace(ground["route.toml"], "One", "First", 1)}, []string{"route.toml -1 +1: only text"}},
		{"validity", texts{"temporary.csv": tsr + "A,4,6,,60,,2026-01-01,,,\n"}, texts{"temporary.csv": tsr + "A,4,6,,60,2025-01-01,2026-02-01,,,later\n"}, []string{"temporary.csv -2 +2: only validity"}},
		{"the rule of a category, written out", cells("70,,"), cells("70,limits,"), []string{"speed.csv -3 +3: same for all"}},
		{"the direction and the delay, written out", texts{"temporary.csv": tsr + "A,4,6,,60,,,,,\n"}, texts{"temporary.csv": tsr + "A,4,6,both,60,,,,yes,\n"}, []string{"temporary.csv -2 +2: same for all"}},
		{"a category with the speed of the one below", cells(",,,"), cells(",,80,"), []string{"speed.csv -3 +3: same for all"}},
		{"a row cut in two", nil, texts{"speed.csv": strings.Replace(ground["speed.csv"], "4,6,80", "4,5,80\n5,6,80", 1)}, []string{"speed.csv -3 +3 +4: same for all"}},
		{"a row that only another axle load category sees", texts{"axle-load.csv": "from_km,to_km,C2,E5\n1,2,60,70\n"}, texts{"axle-load.csv": "from_km,to_km,C2,E5\n1,2,60,50\n3,4,,20\n"},
			[]string{"axle-load.csv -2 +2: no such train", "axle-load.csv +3: no such train"}},
		{"a category that no train has", cells("70,,"), cells("60,,"), []string{"speed.csv -3 +3: no such train"}},
		{"a lower restriction", texts{"axle-load.csv": "from_km,to_km,C2\n3,7,60\n"}, texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}, []string{"speed.csv -3 +3: lower elsewhere"}},
		{"the maximum speed of the train", texts{"trains.toml": trainText("T", 150, "", "C2", 200, 60)}, texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}, []string{"speed.csv -3 +3: lower elsewhere"}},
		{"hidden today", texts{"temporary.csv": tsr + "A,3,7,,60,,,,,\n"}, texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}, []string{"speed.csv -3 +3: masked, hidden today"}},
		{"hidden on a part", texts{"temporary.csv": tsr + "A,5,7,,60,,,,,\n"}, texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}, []string{"speed.csv -3 +3: changes, masked"}},
		{"curves, gradients and places", nil, texts{"curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,900,10\n", "gradients.csv": "from_km,to_km,permille\n1,2,10\n", "places.csv": "km,kind,name\n1,station,Ash\n"},
			[]string{"curves.csv +2: no speed", "gradients.csv +2: no speed", "places.csv +2: no speed"}},
		{"the note of a curve", texts{"curves.csv": "from_km,to_km,radius_m,cant_mm,note\n1,2,900,10,\n"}, texts{"curves.csv": "from_km,to_km,radius_m,cant_mm,note\n1,2,900,10,x\n"}, []string{"curves.csv -2 +2: only text"}},
		{"both directions, written out", nil, texts{"route.toml": ground["route.toml"] + "directions = [\"nominal\", \"reverse\"]\n"}, []string{"route.toml -1 +1: track unaffected"}},
		{"the frame", nil, texts{"dataset.toml": ground["dataset.toml"] + "[limits]\nlargest_step_kmh = 60\n", "trains.toml": trainText("T", 150, "", "C2", 201, 200),
			"requests/a.toml": requestText("CR-1", "R1", 1, 2, "any", "")},
			[]string{"dataset.toml  altered: not the track", "requests/a.toml  added: not the track", "requests/a.toml declares added: not the track", "trains.toml train altered: not the track"}},
		{"the time zone of dates", nil, texts{"dataset.toml": ground["dataset.toml"] + "time_zone = \"Asia/Tokyo\"\n"}, []string{"dataset.toml  altered: other zone"}},
		{"a jump", nil, texts{"route.toml": ground["route.toml"] + "[[jump]]\narriving_km = 8\nleaving_km = 8.1\n"}, []string{"route.toml +6: track"}},
		{"a note beside a jump, which alone is of the track", texts{"curves.csv": "from_km,to_km,radius_m,cant_mm,note\n1,2,900,10,\n"}, texts{"route.toml": ground["route.toml"] + "[[jump]]\narriving_km = 8\nleaving_km = 8.1\n", "curves.csv": "from_km,to_km,radius_m,cant_mm,note\n1,2,900,10,x\n"},
			[]string{"curves.csv -2 +2: only text", "route.toml +6: track"}},
		{"a route removed", texts{"routes/r2/route.toml": strings.ReplaceAll(ground["route.toml"], "R1", "R2"), "routes/r2/speed.csv": "from_km,to_km,basic\n0,10,100\n"},
			texts{"routes/r2/route.toml": gone, "routes/r2/speed.csv": gone}, []string{"route.toml -1: track", "speed.csv -2: track"}},
		{"nothing", nil, nil, nil},
	}, effects)
}

// What is not lower elsewhere must not be called so: the rows of several
// differences together say the same.
func TestReasonsOfSeveralRows(t *testing.T) {
	same := trainText("T", 80, "", "C2", 200, 200)
	runAccounts(t, []accountTest{
		{"a boundary between rows that say the same for every reference train", texts{"trains.toml": same, "speed.csv": "from_km,to_km,basic,cd300\n0,4,100,\n4,10,100,120\n"},
			texts{"speed.csv": "from_km,to_km,basic,cd300\n0,5,100,\n5,10,100,120\n"}, []string{"speed.csv -2 +2: no such train", "speed.csv -3 +3: no such train"}},
		{"a row for each direction in place of one", nil, texts{"speed.csv": "from_km,to_km,direction,basic\n0,4,,100\n4,6,nominal,80\n4,6,reverse,80\n6,10,,100\n"},
			[]string{"speed.csv -3 +3: same for all", "speed.csv +4: same for all"}},
		{"two temporary restrictions that change names", texts{"temporary.csv": tsr + "A,4,6,,60,,,,,\nB,8,9,,40,,,,,\n"}, texts{"temporary.csv": tsr + "B,4,6,,60,,,,,\nA,8,9,,40,,,,,\n"},
			[]string{"temporary.csv -3 +2: same for all", "temporary.csv -2 +3: same for all"}},
	}, effects)
}

// Rows that only reach into added or removed track are tied to it.
func TestRowsOfAddedTrack(t *testing.T) {
	one := texts{"route.toml": oneWay}
	longer := texts{"route.toml": strings.Replace(oneWay, "10", "11", 1), "speed.csv": strings.Replace(ground["speed.csv"], "6,10,", "6,11,", 1)}
	apart := texts{"route.toml": oneWay + "[[jump]]\narriving_km = 7\nleaving_km = 7.5\n"} // without km 7 to 7.5
	new := over(longer, texts{"speed.csv": ground["speed.csv"] + "10,11,90\n", "axle-load.csv": "from_km,to_km,C2\n10.5,10.8,60\n"})
	runAccounts(t, []accountTest{
		{"the last row becomes longer", one, longer, []string{"route.toml -1 +1: track", "speed.csv -4 +4: track"}},
		{"the last row becomes shorter", longer, over(ground, one), []string{"route.toml -1 +1: track", "speed.csv -4 +4: track"}},
		{"a row behind track that is added in the middle", apart, over(one, texts{"axle-load.csv": "from_km,to_km,C2,E5\n8,9,,60\n"}),
			[]string{"axle-load.csv +2: no such train", "route.toml -7: track"}},
		{"a row before track that is added in the middle", apart, over(one, texts{"axle-load.csv": "from_km,to_km,C2,E5\n5,7,,60\n"}),
			[]string{"axle-load.csv +2: no such train", "route.toml -7: track"}},
		{"a row that reaches into it", apart, over(one, texts{"axle-load.csv": "from_km,to_km,C2,E5\n5,7.1,,60\n"}),
			[]string{"axle-load.csv +2: track", "route.toml -7: track"}},
		{"a row on either side of removed track", over(one, texts{"axle-load.csv": "from_km,to_km,C2,E5\n5,7,,60\n7.2,7.3,,60\n7.5,9,,60\n"}), over(apart, texts{"axle-load.csv": gone}),
			[]string{"axle-load.csv -2: no such train", "axle-load.csv -3: track", "axle-load.csv -4: no such train", "route.toml +7: track"}},
		{"a new row at the running distance that removed track had", one, over(apart, texts{"axle-load.csv": "from_km,to_km,C2,E5\n7.6,7.9,,60\n"}),
			[]string{"axle-load.csv +2: no such train", "route.toml +7: track"}},
		{"new rows on it", one, new, []string{"axle-load.csv +2: track", "route.toml -1 +1: track", "speed.csv +5: track"}},
	}, effects)
}
