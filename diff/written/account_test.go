package written_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/diff/rows"
	"speedtrail/diff/written"
)

// account writes the account of two files: the kind, the lines of the base with
// - and of the target with +, the cells.
func account(tables []written.Table) string {
	var b strings.Builder
	for i := range tables {
		x := &tables[i]
		for _, d := range rows.Compare(&x.Old, &x.New) {
			if x.Name != "" {
				fmt.Fprintf(&b, "[%s] ", x.Name)
			}
			b.WriteString(d.Kind.String())
			for _, n := range d.Old {
				fmt.Fprintf(&b, " -%d", x.Old.Rows[n].Line)
			}
			for _, n := range d.New {
				fmt.Fprintf(&b, " +%d", x.New.Rows[n].Line)
			}
			for _, c := range d.Cells {
				fmt.Fprintf(&b, " %s:%s>%s", x.New.Columns[c.Column], x.Old.Rows[c.Old].Cells[c.Column], x.New.Rows[c.New].Cells[c.Column])
			}
			b.WriteByte('\n')
		}
	}
	return b.String()
}

// The account is the smallest: a reader who compares the files by hand would
// say the same.
func TestSmallestAccount(t *testing.T) {
	const speed = "from_km,to_km,basic,cd150\n0,4,100,120\n4,6,90,\n6,10,100,120\n"
	const trains = "[[train]]\nid = \"T1\"\nname = \"One\"\nlength_m = 200\n\n[[train]]\nid = \"T2\"\nname = \"Two\"\nlength_m = 700\n"
	const request = "id = \"CR-1\"\ntitle = \"A\"\n[[declares]]\nroute = \"R1\"\nfrom_km = 1\nto_km = 2\neffect = \"raise\"\n"
	const jumps = "id = \"R1\"\nstart_km = 0\nend_km = 10\n[[jump]]\narriving_km = 4\nleaving_km = 5\n"
	const policy = "format = 1\n[[person]]\nprincipal = \"a\"\nemails = [\"a@example.org\"]\n[[role]]\nname = \"check\"\nneeded = 1\n"
	tests := []struct{ name, file, old, now, want string }{
		{"a cell", "speed.csv", speed, "from_km,to_km,basic,cd150\n0,4,100,120\n4,6,110,\n6,10,100,120\n", "altered -3 +3 basic:90>110\n"},
		{"a cell in a new column", "speed.csv", speed, "from_km,to_km,passenger,basic,cd150\n0,4,,100,120\n4,6,80,90,\n6,10,,100,120\n", "altered -3 +3 passenger:>80\n"},
		{"a row split, one half altered", "speed.csv", speed, "from_km,to_km,basic,cd150\n0,4,100,120\n4,5,90,\n5,6,110,\n6,10,100,120\n",
			"split -3 +3 +4 to_km:6>5 from_km:4>5 basic:90>110\n"},
		{"a row split in three", "speed.csv", "from_km,to_km,basic\n0,10,100\n", "from_km,to_km,basic\n0,4,100\n4,6,80\n6,10,100\n",
			"split -2 +2 +3 +4 to_km:10>4 from_km:0>4 to_km:10>6 basic:100>80 from_km:0>6\n"},
		{"rows merged", "speed.csv", speed, "from_km,to_km,basic,cd150\n0,10,100,120\n", "merged -2 -3 -4 +2 to_km:4>10\n"},
		{"two of three merged", "speed.csv", speed, "from_km,to_km,basic,cd150\n0,4,100,120\n4,10,90,\n", "merged -3 -4 +3 to_km:6>10\n"},
		{"a boundary moved", "speed.csv", speed, "from_km,to_km,basic,cd150\n0,4.5,100,120\n4.5,6,90,\n6,10,100,120\n",
			"altered -2 +2 to_km:4>4.5\naltered -3 +3 from_km:4>4.5\n"},
		{"a boundary moved and the rows below in another order", "speed.csv", speed, "from_km,to_km,basic,cd150\n6,10,100,120\n4.5,6,90,\n0,4.5,100,120\n",
			"altered -2 +4 to_km:4>4.5\naltered -3 +3 from_km:4>4.5\n"},
		{"a row inserted between others", "axle-load.csv", "from_km,to_km,C2\n0,1,60\n8,9,60\n", "from_km,to_km,C2\n0,1,60\n4,5,50\n8,9,60\n", "added +3\n"},
		{"a row inserted before all, all lines move", "axle-load.csv", "from_km,to_km,C2\n0,1,60\n8,9,60\n", "from_km,to_km,C2\n-2,-1,50\n0,1,60\n8,9,60\n", "added +2\n"},
		{"a row removed", "axle-load.csv", "from_km,to_km,C2\n0,1,60\n4,5,50\n8,9,60\n", "from_km,to_km,C2\n0,1,60\n8,9,60\n", "removed -3\n"},
		{"a row moved as a whole", "axle-load.csv", "from_km,to_km,C2\n0,1,60\n", "from_km,to_km,C2\n4,5,60\n", "altered -2 +2 from_km:0>4 to_km:1>5\n"},
		{"a temporary restriction keeps its id", "temporary.csv", "id,from_km,to_km,speed\nA,0,1,60\nB,4,5,40\n", "id,from_km,to_km,speed\nB,0,1,60\nA,8,9,20\n",
			"altered -3 +2 from_km:4>0 to_km:5>1 speed:40>60\naltered -2 +3 from_km:0>8 to_km:1>9 speed:60>20\n"},
		{"a place keeps its name", "places.csv", "km,kind,name\n1,station,Ash\n2,station,Elm\n", "km,kind,name\n1.1,station,Ash\n2,station,Elm\n", "altered -2 +2 km:1>1.1\n"},
		{"another number of zeros is a cell", "speed.csv", speed, strings.Replace(speed, "4,6", "4.0,6", 1), "altered -3 +3 from_km:4>4.0\n"},
		{"a key of a train", "trains.toml", trains, strings.Replace(trains, "700", "750", 1), "[train] altered -7 +7 length_m:700>750\n"},
		{"trains in another order, one key more", "trains.toml", trains, "[[train]]\nid = \"T2\"\nname = \"Two\"\nlength_m = 700\n[[train]]\nid = \"T1\"\nname = \"One\"\nbraking_ms2 = 0.5\nlength_m = 200\n",
			"[train] altered -2 +6 braking_ms2:>0.5\n"},
		{"a train more", "trains.toml", trains, trains + "[[train]]\nid = \"T3\"\nlength_m = 1\n", "[train] added +11\n"},
		{"a limit", "dataset.toml", "format = 1\nname = \"N\"\n", "format = 1\nname = \"N\"\n[limits]\nlargest_step_kmh = 60\n", "altered -1 +1 limits.largest_step_kmh:>60\n"},
		{"a declaration and the title", "requests/a.toml", request, strings.Replace(strings.Replace(request, "\"A\"", "\"B\"", 1), "raise", "lower", 1),
			"altered -1 +1 title:\"A\">\"B\"\n[declares] altered -4 +4 effect:\"raise\">\"lower\"\n"},
		{"a jump", "route.toml", jumps, strings.Replace(jumps, "leaving_km = 5", "leaving_km = 5.5", 1), "[jump] altered -5 +5 leaving_km:5>5.5\n"},
		{"a jump more", "route.toml", jumps, jumps + "[[jump]]\narriving_km = 8\nleaving_km = 7\n", "[jump] added +8\n"},
		{"an end of the route", "route.toml", jumps, strings.Replace(jumps, "end_km = 10", "end_km = 11", 1), "altered -1 +1 end_km:10>11\n"},
		{"a person and a role", "signoff.toml", policy, strings.Replace(strings.Replace(policy, "needed = 1", "needed = 2", 1), "org", "com", 1),
			"[person] altered -3 +3 emails:[\"a@example.org\"]>[\"a@example.com\"]\n[role] altered -6 +6 needed:1>2\n"},
		{"a key", "allowed_signers", "# keys\na ssh-ed25519 AAAA\nb ssh-ed25519 BBBB\n", "a ssh-ed25519 CCCC\nb ssh-ed25519 BBBB\n", "altered -2 +1 line:a ssh-ed25519 AAAA>a ssh-ed25519 CCCC\n"},
	}
	for _, x := range tests {
		t.Run(x.name, func(t *testing.T) {
			if got := account(written.Pair(x.file, []byte(x.old), []byte(x.now), nil, nil)); got != x.want {
				t.Errorf("got\n%swant\n%s", got, x.want)
			}
		})
	}
}

// Rows are taken in the order of the track, also where posts occur twice.
func TestAccountByRunningDistance(t *testing.T) {
	track := tracks(t)[2]
	old := "from_km,to_km,C2\n4.2#1,4.4#1,60\n4.2#2,4.4#2,70\n"
	now := "from_km,to_km,C2\n4.2#2,4.4#2,75\n4.2#1,4.4#1,65\n"
	want := "altered -2 +3 C2:60>65\naltered -3 +2 C2:70>75\n"
	if got := account(written.Pair("axle-load.csv", []byte(old), []byte(now), track, track)); got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}

// A TOML file without keys of its own has no row for them.
func TestNoEmptyRows(t *testing.T) {
	now := "[[train]]\nid = \"T1\"\nlength_m = 200\n"
	if got, want := account(written.Pair("trains.toml", nil, []byte(now), nil, nil)), "[train] added +2\n"; got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}
