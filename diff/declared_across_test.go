package diff_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/diff"
)

// A declaration of which one revision has an end, and the other has not, holds on
// the other one between the outermost points that both have, by the running
// distances there (DEVELOPERS.md, Decisions).
func TestDeclaredAcrossTracks(t *testing.T) {
	track := func(start, end, jump string) string {
		text := "id = \"R1\"\nname = \"One\"\nstart_km = " + start + "\nend_km = " + end + "\ndirections = [\"nominal\"]\n"
		for jump := range strings.SplitSeq(jump, ", ") {
			arriving, leaving, ok := strings.Cut(jump, " ")
			if !ok {
				continue
			}
			text += "[[jump]]\narriving_km = " + arriving + "\nleaving_km = " + leaving + "\n"
		}
		return text
	}
	side := func(start, end, jump string, speed int) texts {
		return texts{"route.toml": track(start, end, jump), "speed.csv": fmt.Sprintf("from_km,to_km,basic,train_length_delay\n%s,4,80,no\n4,7,%d,no\n7,%s,80,no\n", start, speed, end)}
	}
	runAccounts(t, []accountTest{
		{"a start that only the base has", side("0", "10", "", 80), asked(side("2", "10", "", 90), declares("R1", "both", 1, 6, "any", "")), []string{
			"removed nominal: 0.000-1.000 outside, 1.000-2.000 CR-1/0", "nominal 4.000-7.000 T 80>90: 4.000-6.000 CR-1/0, 6.000-7.000 outside", "CR-1/0 sees T 2000 track 1000"}},
		{"a start that only the target has", side("2", "10", "", 80), asked(side("0", "10", "", 90), declares("R1", "both", 1, 6, "any", "")), []string{
			"added nominal: 0.000-1.000 outside, 1.000-2.000 CR-1/0", "nominal 4.000-7.000 T 80>90: 4.000-6.000 CR-1/0, 6.000-7.000 outside", "CR-1/0 sees T 2000 track 1000"}},
		{"an end that only the base has, behind posts that only it has", side("0", "10", "", 80), asked(side("0", "9", "5 5.5", 90), declares("R1", "both", 4.2, 10, "any", "")), []string{
			"removed nominal: 5.000-5.500 CR-1/0", "removed nominal: 9.000-10.000 CR-1/0",
			"nominal 4.000-5.000 T 80>90: 4.000-4.200 outside, 4.200-5.000 CR-1/0", "nominal 5.500-7.000 T 80>90: 5.500-7.000 CR-1/0", "CR-1/0 sees T 2300 track 1500"}},
		{"an end that only the target has, behind posts that only it has", side("0", "9", "5 5.5", 80), asked(side("0", "10", "", 90), declares("R1", "both", 4, 10, "any", "")), []string{
			"added nominal: 5.000-5.500 CR-1/0", "added nominal: 9.000-10.000 CR-1/0",
			"nominal 4.000-5.000 T 80>90: 4.000-5.000 CR-1/0", "nominal 5.500-7.000 T 80>90: 5.500-7.000 CR-1/0", "CR-1/0 sees T 2500 track 1500"}},
		{"an end that only the base has, on a track that begins elsewhere", side("2", "10", "", 80), asked(side("0", "9", "", 90), declares("R1", "both", 3, 9.5, "any", "")), []string{
			"removed nominal: 9.000-9.500 CR-1/0, 9.500-10.000 outside", "added nominal: outside", "nominal 4.000-7.000 T 80>90: 4.000-7.000 CR-1/0", "CR-1/0 sees T 3000 track 500"}},
		{"a start that only the target has, before posts that only the base has", side("2", "10", "", 80), asked(side("0", "10", "2.5 2.8", 90), declares("R1", "both", 1, 5, "any", "")), []string{
			"removed nominal: 2.500-2.800 CR-1/0", "added nominal: 0.000-1.000 outside, 1.000-2.000 CR-1/0", "nominal 4.000-7.000 T 80>90: 4.000-5.000 CR-1/0, 5.000-7.000 outside", "CR-1/0 sees T 1000 track 1300"}},
		{"a start that only the target has, with posts behind the end that only the base has", side("2", "10", "", 80), asked(side("0", "10", "2.5 2.8, 8 8.3", 90), declares("R1", "both", 1, 5, "any", "")), []string{
			"removed nominal: 2.500-2.800 CR-1/0", "removed nominal: outside", "added nominal: 0.000-1.000 outside, 1.000-2.000 CR-1/0",
			"nominal 4.000-7.000 T 80>90: 4.000-5.000 CR-1/0, 5.000-7.000 outside", "CR-1/0 sees T 1000 track 1300"}},
		{"both ends only in the base, on either side of what both have", side("0", "10", "", 80), asked(side("2", "9", "5 5.5", 90), declares("R1", "both", 1, 9.5, "any", "")), []string{
			"removed nominal: 0.000-1.000 outside, 1.000-2.000 CR-1/0", "removed nominal: 5.000-5.500 CR-1/0", "removed nominal: 9.000-9.500 CR-1/0, 9.500-10.000 outside",
			"nominal 4.000-5.000 T 80>90: 4.000-5.000 CR-1/0", "nominal 5.500-7.000 T 80>90: 5.500-7.000 CR-1/0", "CR-1/0 sees T 2500 track 2000"}},
		{"all of it only in the base", side("0", "10", "", 80), asked(side("2", "10", "", 90), declares("R1", "both", 0, 1, "any", "")), []string{
			"removed nominal: 0.000-1.000 CR-1/0, 1.000-2.000 outside", "nominal 4.000-7.000 T 80>90: outside", "CR-1/0 sees track 1000"}},
	}, declaredOf)
}

// Behind a jump back the posts are lower, and where none repeats nothing that is
// written shows it: a stretch over it ends at a lower post than it begins at.
func TestDeclaredOverJumpBack(t *testing.T) {
	side := func(speed int) texts {
		return texts{
			"route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = 5\nend_km = 4\ndirections = [\"nominal\"]\n[[jump]]\narriving_km = 8\nleaving_km = 1\n",
			"speed.csv":  fmt.Sprintf("from_km,to_km,basic,train_length_delay\n5,6,80,no\n6,3,%d,no\n3,4,80,no\n", speed),
		}
	}
	runAccounts(t, []accountTest{
		{"over a jump back", side(80), asked(side(90), declares("R1", "both", 6, 2, "any", "")), []string{
			"nominal 6.000-3.000 T 80>90: 6.000-2.000 CR-1/0, 2.000-3.000 outside", "CR-1/0 sees T 3000"}},
	}, declaredOf)
}

// The rows that held a raise back are the base's: they reach as far as they did there,
// wherever the target's track leaves their ends, and each of them has to end in a
// declaration (rules.md, Declared against observed; DEVELOPERS.md, Decisions).
func TestRunOutAcrossTracks(t *testing.T) {
	// C holds 60 for the front on both sides, so that of B only the run-out is seen.
	const c = "id,from_km,to_km,speed,train_length_delay\nC,1,4.1,60,no\n"
	const axle = "from_km,to_km,C2\n"
	base := func(end string) texts {
		return texts{"route.toml": oneWay, "speed.csv": "from_km,to_km,basic,train_length_delay\n0,10,100,no\n", "axle-load.csv": axle + "2,4.1,60\n1," + end + ",80\n", "temporary.csv": c}
	}
	target := func(jump, row string) texts {
		arriving, leaving, _ := strings.Cut(jump, " ")
		return asked(texts{"route.toml": oneWay + "[[jump]]\narriving_km = " + arriving + "\nleaving_km = " + leaving + "\n", "axle-load.csv": axle + row}, declares("R1", "both", 4.05, 4.1, "raise", ""))
	}
	only := func(a *diff.Account) string {
		var lines []string
		for _, line := range strings.Split(declaredOf(a), "\n") {
			if strings.Contains(line, "run-out") && !strings.Contains(line, "masked") {
				lines = append(lines, line)
			}
		}
		return strings.Join(lines, "\n")
	}
	const behind = "nominal 4.100-4.300 T 60>100 run-out: 4.100-4.200 outside, 4.200-4.300 CR-1/0 run-out"
	runAccounts(t, []accountTest{
		{"the track differs elsewhere", base("4"), target("9 9.1", ""), []string{behind}},
		{"a row ends among posts that the target lacks", base("4"), target("3.9 4.04", ""), []string{behind}},
		{"a row ends at a post that the target has twice", base("4"), target("4.01 3.99", ""), []string{behind}},
		{"a row ends further off on the target's track", base("3.95"), target("4.04 3.96", ""), []string{strings.ReplaceAll(behind, "4.200", "4.150")}},
		{"a row that is the same lets go because the track is longer", base("4"), target("4.05 4.01", "1,4,80\n"), []string{
			"nominal 4.100-4.160 T 60>80 run-out: 4.100-4.160 CR-1/0 run-out", "nominal 4.160-4.300 T 60>100 run-out: 4.160-4.200 outside, 4.200-4.300 CR-1/0 run-out"}},
	}, only)
	// A row that ends where the target's track does is in a declaration that goes on.
	runAccounts(t, []accountTest{
		{"a row behind the end of the target's track", over(ground, texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1), "speed.csv": "from_km,to_km,basic\n0,9,100\n9,10,80\n"}),
			asked(texts{"route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 9\ndirections = [\"reverse\"]\n", "speed.csv": "from_km,to_km,basic\n0,9,100\n"}, declares("R1", "both", 8.9, 10, "raise", "")),
			[]string{"reverse 8.800-9.000 T 80>100 run-out: 8.800-8.900 CR-1/0 run-out, 8.900-9.000 CR-1/0"}},
		{"a declaration behind the end of the target's track", over(ground, texts{"route.toml": strings.Replace(oneWay, "nominal", "reverse", 1), "speed.csv": "from_km,to_km,basic\n0,9,100\n9,10,80\n"}),
			asked(texts{"route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 9\ndirections = [\"reverse\"]\n", "speed.csv": "from_km,to_km,basic\n0,9,100\n"}, declares("R1", "both", 9, 10, "raise", "")),
			[]string{"reverse 8.800-9.000 T 80>100 run-out: 8.800-9.000 CR-1/0 run-out"}},
	}, only)
}
