package doubt_test

import (
	"fmt"
	"path"
	"slices"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"speedtrail/diff/doubt"
	"speedtrail/schema"
)

// files are the files of a data set by name; those of the only route stand
// without its folder.
type files map[string]string

const header = "from_km,to_km,direction,basic,cd80,cd100,cd130,cd150,freight_p,freight_p_rule,passenger,train_length_delay\n"

// plain is a route without anything doubtful: 10 km at 100 km/h, one train.
var plain = files{
	"dataset.toml": "format = 1\nname = \"Test\"\n",
	"trains.toml":  train("T", 150, "", "C2", 200, 200),
	"route.toml":   "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 10\n",
	"speed.csv":    "from_km,to_km,basic\n0,10,100\n",
}

func train(id string, cant int, categories, axle string, length, top int) string {
	return fmt.Sprintf("[[train]]\nid = %q\nname = \"A train\"\ncant_deficiency_mm = %d\ncategories = [%s]\naxle_load = %q\nlength_m = %d\nmax_speed_kmh = %d\n",
		id, cant, categories, axle, length, top)
}

func limits(text string) string { return plain["dataset.toml"] + "[limits]\n" + text + "\n" }

// then is the time that validities are compared with.
var then = time.Date(2026, 3, 2, 0, 0, 0, 0, time.UTC)

// look gives the doubts about plain with other files, one a line.
func look(t *testing.T, other files, at time.Time) string {
	t.Helper()
	m := fstest.MapFS{}
	for _, list := range []files{plain, other} {
		for name, content := range list {
			if name != "dataset.toml" && name != "trains.toml" {
				name = "routes/r1/" + name
			}
			m[name] = &fstest.MapFile{Data: []byte(content)}
		}
	}
	d, err := schema.Load(t.Context(), m)
	if err != nil {
		t.Fatal(err)
	}
	route := d.Routes[0]
	var b strings.Builder
	for _, x := range doubt.Check(route, d, at) {
		fmt.Fprintf(&b, "%s %s %s %s %s:%d %s\n", x.ID, x.Directions, route.Track.Begins(x.From), route.Track.Ends(x.To), path.Base(x.Row.File), x.Row.Line, x.Text)
	}
	return b.String()
}

// example is a data set and all that is doubtful about it.
type example struct {
	name string
	// at is the time; zero: then.
	at    time.Time
	files files
	want  string
}

// examples of each id. Those that want nothing are sound and lie close to
// others that are not.
var examples = map[string][]example{
	doubt.CurveSpeed:        curveSpeed,
	doubt.CantExcess:        cantExcess,
	doubt.CategoryOrder:     categoryOrder,
	doubt.AxleLoadOrder:     axleLoadOrder,
	doubt.AxleLoadMissing:   axleLoadMissing,
	doubt.ShortStretch:      shortStretch,
	doubt.StepSize:          stepSize,
	doubt.TemporaryExpired:  temporaryExpired,
	doubt.TemporaryNoEffect: temporaryNoEffect,
	doubt.DelayOverBridge:   delayOverBridge,
	doubt.DelayOneSided:     delayOneSided,
	doubt.CrossingWarning:   crossingWarning,
}

func TestExamples(t *testing.T) {
	if got := look(t, nil, then); got != "" {
		t.Fatalf("the plain route is doubtful:\n%s", got)
	}
	for _, id := range doubt.IDs {
		fires, sound := 0, 0
		for _, x := range examples[id] {
			t.Run(id+"/"+x.name, func(t *testing.T) {
				at := x.at
				if at.IsZero() {
					at = then
				}
				if got := look(t, x.files, at); got != x.want {
					t.Errorf("got\n%swant\n%s", got, x.want)
				}
			})
			switch {
			case strings.HasPrefix(x.want, id+" "):
				fires++
			case x.want == "":
				sound++
			}
		}
		if fires == 0 || sound == 0 {
			t.Errorf("%s: %d examples that fire, %d that are sound; both are needed", id, fires, sound)
		}
	}
	if len(examples) != len(doubt.IDs) {
		t.Errorf("examples of %d ids, there are %d", len(examples), len(doubt.IDs))
	}
}

// The order is that of the track, then that of the ids; nothing stands twice,
// and the same data gives the same list each time.
func TestOrder(t *testing.T) {
	x := files{
		"dataset.toml": limits("largest_step_kmh = 10\nshortest_stretch_m = 500"),
		"trains.toml":  train("T", 150, "", "C2", 200, 200) + train("U", 80, "", "C2", 200, 200),
		"speed.csv":    "from_km,to_km,basic\n0,4,100\n4,4.2,60\n4.2,4.4,90\n4.4,10,60\n",
		"temporary.csv": "id,from_km,to_km,speed,valid_to\n" +
			"A,4,4.2,60,2026-01-01\nB,0,1,100,\nC,0,1,100,2026-01-01\n",
	}
	want := []string{
		"temporary-expired 0.000 1.000", "temporary-without-effect 0.000 1.000", "temporary-without-effect 0.000 1.000",
		"step-size 4.000 4.000", "short-stretch 4.000 4.200", "temporary-expired 4.000 4.200", "temporary-without-effect 4.000 4.200",
		"step-size 4.200 4.200", "short-stretch 4.200 4.400", "step-size 4.400 4.400",
	}
	first := look(t, x, then)
	var got []string
	for _, line := range strings.Split(strings.TrimSpace(first), "\n") {
		f := strings.Fields(line)
		got = append(got, f[0]+" "+f[2]+" "+f[3])
	}
	if !slices.Equal(got, want) {
		t.Errorf("got %q, want %q", got, want)
	}
	for range 20 {
		if again := look(t, x, then); again != first {
			t.Fatalf("the same data gives\n%sand\n%s", first, again)
		}
	}
}
