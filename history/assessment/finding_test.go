package assessment_test

import (
	"context"
	"crypto/ed25519"
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/diff"
	"speedtrail/diff/doubt"
	"speedtrail/history/assessment"
	"speedtrail/schema"
)

// texts are the files of a data set by name; those of the route R1 stand
// without its folder.
type texts map[string]string

// ground is what the revisions of these tests are made of.
var ground = texts{
	"dataset.toml": "format = 1\nname = \"Test\"\n",
	"trains.toml":  trainText("T", 80, "", "C2", 200, 200),
	"route.toml":   "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 20\n",
	"speed.csv":    "from_km,to_km,basic\n0,20,100\n",
}

// gone stands for a file that is taken away.
const gone = "gone"

func trainText(id string, cant int, categories, axle string, length, top int) string {
	return fmt.Sprintf("[[train]]\nid = %q\nname = \"A train\"\ncant_deficiency_mm = %d\ncategories = [%s]\naxle_load = %q\nlength_m = %d\nmax_speed_kmh = %d\n",
		id, cant, categories, axle, length, top)
}

func over(base, more texts) texts {
	out := texts{}
	maps.Copy(out, base)
	maps.Copy(out, more)
	return out
}

func load(files texts) (*schema.Dataset, error) {
	m := fstest.MapFS{}
	for name, content := range files {
		switch {
		case content == gone:
			continue
		case name == "route.toml" || strings.HasSuffix(name, ".csv") && !strings.Contains(name, "/"):
			name = "routes/r1/" + name
		}
		m[name] = &fstest.MapFile{Data: []byte(content)}
	}
	return schema.Load(context.Background(), m)
}

// at is the time that the revisions are looked at.
var at = time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)

// assessed compares two data sets and gives the document.
func assessed(base, target texts, change func(*assessment.Input)) (*assessment.Computed, error) {
	b, err := load(base)
	if err != nil {
		return nil, err
	}
	t, err := load(target)
	if err != nil {
		return nil, err
	}
	a, err := diff.Compare(context.Background(), b, t, diff.Options{})
	if err != nil {
		return nil, err
	}
	in := assessment.Input{Base: b, Target: t, Account: a, Folder: ".", At: at, BaseIsAncestor: true}
	if change != nil {
		change(&in)
	}
	return &assessment.Build(in).Computed, nil
}

// compute compares ground with base over it and that with target over it.
func compute(t *testing.T, base, target texts, change func(*assessment.Input)) *assessment.Computed {
	t.Helper()
	before := over(ground, base)
	c, err := assessed(before, over(before, target), change)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func place(f assessment.Finding) string {
	return strings.TrimSpace(fmt.Sprintf("%s %s %s-%s", f.ID, f.Direction, f.From, f.To))
}

// policy is a policy of two people with a key each, with as many people needed.
func policy(needed int) texts {
	signers := ""
	for _, name := range []string{"a", "b"} {
		seed := make([]byte, ed25519.SeedSize)
		copy(seed, name)
		key, err := ssh.NewPublicKey(ed25519.NewKeyFromSeed(seed).Public())
		if err != nil {
			panic(err)
		}
		signers += name + " " + string(ssh.MarshalAuthorizedKey(key))
	}
	return texts{
		"signoff.toml":    fmt.Sprintf("format = 1\n[[person]]\nprincipal = \"a\"\n[[person]]\nprincipal = \"b\"\n[[role]]\nname = \"check\"\nneeded = %d\nindependent_of = [\"preparer\"]\n", needed),
		"allowed_signers": signers,
	}
}

// A reviewer's order: what is wrong with the comparison as a whole, what moves a
// speed unannounced, what nobody sees, what is announced and did not happen, the
// doubtful data; what is accepted stands last.
func TestOrderOfFindings(t *testing.T) {
	const doubtful = "from_km,to_km,basic,cd80,cd100,cd150,train_length_delay\n"
	entry := func(from, to float64) string {
		return fmt.Sprintf("[[accepted]]\nfinding = \"step-size\"\nroute = \"R1\"\nfrom_km = %v\nto_km = %v\nreason = \"Known\"\n", from, to)
	}
	base := over(policy(1), texts{
		"dataset.toml": ground["dataset.toml"] + "[limits]\nlargest_step_kmh = 60\n",
		// km 1 is accepted.
		"accepted.toml": entry(0.9, 1.1),
		"speed.csv":     doubtful + "0,1,20,,,,no\n1,3,100,,,,no\n3,5,100,,,,no\n5,6,100,,,,no\n6,12,100,,120,110,no\n12,13,100,,,,no\n13,14,100,,,,no\n14,18,100,,,,no\n18,19.9,100,,,,no\n19.9,20,100,,,,no\n",
		"temporary.csv": "id,from_km,to_km,speed,valid_to,train_length_delay\nOLD,12,13,40,2026-01-31,no\n",
	})
	target := over(policy(2), texts{
		"accepted.toml": entry(0.9, 1.1) + entry(2, 4),
		"trains.toml":   trainText("T", 80, "", "C2", 210, 200),
		// Raised at 3 by 10, at 14 by 30, lowered at 5 by 30 and at the end by 70,
		// hidden at 12. What is not C2 is faster from 15 to 17 than any reference
		// train shows.
		"speed.csv":       doubtful + "0,1,20,,,,no\n1,3,100,,,,no\n3,5,110,,,,no\n5,6,70,,,,no\n6,12,100,,120,110,no\n12,13,90,,,,no\n13,14,100,,,,no\n14,18,130,,,,no\n18,19.9,100,,,,no\n19.9,20,30,,,,yes\n",
		"axle-load.csv":   "from_km,to_km,C2,E5,train_length_delay\n15,17,105,,no\n",
		"requests/1.toml": "id = \"CR-1\"\ntitle = \"A\"\nreason = \"B\"\n[[declares]]\nroute = \"R1\"\nfrom_km = 8\nto_km = 9\neffect = \"any\"\n",
	})
	c := compute(t, base, target, func(in *assessment.Input) { in.BaseIsAncestor = false })
	var got []string
	for _, f := range c.Findings {
		text := place(f)
		if f.ID == assessment.Outside || f.ID == assessment.Masked {
			text += " " + strings.Fields(f.Text)[0] + " " + strings.Fields(f.Text)[4]
		}
		if f.Accepted != "" {
			text += " accepted"
		}
		if f.Text == "" || !slices.ContainsFunc(c.Explained, func(e assessment.Explanation) bool { return e.ID == f.ID && e.Why != "" && e.Do != "" }) {
			t.Errorf("%s says too little: %+v", text, f)
		}
		got = append(got, text)
	}
	want := []string{
		"base-not-ancestor  -", "policy-changed  -", "accepted-changed  2.000-4.000",
		"outside both 14.000-18.000 raised 30", "outside both 3.000-5.000 raised 10",
		"outside nominal 19.900-20.000 lowered 70", "outside reverse 19.690-20.000 lowered 70", "outside both 5.000-6.000 lowered 30", "outside both 12.000-13.000 lowered 10",
		"masked both 12.000-13.000 lowered 10",
		"not-represented both 14.000-18.000", "trains-changed  -", "unseen both 8.000-9.000",
		"run-out-leaves-route nominal 19.900-20.000",
		"category-order both 6.000-12.000",
		"step-size both 19.900-19.900", "temporary-expired both 12.000-13.000", "step-size both 1.000-1.000 accepted",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

// Every id of a finding is in the order of the findings: where several kinds
// meet, the ones that cannot be accepted come first, then those of the data as
// they are listed.
func TestDoubtsInTheirOrder(t *testing.T) {
	c := compute(t, nil, texts{
		"dataset.toml":  ground["dataset.toml"] + "[limits]\ncant_excess_mm = 20\nlargest_step_kmh = 20\nshortest_stretch_m = 500\n",
		"trains.toml":   trainText("T", 80, "", "E5", 200, 200),
		"speed.csv":     "from_km,to_km,direction,basic,cd100,cd150,train_length_delay\n0,2,,60,,,\n2,2.1,nominal,30,160,140,no\n2,2.1,reverse,30,,,yes\n2.1,20,,60,,,\n",
		"axle-load.csv": "from_km,to_km,C2,D4\n15,17,50,55\n",
		"temporary.csv": "id,from_km,to_km,speed,valid_to\nOLD,12,13,200,2026-01-31\n",
		"curves.csv":    "from_km,to_km,radius_m,cant_mm\n2,2.1,400,100\n",
		"places.csv":    "km,to_km,kind,name,strike_in_m,warning_s\n2,2.05,bridge,Mill Bridge,,\n10,10.01,crossing,Mill Lane,300,27\n",
	}, nil)
	var got []string
	for _, f := range c.Findings {
		if slices.Contains(doubt.IDs, f.ID) && (len(got) == 0 || got[len(got)-1] != f.ID) {
			got = append(got, f.ID)
		}
	}
	if !slices.Equal(got, doubt.IDs) {
		t.Errorf("got %q, want %q", got, doubt.IDs)
	}
}

// What is said of both directions of travel in the same words is one finding.
func TestJoinedDirections(t *testing.T) {
	const head = "from_km,to_km,direction,basic,train_length_delay\n"
	flat := texts{"speed.csv": head + "0,4,,100,no\n4,6,,80,no\n6,20,,100,no\n"}
	for _, x := range []struct {
		name         string
		base, target texts
		want         []string
	}{
		{"both", flat, texts{"speed.csv": head + "0,4,,100,no\n4,6,,90,no\n6,20,,100,no\n"}, []string{"outside both 4.000-6.000 speed.csv:3"}},
		{"one", flat, texts{"speed.csv": head + "0,4,,100,no\n4,6,nominal,90,no\n4,6,reverse,80,no\n6,20,,100,no\n"}, []string{"outside nominal 4.000-6.000 speed.csv:3, speed.csv:4"}},
		{"by rows of their own", flat, texts{"speed.csv": head + "0,4,,100,no\n4,6,nominal,90,no\n4,6,reverse,90,no\n6,20,,100,no\n"},
			[]string{"outside nominal 4.000-6.000 speed.csv:3", "outside reverse 4.000-6.000 speed.csv:3, speed.csv:4"}},
		{"of other size", flat, texts{"speed.csv": head + "0,4,,100,no\n4,6,nominal,90,no\n4,6,reverse,95,no\n6,20,,100,no\n"},
			[]string{"outside reverse 4.000-6.000 speed.csv:3, speed.csv:4", "outside nominal 4.000-6.000 speed.csv:3"}},
		{"of other places, by run-out", flat, texts{"speed.csv": head + "0,4,,100,no\n4,6,,70,yes\n6,20,,100,no\n"},
			[]string{"outside nominal 4.000-6.200 speed.csv:3", "outside reverse 3.800-6.000 speed.csv:3"}},
	} {
		t.Run(x.name, func(t *testing.T) {
			var got []string
			for _, f := range compute(t, x.base, x.target, nil).Findings {
				if slices.Contains(doubt.IDs, f.ID) {
					continue
				}
				got = append(got, place(f)+" "+strings.ReplaceAll(f.Row, "routes/r1/", ""))
			}
			if !slices.Equal(got, x.want) {
				t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(x.want, "\n"))
			}
		})
	}
}

// Run-out that leaves the route is said of each direction.
func TestRunOutLeavesRoute(t *testing.T) {
	c := compute(t, nil, texts{"speed.csv": "from_km,to_km,basic\n0,20,110\n"}, nil)
	var got []string
	for _, f := range c.Findings {
		got = append(got, place(f))
	}
	want := []string{"outside both 0.000-20.000", "run-out-leaves-route both 0.000-20.000"}
	if !slices.Equal(got, want) {
		t.Errorf("got %q, want %q", got, want)
	}
}

// Structures stand before others of the same sense, then the larger step first.
func TestStructuresFirst(t *testing.T) {
	base := texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,20,100,no\n", "axle-load.csv": "from_km,to_km,C2,train_length_delay\n1,2,60,no\n11,12,60,no\n13,14,60,no\n17,18,60,no\n"}
	c := compute(t, base, texts{
		"speed.csv":     "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,6,150,no\n6,8,50,no\n8,20,100,no\n",
		"axle-load.csv": "from_km,to_km,C2,train_length_delay\n1,2,65,no\n11,12,75,no\n13,14,55,no\n17,18,40,no\n",
	}, nil)
	var got []string
	for _, f := range c.Findings {
		if f.ID == assessment.Outside {
			got = append(got, fmt.Sprintf("%s %s", f.From, strings.Join(strings.Fields(f.Text)[:6], " ")))
		}
	}
	want := []string{
		"11.000 raised by up to 15 km/h,", "1.000 raised by up to 5 km/h,", "4.000 raised by up to 50 km/h,",
		"17.000 lowered by up to 20 km/h,", "13.000 lowered by up to 5 km/h,", "6.000 lowered by up to 50 km/h,",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

// A finding names the row that it comes of.
func TestRowOfASplit(t *testing.T) {
	base := texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,20,100,no\n"}
	c := compute(t, base, texts{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,6,80,no\n6,20,100,no\n"}, nil)
	if got, want := c.Findings[0].Row, "routes/r1/speed.csv:3"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}

// Whoever is no person of the policy is a finding, also where a commit names
// nobody: there, too, it is words that a reader sees.
func TestUnknownPreparers(t *testing.T) {
	c := compute(t, policy(1), texts{}, func(in *assessment.Input) {
		in.Preparers = []assessment.Person{{}, {Name: "Only A Name"}, {Email: "only@x"}, {Name: "Both", Email: "both@x"}}
	})
	var got []string
	for _, f := range c.Findings {
		if f.ID == assessment.UnknownPreparer {
			who, _, _ := strings.Cut(f.Text, " is no person of the base's policy")
			got = append(got, who)
		}
	}
	slices.Sort(got)
	if want := []string{"<only@x>", "Both <both@x>", "Only A Name (no address)", "somebody without name and address"}; !slices.Equal(got, want) {
		t.Errorf("%q, want %q", got, want)
	}
}
