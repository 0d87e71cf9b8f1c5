package assessment_test

import (
	"flag"
	"fmt"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/history/assessment"
)

// unrepresented gives the findings of trains that no reference train stands for.
func unrepresented(c *assessment.Computed) []assessment.Finding {
	return slices.DeleteFunc(slices.Clone(c.Findings), func(f assessment.Finding) bool { return f.ID != assessment.NotRepresented })
}

// oneWay is a route for travel with the running distance only.
var oneWay = texts{"route.toml": ground["route.toml"] + "directions = [\"nominal\"]\n"}

// The example of a finding is a train for trains.toml: with it in both
// revisions, the finding is gone, and what the train sees comes of the row that the
// finding named.
func TestExampleTrain(t *testing.T) {
	const head = "from_km,to_km,basic,cd150,freight_p,passenger,train_length_delay\n"
	for _, x := range []struct {
		name         string
		base, target texts
		text         string // of the only finding
		row          string
		example      string // without its id and name
	}{
		{"a cant deficiency category", texts{"speed.csv": head + "0,20,100,120,,,no\n"}, texts{"speed.csv": head + "0,20,100,140,,,no\n"},
			"cant deficiency 150 mm and above, any category, any axle load: raised by up to 20 km/h, 120 to 140", "speed.csv:2", "cant_deficiency_mm = 150\naxle_load = \"A\"\nlength_m = 200\nmax_speed_kmh = 140\n"},
		{"another category", texts{"speed.csv": head + "0,20,100,,80,,no\n"}, texts{"speed.csv": head + "0,20,100,,60,,no\n"},
			"any cant deficiency, freight braked in P, any axle load: lowered by up to 20 km/h, 80 to 60", "speed.csv:2", "cant_deficiency_mm = 80\ncategories = [\"freight_p\"]\naxle_load = \"A\"\nlength_m = 200\nmax_speed_kmh = 80\n"},
		{"an axle load category", texts{"axle-load.csv": "from_km,to_km,E5,train_length_delay\n4,5,60,no\n"}, texts{"axle-load.csv": "from_km,to_km,E5,train_length_delay\n4,5,40,no\n"},
			"any cant deficiency, any category, axle load E5: lowered by up to 20 km/h, 60 to 40", "axle-load.csv:2", "cant_deficiency_mm = 80\naxle_load = \"E5\"\nlength_m = 200\nmax_speed_kmh = 60\n"},
		{"hidden today", texts{"axle-load.csv": "from_km,to_km,E5,train_length_delay\n4,5,60,no\n", "temporary.csv": "id,from_km,to_km,speed\nA,3,6,30\n"}, texts{"axle-load.csv": "from_km,to_km,E5,train_length_delay\n4,5,40,no\n"},
			"any cant deficiency, any category, axle load E5: lowered by up to 20 km/h, 60 to 40, without temporary restrictions", "axle-load.csv:2", "cant_deficiency_mm = 80\naxle_load = \"E5\"\nlength_m = 200\nmax_speed_kmh = 60\n"},
	} {
		t.Run(x.name, func(t *testing.T) {
			c := compute(t, over(x.base, oneWay), x.target, nil)
			found := unrepresented(c)
			if len(found) != 1 {
				t.Fatalf("%d findings: %v", len(found), found)
			}
			if found[0].Text != x.text {
				t.Errorf("got %s, want %s", found[0].Text, x.text)
			}
			if want := "routes/r1/" + x.row; found[0].Row != want {
				t.Errorf("row %q, want %q", found[0].Row, want)
			}
			lines := strings.SplitAfterN(found[0].Example, "\n", 4)
			if lines[0] != "[[train]]\n" || !strings.HasPrefix(lines[1], "id = \"") || !strings.HasPrefix(lines[2], "name = \"") {
				t.Errorf("the example begins with %q", lines[:3])
			}
			if lines[3] != x.example {
				t.Errorf("got\n%swant\n%s", lines[3], x.example)
			}
			with := over(over(x.base, oneWay), texts{"trains.toml": ground["trains.toml"] + found[0].Example})
			c = compute(t, with, x.target, nil)
			if left := unrepresented(c); len(left) > 0 {
				t.Errorf("with the example in trains.toml, %v is left", left)
			}
			if !slices.ContainsFunc(c.Findings, func(f assessment.Finding) bool {
				return (f.ID == assessment.Outside || f.ID == assessment.Masked) && f.Row == found[0].Row
			}) {
				t.Errorf("none of %v names %s", c.Findings, found[0].Row)
			}
		})
	}
}

// The id of an example is not that of a reference train, and not that of another
// example, so that all of them can be taken over.
func TestExampleTrainID(t *testing.T) {
	base := texts{"axle-load.csv": "from_km,to_km,E5\n4,5,60\n", "trains.toml": trainText("X-80-E5-200m-60", 80, "", "C2", 200, 200) + trainText("X-80-E5-200m-60-2", 80, "", "C2", 200, 200)}
	list := unrepresented(compute(t, base, texts{"axle-load.csv": "from_km,to_km,E5\n4,5,40\n"}, nil))
	if len(list) == 0 {
		t.Fatal("no finding")
	}
	for _, f := range list {
		if !strings.Contains(f.Example, "id = \"X-80-E5-200m-60-3\"\n") {
			t.Errorf("got\n%s", f.Example)
		}
	}

	const head = "from_km,to_km,basic,cd150,cd300,freight_p,train_length_delay\n"
	target := texts{"speed.csv": head + "0,20,100,140,160,70,no\n"}
	list = unrepresented(compute(t, texts{"speed.csv": head + "0,20,100,120,130,80,no\n"}, target, nil))
	trains := ground["trains.toml"]
	for _, f := range list {
		trains += f.Example
	}
	if len(list) < 3 {
		t.Fatalf("%d findings", len(list))
	}
	if left := unrepresented(compute(t, texts{"speed.csv": head + "0,20,100,120,130,80,no\n", "trains.toml": trains}, target, nil)); len(left) > 0 {
		t.Errorf("with all examples in trains.toml, %v is left", left)
	}
}

// drawFiles draws two revisions of a route of 20 km.
func drawFiles(t *rapid.T) (base, target texts) {
	speed := func(name string) int { return 20 * rapid.IntRange(1, 6).Draw(t, name) }
	maybe := func(name string) string {
		if rapid.IntRange(0, 3).Draw(t, name+" given") > 0 {
			return ""
		}
		return fmt.Sprint(speed(name))
	}
	delay := func() string { return rapid.SampledFrom([]string{"yes", "no"}).Draw(t, "delay") }
	cells := func() string {
		return fmt.Sprintf("%d,%s,%s,%s,%s,%s", speed("basic"), maybe("cd100"), maybe("cd150"), maybe("freight_p"), maybe("passenger"), delay())
	}
	table := func(speeds, axles, temporaries []string) texts {
		return texts{
			"speed.csv":     "from_km,to_km,basic,cd100,cd150,freight_p,passenger,train_length_delay\n" + strings.Join(speeds, ""),
			"axle-load.csv": "from_km,to_km,C2,D4,train_length_delay\n" + strings.Join(axles, ""), "temporary.csv": "id,from_km,to_km,speed,train_length_delay\n" + strings.Join(temporaries, ""),
		}
	}
	var speeds, axles, temporaries [2][]string
	both := func(list *[2][]string, draw func() string) {
		row := draw()
		list[0] = append(list[0], row)
		if rapid.IntRange(0, 3).Draw(t, "altered") == 0 {
			row = draw()
		}
		list[1] = append(list[1], row)
	}
	limits := []string{"0", "4", "4.3", "5", "12", "12.1", "20"}
	for i := range len(limits) - 1 {
		both(&speeds, func() string { return fmt.Sprintf("%s,%s,%s\n", limits[i], limits[i+1], cells()) })
	}
	for i := range rapid.IntRange(0, 2).Draw(t, "axle load rows") {
		both(&axles, func() string {
			return fmt.Sprintf("%d,%d.2,%d,%s,%s\n", 3+8*i, 4+8*i, speed("C2"), maybe("D4"), delay())
		})
	}
	for i := range rapid.IntRange(0, 1).Draw(t, "temporary restrictions") {
		both(&temporaries, func() string { return fmt.Sprintf("T%d,4,6,%d,%s\n", i, speed("temporary"), delay()) })
	}
	trains := trainText("S", 80, rapid.SampledFrom([]string{"", `"freight_p"`, `"passenger"`}).Draw(t, "categories"), "C2", rapid.IntRange(30, 400).Draw(t, "length"), 200)
	if rapid.Bool().Draw(t, "a long train") {
		trains += trainText("L", 100, "", "D4", rapid.IntRange(400, 900).Draw(t, "length"), 120)
	}
	base = over(ground, table(speeds[0], axles[0], temporaries[0]))
	target = over(ground, table(speeds[1], axles[1], temporaries[1]))
	base["trains.toml"], target["trains.toml"] = trains, trains
	return base, target
}

// With its example among the reference trains, a finding is smaller or gone; in
// the end there is none.
func TestExampleTrains(t *testing.T) {
	for name, value := range map[string]string{"rapid.seed": "1", "rapid.checks": "60", "rapid.nofailfile": "true"} {
		f := flag.Lookup(name)
		if old := f.Value.String(); old == f.DefValue {
			if err := f.Value.Set(value); err != nil {
				t.Fatal(err)
			}
			defer f.Value.Set(old)
		}
	}
	checked := 0
	rapid.Check(t, func(t *rapid.T) {
		base, target := drawFiles(t)
		var last assessment.Finding
		for round := 0; ; round++ {
			c, err := assessed(base, target, nil)
			if err != nil {
				t.Fatal(err)
			}
			left := unrepresented(c)
			if len(left) == 0 {
				return
			}
			checked++
			// Only rows differ here, so that each finding with an example has one.
			if i := slices.IndexFunc(left, func(f assessment.Finding) bool { return f.Example != "" && f.Row == "" }); i >= 0 {
				t.Fatalf("no row behind %+v", left[i])
			}
			again := slices.ContainsFunc(left, func(f assessment.Finding) bool {
				f.Example = last.Example
				return f == last
			})
			if again || round > 40 {
				t.Fatalf("with the examples of %d rounds, %d findings are left; of the last\n%+v\n%s\n%s\n%s", round, len(left), last, base["trains.toml"], base["speed.csv"], target["speed.csv"])
			}
			last = left[0]
			for _, side := range []texts{base, target} {
				side["trains.toml"] += left[0].Example
			}
		}
	})
	if !testing.Short() && checked < 60 {
		t.Errorf("only %d findings", checked)
	}
}
