package diff_test

import (
	"context"
	"fmt"
	"maps"
	"path"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"pgregory.net/rapid"

	"speedtrail/diff"
	"speedtrail/schema"
)

// texts are the files of a data set by name; those of the route R1 stand
// without its folder.
type texts map[string]string

// ground is the data set that the revisions of these tests are made of: 10 km
// at 100 km/h with a slow part, one train of 200 m.
var ground = texts{
	"dataset.toml": "format = 1\nname = \"Test\"\n",
	"trains.toml":  trainText("T", 150, "", "C2", 200, 200),
	"route.toml":   "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 10\n",
	"speed.csv":    "from_km,to_km,basic\n0,4,100\n4,6,80\n6,10,100\n",
}

// oneWay is a route.toml for travel with the running distance only.
const oneWay = "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 10\ndirections = [\"nominal\"]\n"

func trainText(id string, cant int, categories, axle string, length, top int) string {
	return fmt.Sprintf("[[train]]\nid = %q\nname = \"A train\"\ncant_deficiency_mm = %d\ncategories = [%s]\naxle_load = %q\nlength_m = %d\nmax_speed_kmh = %d\n",
		id, cant, categories, axle, length, top)
}

// gone stands for a file that is taken away.
const gone = "gone"

// over lays files over others.
func over(base, more texts) texts {
	out := texts{}
	maps.Copy(out, base)
	maps.Copy(out, more)
	return out
}

func read(t testing.TB, files texts) *schema.Dataset {
	t.Helper()
	d, err := load(t.Context(), files)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// readRapid reads what a property has drawn.
func readRapid(t *rapid.T, files texts) *schema.Dataset {
	d, err := load(t.Context(), files)
	if err != nil {
		t.Fatalf("%v in\n%s", err, showTexts(files))
	}
	return d
}

func load(ctx context.Context, files texts) (*schema.Dataset, error) {
	m := fstest.MapFS{}
	for name, content := range files {
		if content == gone {
			continue
		}
		frame := strings.Contains(name, "/") || name == "dataset.toml" || name == "trains.toml" || name == "accepted.toml" || name == "signoff.toml" || name == "allowed_signers"
		if !frame {
			name = "routes/r1/" + name
		}
		m[name] = &fstest.MapFile{Data: []byte(content)}
	}
	return schema.Load(ctx, m)
}

// compare compares ground with base over it, and that with target over it.
func compare(t testing.TB, base, target texts, o diff.Options) *diff.Account {
	t.Helper()
	before := over(ground, base)
	a, err := diff.Compare(t.Context(), read(t, before), read(t, over(before, target)), o)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// causeText writes a difference: its file, the lines of the base with - and of
// the target with +.
func causeText(r *diff.Route, c diff.Cause) string {
	f := &r.Files[c.File]
	d := &f.Rows[c.Row]
	text := path.Base(f.Path())
	for _, i := range d.Old {
		text += fmt.Sprintf(" -%d", f.Tables[d.Table].Old.Rows[i].Line)
	}
	for _, i := range d.New {
		text += fmt.Sprintf(" +%d", f.Tables[d.Table].New.Rows[i].Line)
	}
	return text
}

// changeText writes a change with its causes.
func changeText(a *diff.Account, r *diff.Route, c *diff.Change) string {
	text := fmt.Sprintf("%s %s-%s %s %d>%d", c.Direction, r.Target.Track.Begins(c.From), r.Target.Track.Ends(c.To), a.Trains[c.Train].ID, c.Before, c.After)
	if c.RunOut {
		text += " run-out"
	}
	var causes []string
	for _, cause := range r.Causes[c.Causes] {
		causes = append(causes, causeText(r, cause))
	}
	return text + " by " + strings.Join(causes, ", ")
}

// changesOf writes the changes and the masked changes of all routes.
func changesOf(a *diff.Account) string {
	var lines []string
	for i := range a.Routes {
		r := &a.Routes[i]
		for k := range r.Track {
			x := &r.Track[k]
			side := r.Target
			if x.Fate == diff.Removed {
				side = r.Base
			}
			lines = append(lines, fmt.Sprintf("%s %s %s-%s", x.Fate, x.Direction, side.Track.Begins(x.From), side.Track.Ends(x.To)))
		}
		for k := range r.Changes {
			lines = append(lines, changeText(a, r, &r.Changes[k]))
		}
		for k := range r.Masked {
			lines = append(lines, "masked "+changeText(a, r, &r.Masked[k]))
		}
	}
	return strings.Join(lines, "\n")
}

type accountTest struct {
	name         string
	base, target texts
	want         []string
}

func runAccounts(t *testing.T, tests []accountTest, show func(*diff.Account) string) {
	t.Helper()
	for _, x := range tests {
		t.Run(x.name, func(t *testing.T) {
			if got, want := show(compare(t, x.base, x.target, diff.Options{})), strings.Join(x.want, "\n"); got != want {
				t.Errorf("got\n%s\nwant\n%s", got, want)
			}
		})
	}
}

// A difference causes a change if its old row governs before, or its new row
// governs after, train length delay included.
func TestCauses(t *testing.T) {
	two := trainText("T", 150, "", "C2", 200, 200) + trainText("U", 80, "", "D4", 700, 90)
	runAccounts(t, []accountTest{
		{"nothing differs", nil, nil, nil},
		{"a raise, with run-out in both directions", nil, texts{"speed.csv": "from_km,to_km,basic\n0,4,100\n4,6,90\n6,10,100\n"}, []string{
			"nominal 4.000-6.000 T 80>90 by speed.csv -3 +3",
			"nominal 6.000-6.200 T 80>90 run-out by speed.csv -3 +3",
			"reverse 3.800-4.000 T 80>90 run-out by speed.csv -3 +3",
			"reverse 4.000-6.000 T 80>90 by speed.csv -3 +3",
		}},
		{"each train within its own maximum speed", texts{"trains.toml": two, "route.toml": oneWay}, texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,\n4,6,100,no\n6,10,100,\n"}, []string{
			"nominal 4.000-6.000 T 80>100 by speed.csv -3 +3",
			"nominal 4.000-6.000 U 80>90 by speed.csv -3 +3",
			"nominal 6.000-6.200 T 80>100 run-out by speed.csv -3 +3",
			"nominal 6.000-6.700 U 80>90 run-out by speed.csv -3 +3",
		}},
		{"the old row governs before, another new row after", texts{"route.toml": oneWay}, texts{
			"speed.csv":     "from_km,to_km,basic\n0,4,100\n4,6,120\n6,10,100\n",
			"temporary.csv": "id,from_km,to_km,speed,train_length_delay\nA,5,6,90,no\n"}, []string{
			"nominal 4.000-4.200 T 80>100 by speed.csv -3 +3",
			"nominal 4.200-5.000 T 80>120 by speed.csv -3 +3",
			"nominal 5.000-6.000 T 80>90 by speed.csv -3 +3, temporary.csv +2",
			"nominal 6.000-6.200 T 80>100 run-out by speed.csv -3 +3",
			"masked nominal 5.000-6.000 T 80>120 by speed.csv -3 +3",
		}},
		{"a row that would be as low does not count where it does not govern", texts{"route.toml": oneWay}, texts{
			"axle-load.csv": "from_km,to_km,C2,D4,train_length_delay\n4,5,60,,no\n4,5,,50,no\n4,6,85,,no\n"}, []string{
			"nominal 4.000-5.000 T 80>60 by axle-load.csv +2",
		}},
		{"both rows that attain the speed", texts{"route.toml": oneWay}, texts{
			"axle-load.csv": "from_km,to_km,C2,train_length_delay\n4,5,60,no\n4,5,60,no\n", "temporary.csv": "id,from_km,to_km,speed,train_length_delay\nA,4,5,60,no\n"}, []string{
			"nominal 4.000-5.000 T 80>60 by axle-load.csv +2, axle-load.csv +3, temporary.csv +2",
		}},
		{"what is the same for this train is not its cause", texts{"route.toml": oneWay, "trains.toml": trainText("U", 80, "", "D4", 200, 200),
			"temporary.csv": "id,from_km,to_km,speed,train_length_delay\nA,4,5,60,no\n"},
			texts{"speed.csv": "from_km,to_km,basic,cd150\n0,4,100,\n4,6,80,90\n6,10,100,\n", "temporary.csv": gone}, []string{
				"nominal 4.000-5.000 U 60>80 by temporary.csv -2",
			}},
		{"a boundary that moves", texts{"route.toml": oneWay}, texts{"speed.csv": "from_km,to_km,basic\n0,4.5,100\n4.5,6,80\n6,10,100\n"}, []string{
			"nominal 4.000-4.500 T 80>100 by speed.csv -2 +2, speed.csv -3 +3",
		}},
		{"only the train length delay", texts{"route.toml": oneWay}, texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,\n4,6,80,no\n6,10,100,\n"}, []string{
			"nominal 6.000-6.200 T 80>100 run-out by speed.csv -3 +3",
		}},
		{"a file that goes, a file that comes", texts{"route.toml": oneWay, "axle-load.csv": "from_km,to_km,C2,train_length_delay\n1,2,60,no\n"},
			texts{"axle-load.csv": gone, "temporary.csv": "id,from_km,to_km,speed,train_length_delay\nA,1,2,70,no\n"}, []string{
				"nominal 1.000-2.000 T 60>70 by axle-load.csv -2, temporary.csv +2",
				"masked nominal 1.000-2.000 T 60>100 by axle-load.csv -2",
			}},
	}, changesOf)
}

// Jumps and ends of a route are causes of their own: a train is carried on by
// running distance, not by the posts.
func TestCausesOfTheTrack(t *testing.T) {
	runAccounts(t, []accountTest{
		{"a jump where a train runs out", texts{"route.toml": oneWay}, texts{"route.toml": oneWay + "[[jump]]\narriving_km = 6.1\nleaving_km = 6.3\n"}, []string{
			"removed nominal 6.100-6.300",
			"nominal 6.300-6.400 T 100>80 run-out by route.toml +7",
		}},
		{"posts are repeated there", texts{"route.toml": oneWay + "[[jump]]\narriving_km = 6.1\nleaving_km = 6.3\n"}, texts{"route.toml": oneWay}, []string{
			"added nominal 6.100-6.300",
			"nominal 6.300-6.400 T 80>100 run-out by route.toml -7",
		}},
		{"a jump elsewhere", texts{"route.toml": oneWay}, texts{"route.toml": oneWay + "[[jump]]\narriving_km = 8\nleaving_km = 8.1\n"}, []string{
			"removed nominal 8.000-8.100",
		}},
		{"a direction", texts{"route.toml": oneWay}, texts{"route.toml": ground["route.toml"]}, []string{"added reverse 0.000-10.000"}},
		{"the end", texts{"route.toml": oneWay}, texts{"route.toml": strings.Replace(oneWay, "10", "11", 1), "speed.csv": strings.Replace(ground["speed.csv"], "6,10,", "6,11,", 1)}, []string{"added nominal 10.000-11.000"}},
	}, changesOf)
}

// A jump is a cause beside the rows, too: here the row is raised, and what is
// lowered behind the jump comes of the jump.
func TestCausesOfJumpAndRow(t *testing.T) {
	runAccounts(t, []accountTest{
		{"a jump and a row", texts{"route.toml": oneWay}, texts{"route.toml": oneWay + "[[jump]]\narriving_km = 6.1\nleaving_km = 6.3\n",
			"speed.csv": "from_km,to_km,basic\n0,4,100\n4,6,90\n6,10,100\n"}, []string{
			"removed nominal 6.100-6.300",
			"nominal 4.000-6.000 T 80>90 by speed.csv -3 +3",
			"nominal 6.000-6.100 T 80>90 run-out by speed.csv -3 +3",
			"nominal 6.300-6.400 T 100>90 run-out by route.toml +7, speed.csv -3 +3",
		}},
	}, changesOf)
}

// Every difference of the files stands in the account, once, in the order of
// the files.
func TestFilesOfTheAccount(t *testing.T) {
	second := texts{"routes/r2/route.toml": strings.ReplaceAll(ground["route.toml"], "R1", "R2"), "routes/r2/speed.csv": "from_km,to_km,basic\n0,10,100\n"}
	for _, x := range []struct {
		name         string
		base, target texts
		frame        string
		routes       string
	}{
		{"nothing", nil, nil, "", ""},
		{"a new file and one that goes", texts{"curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,900,10\n"}, texts{"curves.csv": gone, "temporary.csv": "id,from_km,to_km,speed\nA,1,2,40\n"},
			"", "routes/r1/curves.csv: file gone, 1 rows; routes/r1/temporary.csv: new file, 1 rows"},
		{"comments and order", nil, texts{"speed.csv": "# checked\nto_km,from_km,basic\n\n10,6,100\n6,4,80\n4,0,100\n"}, "", "routes/r1/speed.csv: only form, 0 rows"},
		{"line ends", nil, texts{"speed.csv": "\xEF\xBB\xBF" + strings.ReplaceAll(ground["speed.csv"], "\n", "\r\n")}, "", "routes/r1/speed.csv: only bytes, 0 rows"},
		{"the frame", nil, texts{"dataset.toml": "format = 1\nname = \"Other\"\n", "requests/a.toml": requestText("CR-1", "R1", 1, 2, "any", "")}, "dataset.toml: 1 rows; requests/a.toml: new file, 2 rows", ""},
		{"a folder renamed", second, texts{"routes/r2/route.toml": gone, "routes/r2/speed.csv": gone, "routes/x/route.toml": second["routes/r2/route.toml"], "routes/x/speed.csv": "from_km,to_km,basic\n0,10,90\n"},
			"", "routes/x/route.toml: only moved, 0 rows; routes/x/speed.csv: 1 rows"},
		{"a route removed", second, texts{"routes/r2/route.toml": gone, "routes/r2/speed.csv": gone}, "", "routes/r2/route.toml: file gone, 1 rows; routes/r2/speed.csv: file gone, 1 rows"},
	} {
		t.Run(x.name, func(t *testing.T) {
			a := compare(t, x.base, x.target, diff.Options{})
			var routes []string
			for _, r := range a.Routes {
				routes = append(routes, filesText(r.Files)...)
			}
			if got := strings.Join(filesText(a.Frame), "; "); got != x.frame {
				t.Errorf("frame: got %s, want %s", got, x.frame)
			}
			if got := strings.Join(routes, "; "); got != x.routes {
				t.Errorf("routes: got %s, want %s", got, x.routes)
			}
		})
	}
}

func filesText(files []diff.File) []string {
	notes := []string{"", "new file, ", "file gone, ", "only moved, ", "only bytes, ", "only form, "}
	var list []string
	for _, f := range files {
		list = append(list, fmt.Sprintf("%s: %s%d rows", f.Path(), notes[f.Note], len(f.Rows)))
	}
	if !slices.IsSorted(list) {
		list = append(list, "not in order")
	}
	return list
}

// requestText writes a change request of one declaration; trains is empty or
// holds names with quotes.
func requestText(id, route string, from, to float64, effect, trains string) string {
	return fmt.Sprintf("id = %q\ntitle = \"A change\"\nreason = \"Because\"\n", id) + declares(route, "both", from, to, effect, trains)
}

func declares(route, direction string, from, to float64, effect, trains string) string {
	text := fmt.Sprintf("[[declares]]\nroute = %q\ndirection = %q\nfrom_km = %v\nto_km = %v\neffect = %q\n", route, direction, from, to, effect)
	if trains != "" {
		text += "trains = [" + trains + "]\n"
	}
	return text
}
