package diff_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/diff"
)

// flat is a data set without train length delay, for travel in one direction.
var flat = texts{"route.toml": oneWay, "speed.csv": flatSpeed(80)}

func flatSpeed(v int) string {
	return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,6,%d,no\n6,10,100,no\n", v)
}

// temporary writes temporary.csv with restrictions FROM,TO,SPEED without train
// length delay.
func temporary(rows ...string) string {
	text := "id,from_km,to_km,speed,train_length_delay\n"
	for i, row := range rows {
		text += fmt.Sprintf("T%d,%s,no\n", i+1, row)
	}
	return text
}

// What temporary restrictions hide today is listed apart, with the speeds that
// will appear when they end.
func TestMasked(t *testing.T) {
	with := func(base texts, rows ...string) texts { return over(base, texts{"temporary.csv": temporary(rows...)}) }
	runAccounts(t, []accountTest{
		{"a raise below a restriction", with(flat, "4,6,60"), texts{"speed.csv": flatSpeed(90)}, []string{"masked nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"a raise that a restriction lets through in part", with(flat, "4,6,85"), texts{"speed.csv": flatSpeed(90)}, []string{
			"nominal 4.000-6.000 T 80>85 by speed.csv -3 +3", "masked nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"a raise as high as the restriction", with(flat, "4,6,90"), texts{"speed.csv": flatSpeed(90)}, []string{"nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"a restriction on a part of the stretch", with(flat, "5,5.5,60"), texts{"speed.csv": flatSpeed(90)}, []string{
			"nominal 4.000-5.000 T 80>90 by speed.csv -3 +3", "nominal 5.500-6.000 T 80>90 by speed.csv -3 +3", "masked nominal 5.000-5.500 T 80>90 by speed.csv -3 +3"}},
		{"two restrictions that meet hide one stretch", with(flat, "4.5,5,60", "5,5.5,50"), texts{"speed.csv": flatSpeed(90)}, []string{
			"nominal 4.000-4.500 T 80>90 by speed.csv -3 +3", "nominal 5.500-6.000 T 80>90 by speed.csv -3 +3", "masked nominal 4.500-5.500 T 80>90 by speed.csv -3 +3"}},
		{"a reduction below a restriction", with(flat, "4,6,60"), texts{"speed.csv": flatSpeed(70)}, []string{"masked nominal 4.000-6.000 T 80>70 by speed.csv -3 +3"}},
		{"a reduction that is seen in part is seen", with(flat, "4,6,75"), texts{"speed.csv": flatSpeed(70)}, []string{"nominal 4.000-6.000 T 75>70 by speed.csv -3 +3"}},
		{"a reduction that a new restriction deepens", flat, with(texts{"speed.csv": flatSpeed(70)}, "4,6,40"), []string{"nominal 4.000-6.000 T 80>40 by speed.csv -3 +3, temporary.csv +2"}},
		{"a restriction goes, nothing behind it", with(flat, "4,6,60"), texts{"temporary.csv": gone}, []string{"nominal 4.000-6.000 T 60>80 by temporary.csv -2"}},
		{"a restriction goes together with a raise", with(flat, "4,6,60"), texts{"temporary.csv": gone, "speed.csv": flatSpeed(90)}, []string{"nominal 4.000-6.000 T 60>90 by speed.csv -3 +3, temporary.csv -2"}},
		{"a restriction goes, behind it a reduction", with(flat, "4,6,60"), texts{"temporary.csv": gone, "speed.csv": flatSpeed(70)}, []string{
			"nominal 4.000-6.000 T 60>70 by speed.csv -3 +3, temporary.csv -2", "masked nominal 4.000-6.000 T 80>70 by speed.csv -3 +3"}},
		{"a restriction comes, behind it a raise", flat, with(texts{"speed.csv": flatSpeed(90)}, "4,6,60"), []string{
			"nominal 4.000-6.000 T 80>60 by speed.csv -3 +3, temporary.csv +2", "masked nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"a restriction is eased, behind it a raise", with(flat, "4,6,60"), with(texts{"speed.csv": flatSpeed(90)}, "4,6,70"), []string{
			"nominal 4.000-6.000 T 60>70 by temporary.csv -2 +2", "masked nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"an expired restriction that still stands in the file hides", over(flat, texts{"temporary.csv": "id,from_km,to_km,speed,valid_to,train_length_delay\nA,4,6,60,2020-01-01,no\n"}), texts{"speed.csv": flatSpeed(90)},
			[]string{"masked nominal 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"only the restriction differs", with(flat, "4,6,60"), with(nil, "4,6,40"), []string{"nominal 4.000-6.000 T 60>40 by temporary.csv -2 +2"}},
		{"one direction", over(flat, texts{"route.toml": ground["route.toml"], "temporary.csv": "id,from_km,to_km,direction,speed,train_length_delay\nA,4,6,reverse,60,no\n"}), texts{"speed.csv": flatSpeed(90)}, []string{
			"nominal 4.000-6.000 T 80>90 by speed.csv -3 +3", "masked reverse 4.000-6.000 T 80>90 by speed.csv -3 +3"}},
		{"a raise and the run-out behind it", texts{"route.toml": oneWay, "temporary.csv": temporary("5,6.1,60")}, texts{"speed.csv": "from_km,to_km,basic\n0,4,100\n4,6,90\n6,10,100\n"}, []string{
			"nominal 4.000-5.000 T 80>90 by speed.csv -3 +3", "nominal 6.100-6.200 T 80>90 run-out by speed.csv -3 +3",
			"masked nominal 5.000-6.000 T 80>90 by speed.csv -3 +3", "masked nominal 6.000-6.100 T 80>90 run-out by speed.csv -3 +3"}},
	}, changesOf)
}

// leavingOf writes the rows that leave a route.
func leavingOf(a *diff.Account) string {
	var lines []string
	for i := range a.Routes {
		r := &a.Routes[i]
		for _, l := range r.Leaving {
			text := fmt.Sprintf("%s %s line %d, %s m", causeText(r, l.Cause), l.Direction, l.Row.Pos.Line, l.Longest.M())
			if l.OfBase {
				text += ", removed"
			}
			if l.ByTrack {
				text += ", by the track"
			}
			lines = append(lines, text)
		}
	}
	return strings.Join(lines, "\n")
}

// A row with train length delay that ends within a train length of the end of
// the route holds beyond it (SUBSET-026 3.11.3.1.3, cut at the end of the route). The
// longest reference train has 200 m.
func TestLeaving(t *testing.T) {
	axle := func(rows string) texts {
		return texts{"axle-load.csv": "from_km,to_km,direction,C2,E5,train_length_delay,note\n" + rows}
	}
	both := trainText("T", 150, "", "C2", 200, 200) + trainText("U", 80, "", "D4", 700, 90)
	runAccounts(t, []accountTest{
		{"at the end", nil, axle("9.5,9.801,,60,,,\n"), []string{"axle-load.csv +2 nominal line 2, 200 m"}},
		{"exactly one train length before it", nil, axle("9.5,9.8,,60,,,\n"), nil},
		{"for a longer train", texts{"trains.toml": both}, axle("9.0,9.8,,60,,,\n"), []string{"axle-load.csv +2 nominal line 2, 700 m"}},
		{"at the start, against the running distance", nil, axle("0.199,0.5,,60,,,\n"), []string{"axle-load.csv +2 reverse line 2, 200 m"}},
		{"exactly one train length behind it", nil, axle("0.2,0.5,,60,,,\n"), nil},
		{"not in this direction", nil, axle("9.5,9.9,reverse,60,,,\n0.1,0.5,nominal,60,,,\n"), nil},
		{"without train length delay", nil, axle("9.5,9.9,,60,,no,\n"), nil},
		{"the far end moves, within a train length", axle("9.5,9.9,,60,,yes,\n"), axle("9.5,9.95,,60,,yes,\n"), []string{"axle-load.csv -2 +2 nominal line 2, 200 m"}},
		{"the far end moves, against the running distance", axle("0.1,0.5,,60,,yes,\n"), axle("0.05,0.5,,60,,yes,\n"), []string{"axle-load.csv -2 +2 reverse line 2, 200 m"}},
		{"the near end moves", axle("9.5,9.9,,60,,yes,\n"), axle("9.6,9.9,,60,,yes,\n"), nil},
		{"the near end moves, against the running distance", axle("0.1,0.5,,60,,yes,\n"), axle("0.1,0.6,,60,,yes,\n"), nil},
		{"a row that goes", axle("9.5,9.9,,60,,,\n"), texts{"axle-load.csv": gone}, []string{"axle-load.csv -2 nominal line 2, 200 m, removed"}},
		{"a note", axle("9.5,9.9,,60,,,\n"), axle("9.5,9.9,,60,,,x\n"), nil},
		{"one row for both directions, and one for each", axle("9.5,9.9,both,60,,,\n0.1,0.5,both,60,,,\n"), axle("9.5,9.9,nominal,60,,,\n9.5,9.9,reverse,60,,,\n0.1,0.5,both,60,,,\n"), nil},
		{"two rows written anew", axle("9.5,9.9,,60,,,\n9.6,9.9,,70,,,\n"), axle("9.6,9.9,both,70,,yes,\n9.5,9.9,both,60,,yes,\n"), nil},
		{"a row that is as it was", axle("9.5,9.9,,60,,,\n"), texts{"speed.csv": strings.Replace(ground["speed.csv"], "80", "90", 1)}, nil},
		{"of a category without a reference train", axle("9.5,9.9,,60,50,,\n"), axle("9.5,9.9,,60,40,,\n"), []string{"axle-load.csv -2 +2 nominal line 2, 200 m"}},
		{"a whole route of one speed, both ends", texts{"speed.csv": "from_km,to_km,basic\n0,10,100\n"}, texts{"speed.csv": "from_km,to_km,basic\n0,10,110\n"},
			[]string{"speed.csv -2 +2 nominal line 2, 200 m", "speed.csv -2 +2 reverse line 2, 200 m"}},
		{"a temporary restriction", nil, texts{"temporary.csv": "id,from_km,to_km,speed\nA,9,10,40\n"}, []string{"temporary.csv +2 nominal line 2, 200 m"}},
		{"by running distance, past missing posts", texts{"route.toml": ground["route.toml"] + "[[jump]]\narriving_km = 9.5\nleaving_km = 9.9\n", "speed.csv": "from_km,to_km,basic\n0,10,100\n"}, axle("9.0,9.45,,60,,,\n"),
			[]string{"axle-load.csv +2 nominal line 2, 200 m"}},
	}, leavingOf)
}

// A row that held beyond the end and does not any more frees the neighbouring
// route of it.
func TestLeavingNoMore(t *testing.T) {
	axle := func(rows string) texts {
		return texts{"axle-load.csv": "from_km,to_km,C2,train_length_delay\n" + rows}
	}
	runAccounts(t, []accountTest{
		{"the delay goes", axle("9.5,9.9,60,yes\n"), axle("9.5,9.9,60,no\n"), []string{"axle-load.csv -2 +2 nominal line 2, 200 m, removed"}},
		{"the row ends earlier", axle("9.5,9.9,60,yes\n"), axle("9.5,9.7,60,yes\n"), []string{"axle-load.csv -2 +2 nominal line 2, 200 m, removed"}},
	}, leavingOf)
}

// A row that is the same reaches beyond the end of the route by another length
// where the end has moved.
func TestLeavingByTrack(t *testing.T) {
	route := func(start, end, more string) texts {
		return texts{
			"route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = " + start + "\nend_km = " + end + "\n" + more,
			"speed.csv":  "from_km,to_km,basic,train_length_delay\n" + start + "," + end + ",80,no\n",
		}
	}
	axle := texts{"axle-load.csv": "from_km,to_km,C2\n0.1,0.3,60\n9.5,9.9,60\n"}
	runAccounts(t, []accountTest{
		{"the end comes nearer", over(route("0", "10", ""), axle), route("0", "9.95", ""), []string{"route.toml -1 +1 nominal line 3, 200 m, by the track"}},
		{"the end goes further, within a train length", over(route("0", "10", ""), axle), route("0", "10.05", ""), []string{"route.toml -1 +1 nominal line 3, 200 m, by the track"}},
		{"the end goes out of reach", over(route("0", "10", ""), axle), route("0", "11", ""), []string{"route.toml -1 +1 nominal line 3, 200 m, removed, by the track"}},
		{"the start goes out of reach", over(route("0", "10", ""), axle), route("-1", "10", ""), []string{"route.toml -1 +1 reverse line 2, 200 m, removed, by the track"}},
		{"neither was in reach", over(route("0", "12", ""), axle), route("0", "11", ""), nil},
		{"posts are missing before the end", over(route("0", "10", ""), axle), route("0", "10", "[[jump]]\narriving_km = 9.95\nleaving_km = 9.98\n"), []string{"route.toml +6 nominal line 3, 200 m, by the track"}},
		{"posts are missing elsewhere", over(route("0", "10", ""), axle), route("0", "10", "[[jump]]\narriving_km = 5\nleaving_km = 6\n"), nil},
		{"a direction goes", over(route("0", "10", ""), axle), route("0", "10", "directions = [\"reverse\"]\n"), []string{"route.toml -1 +1 nominal line 3, 200 m, removed, by the track"}},
		{"a direction comes", over(route("0", "10", "directions = [\"reverse\"]\n"), axle), over(route("0", "10", ""), axle), []string{"route.toml -1 +1 nominal line 3, 200 m, by the track"}},
		{"a direction comes, and rows wait for no rear", over(route("0", "10", "directions = [\"reverse\"]\n"), texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,10,100,no\n"}), route("0", "10", ""), nil},
		{"the row moves with the end", over(route("0", "10", ""), texts{"axle-load.csv": "from_km,to_km,C2\n9.5,9.9,60\n"}), over(route("0", "10.1", ""), texts{"axle-load.csv": "from_km,to_km,C2\n9.5,10,60\n"}), nil},
	}, leavingOf)
}
