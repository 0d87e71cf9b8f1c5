package diff_test

import (
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"

	"speedtrail/diff"
	"speedtrail/diff/scope"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// declaredOf writes how declarations hold each change, and what is seen of each
// declaration.
func declaredOf(a *diff.Account) string {
	var lines []string
	name := func(by int) string {
		d := a.Declared[by]
		return fmt.Sprintf("%s/%d", a.Requests[d.Request].ID, d.Declaration)
	}
	for i := range a.Routes {
		r := &a.Routes[i]
		held := func(index int, side *schema.Route) string {
			var list []string
			for _, p := range r.Pieces[index] {
				text := fmt.Sprintf("%s-%s ", side.Track.Begins(p.From), side.Track.Ends(p.To))
				if p.By == scope.Outside {
					text += "outside"
				} else {
					text += name(p.By)
				}
				if p.RunOut {
					text += " run-out"
				}
				list = append(list, text)
			}
			if list == nil {
				return "outside"
			}
			return strings.Join(list, ", ")
		}
		for k := range r.Track {
			x := &r.Track[k]
			side := r.Target
			if x.Fate == diff.Removed {
				side = r.Base
			}
			lines = append(lines, fmt.Sprintf("%s %s: %s", x.Fate, x.Direction, held(x.Pieces, side)))
		}
		for k, list := range [][]diff.Change{r.Changes, r.Masked} {
			for n := range list {
				text, _, _ := strings.Cut(changeText(a, r, &list[n]), " by ")
				lines = append(lines, []string{"", "masked "}[k]+text+": "+held(list[n].Pieces, r.Target))
			}
		}
	}
	for i := range a.Declared {
		d := &a.Declared[i]
		text := name(i) + " sees"
		for _, s := range d.Seen {
			text += fmt.Sprintf(" %s %s", a.Trains[s.Train].ID, s.Inside.M())
			if s.RunOut > 0 {
				text += "+" + s.RunOut.M()
			}
			if s.Hidden > 0 {
				text += " hidden " + s.Hidden.M()
			}
		}
		if d.Track > 0 {
			text += " track " + d.Track.M()
		}
		if d.Dated > 0 {
			text += " dates " + d.Dated.M()
		}
		if d.Unseen() {
			text += " nothing"
		}
		lines = append(lines, text)
	}
	for _, t := range a.Trains {
		if t.Fate != diff.Kept {
			lines = append(lines, fmt.Sprintf("%s %s, declared %t", t.ID, t.Fate, t.Declared))
		}
	}
	return strings.Join(lines, "\n")
}

// asked is a target with a request CR-1 of these declarations.
func asked(target texts, declarations ...string) texts {
	return over(target, texts{"requests/cr-1.toml": "id = \"CR-1\"\ntitle = \"A\"\nreason = \"B\"\n" + strings.Join(declarations, "")})
}

// Changes are cut at the limits of the declarations in play.
func TestDeclared(t *testing.T) {
	raise := texts{"speed.csv": flatSpeed(90)}
	delayed := texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}
	hold := texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic\n0,10,100\n"}
	under := func(v int) string {
		return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,1,100,\n1,2,%d,yes\n2,2.2,80,no\n2.2,2.3,100,\n2.3,3,60,yes\n3,10,100,\n", v)
	}
	mirrored := func(v int) string {
		return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,7,100,\n7,7.7,60,yes\n7.7,7.8,100,\n7.8,8,80,no\n8,9,%d,yes\n9,10,100,\n", v)
	}
	const both = "id,from_km,to_km,speed,train_length_delay\nB,5,5.2,40,no\n"
	held := func(rows string) texts {
		return texts{"axle-load.csv": "from_km,to_km,C2,train_length_delay\n5.15,5.175,60,no\n" + rows}
	}
	two := trainText("T", 150, "", "C2", 200, 200) + trainText("U", 80, "", "D4", 700, 90)
	lasting := func(to string) string {
		return "id,from_km,to_km,speed,train_length_delay,valid_from,valid_to\nB,4,5,40,no,2026-01-01," + to + "\n"
	}
	runAccounts(t, []accountTest{
		{"no request in play", flat, raise, []string{"nominal 4.000-6.000 T 80>90: outside"}},
		{"inside", flat, asked(raise, declares("R1", "both", 4, 6, "raise", "")), []string{"nominal 4.000-6.000 T 80>90: 4.000-6.000 CR-1/0", "CR-1/0 sees T 2000"}},
		{"wider than the change", flat, asked(raise, declares("R1", "nominal", 0, 10, "any", `"T"`)), []string{"nominal 4.000-6.000 T 80>90: 4.000-6.000 CR-1/0", "CR-1/0 sees T 2000"}},
		{"a part", flat, asked(raise, declares("R1", "both", 4.5, 5, "raise", "")), []string{
			"nominal 4.000-6.000 T 80>90: 4.000-4.500 outside, 4.500-5.000 CR-1/0, 5.000-6.000 outside", "CR-1/0 sees T 500"}},
		{"two that overlap: the first counts, both see", flat, asked(raise, declares("R1", "both", 4, 5.2, "raise", ""), declares("R1", "both", 4.8, 6, "any", "")), []string{
			"nominal 4.000-6.000 T 80>90: 4.000-5.200 CR-1/0, 5.200-6.000 CR-1/1", "CR-1/0 sees T 1200", "CR-1/1 sees T 1200"}},
		{"the wrong sense", flat, asked(raise, declares("R1", "both", 4, 6, "lower", "")), []string{"nominal 4.000-6.000 T 80>90: outside", "CR-1/0 sees nothing"}},
		{"a reduction", flat, asked(texts{"speed.csv": flatSpeed(70)}, declares("R1", "both", 4, 6, "raise", ""), declares("R1", "both", 4, 6, "lower", "")), []string{
			"nominal 4.000-6.000 T 80>70: 4.000-6.000 CR-1/1", "CR-1/0 sees nothing", "CR-1/1 sees T 2000"}},
		{"another direction", flat, asked(raise, declares("R1", "reverse", 4, 6, "raise", "")), []string{"nominal 4.000-6.000 T 80>90: outside", "CR-1/0 sees nothing"}},
		{"another stretch, which only touches", flat, asked(raise, declares("R1", "both", 6, 8, "raise", "")), []string{"nominal 4.000-6.000 T 80>90: outside", "CR-1/0 sees nothing"}},
		{"one train of two", over(flat, texts{"trains.toml": two}), asked(raise, declares("R1", "both", 4, 6, "raise", `"U"`)), []string{
			"nominal 4.000-6.000 T 80>90: outside", "nominal 4.000-6.000 U 80>90: 4.000-6.000 CR-1/0", "CR-1/0 sees U 2000"}},
		{"run-out past the far end, in both directions", nil, asked(delayed, declares("R1", "both", 4, 6, "raise", "")), []string{
			"nominal 4.000-6.000 T 80>90: 4.000-6.000 CR-1/0", "nominal 6.000-6.200 T 80>90 run-out: 6.000-6.200 CR-1/0 run-out",
			"reverse 3.800-4.000 T 80>90 run-out: 3.800-4.000 CR-1/0 run-out", "reverse 4.000-6.000 T 80>90: 4.000-6.000 CR-1/0", "CR-1/0 sees T 4000+400"}},
		{"run-out of a reduction", nil, asked(texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "70", 1)}, declares("R1", "reverse", 4, 6, "lower", "")), []string{
			"nominal 4.000-6.000 T 80>70: outside", "nominal 6.000-6.200 T 80>70 run-out: outside",
			"reverse 3.800-4.000 T 80>70 run-out: 3.800-4.000 CR-1/0 run-out", "reverse 4.000-6.000 T 80>70: 4.000-6.000 CR-1/0", "CR-1/0 sees T 2000+200"}},
		{"the row ends beyond the declaration", texts{"route.toml": oneWay}, asked(delayed, declares("R1", "both", 4, 5.9, "raise", "")), []string{
			"nominal 4.000-6.000 T 80>90: 4.000-5.900 CR-1/0, 5.900-6.000 outside", "nominal 6.000-6.200 T 80>90 run-out: outside", "CR-1/0 sees T 1900"}},
		{"the far end against the running distance is the beginning of the row", texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1)},
			asked(delayed, declares("R1", "both", 4, 5, "raise", ""), declares("R1", "both", 5, 6, "raise", "")), []string{
				"reverse 3.800-4.000 T 80>90 run-out: 3.800-4.000 CR-1/0 run-out", "reverse 4.000-6.000 T 80>90: 4.000-5.000 CR-1/0, 5.000-6.000 CR-1/1", "CR-1/0 sees T 1000+200", "CR-1/1 sees T 1000"}},
		{"run-out of a reduction by the new end of the row", texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic\n0,10,100\n", "axle-load.csv": "from_km,to_km,C2\n4,5,60\n"},
			asked(texts{"axle-load.csv": "from_km,to_km,C2\n4,6,60\n"}, declares("R1", "both", 5.5, 6, "lower", "")), []string{
				"nominal 5.200-6.000 T 100>60: 5.200-5.500 outside, 5.500-6.000 CR-1/0", "nominal 6.000-6.200 T 100>60 run-out: 6.000-6.200 CR-1/0 run-out", "CR-1/0 sees T 500+200"}},
		{"run-out of a raise by the old end of the row", texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic\n0,10,100\n", "axle-load.csv": "from_km,to_km,C2\n4,6,60\n"},
			asked(texts{"axle-load.csv": "from_km,to_km,C2\n4,5,60\n"}, declares("R1", "both", 5.5, 6, "raise", "")), []string{
				"nominal 5.200-6.000 T 60>100: 5.200-5.500 outside, 5.500-6.000 CR-1/0", "nominal 6.000-6.200 T 60>100 run-out: 6.000-6.200 CR-1/0 run-out", "CR-1/0 sees T 500+200"}},
		{"run-out inside the declaration itself", texts{"route.toml": oneWay}, asked(delayed, declares("R1", "both", 4, 6.05, "raise", "")), []string{
			"nominal 4.000-6.000 T 80>90: 4.000-6.000 CR-1/0", "nominal 6.000-6.200 T 80>90 run-out: 6.000-6.050 CR-1/0, 6.050-6.200 CR-1/0 run-out", "CR-1/0 sees T 2050+150"}},
		// Another row that ends past the declaration holds the train as well: its going
		// is not declared. A lower row covers its own stretch.
		{"run-out of a row that is declared beside one that is not", over(hold, held("4,5,80,yes\n5.15,5.175,80,yes\n")), asked(held(""), declares("R1", "both", 4, 5.15, "raise", "")), []string{
			"nominal 4.000-5.000 T 80>100: 4.000-5.000 CR-1/0", "nominal 5.000-5.150 T 80>100 run-out: 5.000-5.150 CR-1/0", "nominal 5.175-5.375 T 80>100 run-out: outside", "CR-1/0 sees T 1150"}},
		{"the same where both are declared", over(hold, held("4,5,80,yes\n5.15,5.175,80,yes\n")), asked(held(""), declares("R1", "both", 4, 5.175, "raise", "")), []string{
			"nominal 4.000-5.000 T 80>100: 4.000-5.000 CR-1/0", "nominal 5.000-5.150 T 80>100 run-out: 5.000-5.150 CR-1/0", "nominal 5.175-5.375 T 80>100 run-out: 5.175-5.375 CR-1/0 run-out", "CR-1/0 sees T 1150+200"}},
		// A row that is removed held the train as well, at a speed that another row
		// undercut.
		{"run-out of a declared row in front of a higher one that is not declared",
			texts{"route.toml": oneWay, "trains.toml": trainText("T", 150, "", "C2", 300, 200), "axle-load.csv": "from_km,to_km,C2\n2,2.2,80\n", "speed.csv": under(60)},
			asked(texts{"axle-load.csv": gone, "speed.csv": under(100)}, declares("R1", "both", 1, 2, "raise", "")), []string{
				"nominal 1.000-2.000 T 60>100: 1.000-2.000 CR-1/0", "nominal 2.000-2.200 T 60>80 run-out: 2.000-2.200 CR-1/0 run-out", "nominal 2.200-2.300 T 60>100 run-out: outside", "CR-1/0 sees T 1000+200"}},
		{"the same against the distance",
			texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1), "trains.toml": trainText("T", 150, "", "C2", 300, 200), "axle-load.csv": "from_km,to_km,C2\n7.8,8,80\n", "speed.csv": mirrored(60)},
			asked(texts{"axle-load.csv": gone, "speed.csv": mirrored(100)}, declares("R1", "both", 8, 9, "raise", "")), []string{
				"reverse 7.700-7.800 T 60>100 run-out: outside", "reverse 7.800-8.000 T 60>80 run-out: 7.800-8.000 CR-1/0 run-out", "reverse 8.000-9.000 T 60>100: 8.000-9.000 CR-1/0", "CR-1/0 sees T 1000+200"}},
		{"a temporary restriction that goes holds nobody back where none is in force",
			texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic\n0,4,100\n4,5,80\n5,10,100\n", "temporary.csv": both + "X,5,5.05,90,yes\n"},
			asked(texts{"speed.csv": "from_km,to_km,basic\n0,10,100\n", "temporary.csv": both}, declares("R1", "both", 4, 5, "raise", "")), []string{
				"nominal 4.000-5.000 T 80>100: 4.000-5.000 CR-1/0", "nominal 5.200-5.250 T 90>100 run-out: outside", "masked nominal 5.000-5.200 T 80>100 run-out: 5.000-5.200 CR-1/0 run-out", "CR-1/0 sees T 1000 hidden 200"}},
		{"the same where that one stays",
			texts{"route.toml": oneWay, "trains.toml": trainText("T", 150, "", "C2", 300, 200), "axle-load.csv": "from_km,to_km,C2\n2,2.2,80\n", "speed.csv": under(60)},
			asked(texts{"speed.csv": under(100)}, declares("R1", "both", 1, 2, "raise", "")), []string{
				"nominal 1.000-2.000 T 60>100: 1.000-2.000 CR-1/0", "nominal 2.000-2.300 T 60>80 run-out: 2.000-2.300 CR-1/0 run-out", "CR-1/0 sees T 1000+300"}},
		{"the same as a reduction, which each of them makes", over(hold, held("")), asked(held("4,5,80,yes\n5.15,5.175,80,yes\n"), declares("R1", "both", 4, 5.15, "lower", "")), []string{
			"nominal 4.000-5.000 T 100>80: 4.000-5.000 CR-1/0", "nominal 5.000-5.150 T 100>80 run-out: 5.000-5.150 CR-1/0", "nominal 5.175-5.375 T 100>80 run-out: 5.175-5.200 CR-1/0 run-out, 5.200-5.375 outside", "CR-1/0 sees T 1150+25"}},
		{"a change that is hidden today", over(flat, texts{"temporary.csv": temporary("4,5,60")}), asked(raise, declares("R1", "both", 4, 4.5, "raise", "")), []string{
			"nominal 5.000-6.000 T 80>90: outside", "masked nominal 4.000-5.000 T 80>90: 4.000-4.500 CR-1/0, 4.500-5.000 outside", "CR-1/0 sees T 0 hidden 500"}},
		{"hidden today in part", over(flat, texts{"temporary.csv": temporary("4,5,60")}), asked(raise, declares("R1", "both", 4, 6, "raise", "")), []string{
			"nominal 5.000-6.000 T 80>90: 5.000-6.000 CR-1/0", "masked nominal 4.000-5.000 T 80>90: 4.000-5.000 CR-1/0", "CR-1/0 sees T 1000 hidden 1000"}},
		{"a change that is seen and goes further without temporary restrictions counts once", over(flat, texts{"temporary.csv": temporary("4,5,85")}), asked(raise, declares("R1", "both", 4, 6, "raise", "")), []string{
			"nominal 4.000-5.000 T 80>85: 4.000-5.000 CR-1/0", "nominal 5.000-6.000 T 80>90: 5.000-6.000 CR-1/0", "masked nominal 4.000-5.000 T 80>90: 4.000-5.000 CR-1/0", "CR-1/0 sees T 2000"}},
		{"other dates of a restriction, which change no speed", over(flat, texts{"temporary.csv": lasting("2026-12-31")}), asked(texts{"temporary.csv": lasting("2026-01-31")},
			declares("R1", "both", 4, 4.5, "raise", ""), declares("R1", "both", 4, 6, "lower", ""), declares("R1", "nominal", 4.5, 8, "any", `"T"`), declares("R1", "both", 5, 6, "any", "")), []string{
			"CR-1/0 sees dates 500", "CR-1/1 sees nothing", "CR-1/2 sees dates 500", "CR-1/3 sees nothing"}},
		{"added track needs any effect", texts{"route.toml": oneWay}, asked(texts{"route.toml": ground["route.toml"]}, declares("R1", "both", 0, 10, "raise", ""), declares("R1", "reverse", 2, 6, "any", "")), []string{
			"added reverse: 0.000-2.000 outside, 2.000-6.000 CR-1/1, 6.000-10.000 outside", "CR-1/0 sees nothing", "CR-1/1 sees track 4000"}},
		{"a reduction is none of track", texts{"route.toml": oneWay}, asked(texts{"route.toml": ground["route.toml"]}, declares("R1", "both", 0, 10, "lower", "")), []string{
			"added reverse: outside", "CR-1/0 sees nothing"}},
		{"any effect for one train is not for the track", texts{"route.toml": oneWay}, asked(texts{"route.toml": ground["route.toml"]}, declares("R1", "reverse", 2, 6, "any", `"T"`)), []string{
			"added reverse: outside", "CR-1/0 sees nothing"}},
		{"an end that only the base has", over(flat, texts{"route.toml": oneWay}), asked(over(raise, texts{"route.toml": strings.Replace(oneWay, "end_km = 10", "end_km = 5", 1), "speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,5,90,no\n"}), declares("R1", "both", 4, 10, "any", "")), []string{
			"removed nominal: 5.000-10.000 CR-1/0", "nominal 4.000-5.000 T 80>90: 4.000-5.000 CR-1/0", "CR-1/0 sees T 1000 track 5000"}},
		{"removed track, by the posts of the base", texts{"route.toml": oneWay}, asked(texts{"route.toml": oneWay + "[[jump]]\narriving_km = 8\nleaving_km = 8.5\n"}, declares("R1", "both", 8, 8.5, "any", "")), []string{
			"removed nominal: 8.000-8.500 CR-1/0", "CR-1/0 sees track 500"}},
	}, declaredOf)
}

// A change of the reference trains is declared by a declaration of any effect
// that names the train.
func TestDeclaredTrains(t *testing.T) {
	longer := texts{"trains.toml": trainText("T", 150, "", "C2", 250, 200)}
	added := texts{"trains.toml": ground["trains.toml"] + trainText("U", 80, "", "D4", 700, 90)}
	runAccounts(t, []accountTest{
		{"altered", nil, longer, []string{"T altered, declared false"}},
		{"any effect that names it", nil, asked(longer, declares("R1", "both", 0, 10, "any", `"T"`)), []string{"CR-1/0 sees nothing", "T altered, declared true"}},
		{"any effect for all trains", nil, asked(longer, declares("R1", "both", 0, 10, "any", "")), []string{"CR-1/0 sees nothing", "T altered, declared false"}},
		{"another effect", nil, asked(longer, declares("R1", "both", 0, 10, "raise", `"T"`)), []string{"CR-1/0 sees nothing", "T altered, declared false"}},
		{"another train", added, asked(texts{"trains.toml": longer["trains.toml"] + trainText("U", 80, "", "D4", 700, 90)}, declares("R1", "both", 0, 10, "any", `"U"`)), []string{"CR-1/0 sees nothing", "T altered, declared false"}},
		{"added", nil, asked(added, declares("R1", "both", 0, 10, "any", `"T", "U"`)), []string{"CR-1/0 sees nothing", "U added, declared true"}},
		{"removed", added, asked(texts{"trains.toml": ground["trains.toml"]}, declares("R1", "both", 0, 10, "any", `"U"`)), []string{"CR-1/0 sees nothing", "U removed, declared true"}},
	}, func(a *diff.Account) string {
		for i := range a.Routes {
			a.Routes[i].Changes = nil // not what is looked at here
		}
		return declaredOf(a)
	})
}

// In play are the requests that were named, else those added or altered; where
// one stands in its file does not matter.
func TestRequestsInPlay(t *testing.T) {
	base := texts{
		"requests/a.toml": requestText("CR-1", "R1", 4, 6, "raise", ""),
		"requests/b.toml": requestText("CR-2", "R1", 4, 6, "raise", ""),
		"requests/c.toml": requestText("CR-9", "OLD", 4, 6, "raise", `"GONE"`), // old requests outlive routes and trains
	}
	raise := over(flat, base)
	for _, x := range []struct {
		name   string
		target texts
		o      diff.Options
		want   string
	}{
		{"none", nil, diff.Options{}, ""},
		{"an altered one", texts{"requests/b.toml": requestText("CR-2", "R1", 4, 6, "any", "")}, diff.Options{}, "CR-2"},
		{"a new one", texts{"requests/d.toml": requestText("CR-0", "R1", 4, 6, "any", "")}, diff.Options{}, "CR-0"},
		{"one that moved to another file and other lines", texts{"requests/b.toml": gone, "requests/e.toml": "# moved\n\n" + base["requests/b.toml"]}, diff.Options{}, ""},
		{"one that goes", texts{"requests/b.toml": gone}, diff.Options{}, ""},
		{"named, in the order of the ids", nil, diff.Options{Requests: []string{"CR-2", "CR-1", "CR-2"}}, "CR-1 CR-2"},
		{"named, not the altered one", texts{"requests/b.toml": requestText("CR-2", "R1", 4, 6, "any", "")}, diff.Options{Requests: []string{"CR-1"}}, "CR-1"},
		{"left out", texts{"requests/d.toml": requestText("CR-0", "NOWHERE", 4, 6, "any", "")}, diff.Options{NoRequests: true}, ""},
	} {
		t.Run(x.name, func(t *testing.T) {
			a := compare(t, raise, x.target, x.o)
			var ids []string
			for _, q := range a.Requests {
				ids = append(ids, q.ID)
			}
			if got := strings.Join(ids, " "); got != x.want || a.Reconciled == x.o.NoRequests {
				t.Errorf("got %q, reconciled %t, want %q", got, a.Reconciled, x.want)
			}
		})
	}
	var unknown *diff.UnknownRequestError
	d := read(t, over(ground, raise))
	if _, err := diff.Compare(t.Context(), d, d, diff.Options{Requests: []string{"CR-1", "CR-7"}}); !errors.As(err, &unknown) || unknown.ID != "CR-7" || !slices.Equal(unknown.Known, []string{"CR-1", "CR-2", "CR-9"}) {
		t.Errorf("got %v for a request that is not there", err)
	}
}

// Requests in play that name what does not exist are faults, all of them at
// once, with their places.
func TestDeclaredFaults(t *testing.T) {
	repeated := texts{"route.toml": ground["route.toml"] + "[[jump]]\narriving_km = 5\nleaving_km = 4.5\n", "speed.csv": "from_km,to_km,basic\n0,10,100\n"}
	for _, x := range []struct {
		name         string
		base, target texts
		want         []string
	}{
		{"a route", nil, asked(nil, declares("R9", "both", 1, 2, "any", "")), []string{`requests/cr-1.toml:5:9: the declaration names route "R9", which neither revision has`}},
		{"a train", nil, asked(nil, declares("R1", "both", 1, 2, "any", `"T", "X"`)), []string{`requests/cr-1.toml:10:16: the declaration names train "X", which neither revision has`}},
		{"a position outside", nil, asked(nil, declares("R1", "both", 1, 12, "any", "")), []string{`requests/cr-1.toml:8:9: the declaration on route "R1": to_km 12.000 is outside the route, which runs from 0.000 to 10.000`}},
		{"the wrong way round, as only the track can tell", repeated, asked(nil, strings.Replace(declares("R1", "both", 1, 6, "any", ""), "from_km = 1", `from_km = "4.75#2"`, 1), strings.NewReplacer("from_km = 1", `from_km = "4.75#2"`, "to_km = 6", `to_km = "4.9#1"`).Replace(declares("R1", "both", 1, 6, "any", ""))), []string{
			`requests/cr-1.toml:14:9: the declaration on route "R1": to_km 4.900#1 does not lie after from_km 4.750#2 along the track in the nominal direction`}},
		{"an ambiguous position", repeated, asked(nil, declares("R1", "both", 1, 4.75, "any", "")), []string{`requests/cr-1.toml:8:9: the declaration on route "R1": to_km 4.750 is ambiguous, posts repeat here: write 4.750#1 or 4.750#2`}},
		{"several", nil, asked(nil, declares("R9", "both", 1, 2, "any", `"X"`), declares("R1", "both", 11, 12, "any", "")), []string{
			`requests/cr-1.toml:5:9: the declaration names route "R9", which neither revision has`, `requests/cr-1.toml:10:11: the declaration names train "X", which neither revision has`,
			`requests/cr-1.toml:14:11: the declaration on route "R1": from_km 11.000 is outside the route, which runs from 0.000 to 10.000`}},
		{"a position that only the base has", repeated, asked(texts{"route.toml": ground["route.toml"], "speed.csv": ground["speed.csv"]}, strings.Replace(declares("R1", "both", 1, 2, "any", ""), "to_km = 2", `to_km = "4.75#2"`, 1)), nil},
		{"a first occurrence that is marked", nil, asked(nil, strings.Replace(declares("R1", "both", 1, 2, "any", ""), "to_km = 2", `to_km = "4.75#1"`, 1)), nil},
	} {
		t.Run(x.name, func(t *testing.T) {
			before := over(ground, x.base)
			_, err := diff.Compare(t.Context(), read(t, before), read(t, over(before, x.target)), diff.Options{})
			var got []string
			var faults *source.Faults
			if errors.As(err, &faults) {
				got = strings.Split(faults.Error(), "\n")
			} else if err != nil {
				t.Fatal(err)
			}
			if strings.Join(got, "\n") != strings.Join(x.want, "\n") {
				t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(x.want, "\n"))
			}
		})
	}
}

// A declaration on a route whose files are the same on both sides is unseen; the
// route is asked for, to tell it from one that does not exist.
func TestDeclaredOnUnreadRoute(t *testing.T) {
	other := read(t, over(ground, texts{"route.toml": strings.Replace(ground["route.toml"], "R1", "R2", 1)})).Routes[0]
	refused := errors.New("the route cannot be read")
	for _, x := range []struct {
		name, want string
		to         float64
		unread     func(string) (*schema.Route, error)
	}{
		{"there", "", 2, func(string) (*schema.Route, error) { return other, nil }},
		{"there, but not so long", `requests/cr-1.toml:8:9: the declaration on route "R2": to_km 12.000 is outside the route, which runs from 0.000 to 10.000`, 12, func(string) (*schema.Route, error) { return other, nil }},
		{"not there", `requests/cr-1.toml:5:9: the declaration names route "R2", which neither revision has`, 2, func(string) (*schema.Route, error) { return nil, nil }},
		{"nobody to ask", `requests/cr-1.toml:5:9: the declaration names route "R2", which neither revision has`, 2, nil},
		{"not to be read", refused.Error(), 2, func(string) (*schema.Route, error) { return nil, refused }},
	} {
		t.Run(x.name, func(t *testing.T) {
			target := asked(nil, declares("R2", "both", 1, x.to, "any", ""))
			a, err := diff.Compare(t.Context(), read(t, ground), read(t, over(ground, target)), diff.Options{Unread: x.unread})
			switch {
			case err != nil && err.Error() != x.want, err == nil && x.want != "":
				t.Errorf("got %v, want %q", err, x.want)
			case err == nil && declaredOf(a) != "CR-1/0 sees nothing":
				t.Errorf("got %s", declaredOf(a))
			}
		})
	}
}
