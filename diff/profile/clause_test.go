package profile_test

import (
	"fmt"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
)

// clause is a clause of ERTMS/ETCS SUBSET-026, issue 4.0.0 (European Union Agency
// for Railways, public), with a data set that it decides about and the profile
// that follows from it, worked out by hand. Lines of a profile are
//
//	from to speed: file:line kind value; ...
type clause struct {
	number, what string
	speed        string // speed.csv
	axle         string // axle-load.csv
	temporary    string // temporary.csv
	train        string // keys of the train that differ from the plain one
	direction    codes.Direction
	want         string
}

// plain is the train that a case alters: no category, 400 m long.
var plain = map[string]string{"cant_deficiency_mm": "80", "categories": "[]", "axle_load": `"C2"`, "length_m": "400", "max_speed_kmh": "300"}

func (c clause) profile(t *testing.T) string {
	t.Helper()
	train := "[[train]]\nid = \"T\"\nname = \"Train\"\n"
	keys := map[string]string{}
	for k, v := range plain {
		keys[k] = v
	}
	for _, line := range strings.Split(c.train, "\n") {
		if k, v, ok := strings.Cut(line, " = "); ok {
			keys[k] = v
		}
	}
	for _, k := range []string{"cant_deficiency_mm", "categories", "axle_load", "length_m", "max_speed_kmh"} {
		train += k + " = " + keys[k] + "\n"
	}
	files := fstest.MapFS{
		"dataset.toml":        {Data: []byte("format = 1\nname = \"Clauses\"\n")},
		"trains.toml":         {Data: []byte(train)},
		"routes/r/route.toml": {Data: []byte("id = \"R\"\nname = \"Route\"\nstart_km = 0\nend_km = 10\n")},
		"routes/r/speed.csv":  {Data: []byte(c.speed)},
	}
	if c.axle != "" {
		files["routes/r/axle-load.csv"] = &fstest.MapFile{Data: []byte(c.axle)}
	}
	if c.temporary != "" {
		files["routes/r/temporary.csv"] = &fstest.MapFile{Data: []byte(c.temporary)}
	}
	data, err := schema.Load(t.Context(), files)
	if err != nil {
		t.Fatal(err)
	}
	route := data.Routes[0]
	var b strings.Builder
	for _, p := range profile.New(route, c.direction, profile.All).Profile(data.Trains[0]) {
		fmt.Fprintf(&b, "%s %s %d:", route.Track.Begins(p.From), route.Track.Ends(p.To), p.Speed)
		for i, s := range p.Sources {
			if i > 0 {
				b.WriteByte(';')
			}
			b.WriteString(" " + strings.TrimPrefix(s.String(), "routes/r/"))
		}
		b.WriteByte('\n')
	}
	return b.String()
}

const flat = "from_km,to_km,basic\n0,10,100\n"

var clauses = []clause{
	{number: "3.11.2.3", what: "kinds of restriction are independent; the lowest counts",
		speed: flat, axle: "from_km,to_km,C2,train_length_delay\n2,6,80,no\n", temporary: "id,from_km,to_km,speed,train_length_delay\nT1,4,8,60,no\n",
		want: "0.000 2.000 100: speed.csv:2 basic 100\n2.000 4.000 80: axle-load.csv:2 axle load C2 80\n4.000 8.000 60: temporary.csv:2 temporary T1 60\n8.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.3.1.3", what: "an element says itself whether a rise at its end waits for the rear: it does",
		speed: "from_km,to_km,basic,train_length_delay\n0,4,100,yes\n4,5,60,yes\n5,10,100,yes\n",
		want:  "0.000 4.000 100: speed.csv:2 basic 100\n4.000 5.400 60: speed.csv:3 basic 60\n5.400 10.000 100: speed.csv:4 basic 100\n"},
	{number: "3.11.3.1.3", what: "it does not wait",
		speed: "from_km,to_km,basic,train_length_delay\n0,4,100,yes\n4,5,60,no\n5,10,100,yes\n",
		want:  "0.000 4.000 100: speed.csv:2 basic 100\n4.000 5.000 60: speed.csv:3 basic 60\n5.000 10.000 100: speed.csv:4 basic 100\n"},
	{number: "3.11.3.1.3", what: "against the running distance the rear is left at the other end", direction: codes.Reverse,
		speed: "from_km,to_km,basic\n0,4,100\n4,5,60\n5,10,100\n",
		want:  "0.000 3.600 100: speed.csv:2 basic 100\n3.600 5.000 60: speed.csv:3 basic 60\n5.000 10.000 100: speed.csv:4 basic 100\n"},
	{number: "3.11.3.1.3", what: "it reaches past following elements and ends with the route",
		speed: "from_km,to_km,basic\n0,9.5,60\n9.5,9.7,80\n9.7,10,100\n",
		want:  "0.000 9.900 60: speed.csv:2 basic 60\n9.900 10.000 80: speed.csv:3 basic 80\n"},
	{number: "3.11.3.2.2", what: "the basic speed is the default cant deficiency speed",
		speed: "from_km,to_km,basic,cd130\n0,10,100,120\n",
		want:  "0.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.3.2.3", what: "the speed for exactly the train's cant deficiency category",
		speed: "from_km,to_km,basic,cd130,cd150,cd165\n0,10,100,120,125,130\n", train: "cant_deficiency_mm = 150",
		want: "0.000 10.000 125: speed.csv:2 cant deficiency 150 125\n"},
	{number: "3.11.3.2.3", what: "else that of the highest category below it, even if it is not the fastest",
		speed: "from_km,to_km,basic,cd130,cd165,cd225\n0,10,100,120,110,150\n", train: "cant_deficiency_mm = 180",
		want: "0.000 10.000 110: speed.csv:2 cant deficiency 165 110\n"},
	{number: "3.11.3.2.3", what: "a category above the train's is never used",
		speed: "from_km,to_km,basic,cd300\n0,10,100,160\n", train: "cant_deficiency_mm = 275",
		want: "0.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.3.2.5", what: "other categories that the train does not have are ignored",
		speed: "from_km,to_km,basic,freight_p,passenger\n0,10,100,60,80\n", train: `categories = ["freight_g"]`,
		want: "0.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.3.2.6", what: "a category that limits: the lower of it and the cant deficiency speed",
		speed: "from_km,to_km,basic,passenger\n0,5,100,80\n5,10,100,160\n", train: "categories = [\"passenger\"]\nlength_m = 1",
		want: "0.000 5.001 80: speed.csv:2 passenger 80\n5.001 10.000 100: speed.csv:3 basic 100\n"},
	{number: "3.11.3.2.6", what: "a category that replaces can raise the speed above the cant deficiency speed",
		speed: "from_km,to_km,basic,passenger,passenger_rule\n0,10,100,160,replaces\n", train: `categories = ["passenger"]`,
		want: "0.000 10.000 160: speed.csv:2 passenger 160\n"},
	{number: "3.11.3.2.6", what: "of several categories the lowest, and where one replaces, without the cant deficiency speed",
		speed: "from_km,to_km,basic,freight_p,freight_p_rule,passenger\n0,10,90,120,replaces,160\n", train: `categories = ["freight_p", "passenger"]`,
		want: "0.000 10.000 120: speed.csv:2 freight_p 120\n"},
	{number: "3.11.4.1", what: "the axle load profile has gaps: no restriction there",
		speed: flat, axle: "from_km,to_km,C2,train_length_delay\n3,4,50,no\n6,7,50,no\n",
		want: "0.000 3.000 100: speed.csv:2 basic 100\n3.000 4.000 50: axle-load.csv:2 axle load C2 50\n4.000 6.000 100: speed.csv:2 basic 100\n6.000 7.000 50: axle-load.csv:3 axle load C2 50\n7.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.4.2", what: "a section holds several categories, each train finds its own",
		speed: flat, axle: "from_km,to_km,C2,D4,E5\n0,10,90,70,50\n", train: `axle_load = "D4"`,
		want: "0.000 10.000 70: axle-load.csv:2 axle load D4 70\n"},
	{number: "3.11.4.3", what: "only the entry for exactly the train's category counts, not a lighter or heavier one",
		speed: flat, axle: "from_km,to_km,A,B2,C3,E5\n0,10,10,20,30,40\n",
		want: "0.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.4.5", what: "where nothing is given no axle load restricts",
		speed: flat, want: "0.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.4.6", what: "train length delay of an axle load section",
		speed: flat, axle: "from_km,to_km,C2\n3,4,50\n",
		want: "0.000 3.000 100: speed.csv:2 basic 100\n3.000 4.400 50: axle-load.csv:2 axle load C2 50\n4.400 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.5.2", what: "a temporary restriction is independent of the static profile and binds every train",
		speed: "from_km,to_km,basic,cd150\n0,10,100,160\n", temporary: "id,from_km,to_km,speed,train_length_delay\nT1,3,4,40,no\n", train: "cant_deficiency_mm = 150",
		want: "0.000 3.000 160: speed.csv:2 cant deficiency 150 160\n3.000 4.000 40: temporary.csv:2 temporary T1 40\n4.000 10.000 160: speed.csv:2 cant deficiency 150 160\n"},
	{number: "3.11.5.3", what: "train length delay of a temporary restriction",
		speed: flat, temporary: "id,from_km,to_km,speed\nT1,3,4,40\n",
		want: "0.000 3.000 100: speed.csv:2 basic 100\n3.000 4.400 40: temporary.csv:2 temporary T1 40\n4.400 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.5.4", what: "where temporary restrictions overlap the lowest counts",
		speed: flat, temporary: "id,from_km,to_km,speed,train_length_delay\nT1,3,6,60,no\nT2,4,5,40,no\nT3,5,8,60,no\n",
		want: "0.000 3.000 100: speed.csv:2 basic 100\n3.000 4.000 60: temporary.csv:2 temporary T1 60\n4.000 5.000 40: temporary.csv:3 temporary T2 40\n5.000 8.000 60: temporary.csv:2 temporary T1 60; temporary.csv:4 temporary T3 60\n8.000 10.000 100: speed.csv:2 basic 100\n"},
	{number: "3.11.8", what: "the train's maximum speed holds everywhere, and is a source where it governs",
		speed: "from_km,to_km,basic,train_length_delay\n0,4,100,no\n4,6,70,no\n6,10,80,no\n", train: "max_speed_kmh = 80",
		want: "0.000 4.000 80: trains.toml:8 train 80\n4.000 6.000 70: speed.csv:3 basic 70\n6.000 10.000 80: speed.csv:4 basic 80; trains.toml:8 train 80\n"},
	{number: "3.13.7", what: "the most restrictive speed profile is the lowest of all layers at each point",
		speed: "from_km,to_km,basic,train_length_delay\n0,5,100,no\n5,10,80,no\n", axle: "from_km,to_km,C2,train_length_delay\n2,7,90,no\n",
		temporary: "id,from_km,to_km,speed,train_length_delay\nT1,6,8,70,no\n", train: "max_speed_kmh = 95",
		want: "0.000 2.000 95: trains.toml:8 train 95\n2.000 5.000 90: axle-load.csv:2 axle load C2 90\n5.000 6.000 80: speed.csv:3 basic 80\n6.000 8.000 70: temporary.csv:2 temporary T1 70\n8.000 10.000 80: speed.csv:3 basic 80\n"},
}

func TestClauses(t *testing.T) {
	for i, c := range clauses {
		t.Run(fmt.Sprintf("%s/%d", c.number, i), func(t *testing.T) {
			if got := c.profile(t); got != c.want {
				t.Errorf("%s\ngot\n%swant\n%s", c.what, got, c.want)
			}
		})
	}
}

// 3.11.3.2.2 a: the basic speed is always given; a data set without it is refused.
func TestClause31132_2BasicIsGiven(t *testing.T) {
	for name, speed := range map[string]string{
		"a gap":          "from_km,to_km,basic\n0,4,100\n5,10,100\n",
		"a blank cell":   "from_km,to_km,basic,cd130\n0,10,,100\n",
		"not to the end": "from_km,to_km,basic\n0,9,100\n",
	} {
		_, err := schema.Load(t.Context(), fstest.MapFS{
			"dataset.toml":        {Data: []byte("format = 1\nname = \"Clauses\"\n")},
			"trains.toml":         {Data: []byte("[[train]]\nid = \"T\"\nname = \"Train\"\ncant_deficiency_mm = 80\naxle_load = \"C2\"\nlength_m = 400\nmax_speed_kmh = 300\n")},
			"routes/r/route.toml": {Data: []byte("id = \"R\"\nname = \"Route\"\nstart_km = 0\nend_km = 10\n")},
			"routes/r/speed.csv":  {Data: []byte(speed)},
		})
		if err == nil || !strings.Contains(err.Error(), "3.11.3.2.2") {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// 3.11.5: which temporary restrictions are in force at an instant and on a day is
// data; at the bounds, the first instant belongs to the restriction and the last
// does not.
func TestTemporaryInForce(t *testing.T) {
	at := func(s string) time.Time {
		x, err := time.Parse(time.RFC3339, s)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	v := schema.Validity{From: at("2026-03-01T00:00:00Z"), Until: at("2026-03-03T00:00:00Z")}
	for _, test := range []struct {
		from, until string
		want        bool
	}{
		{"2026-02-28T23:59:59Z", "2026-02-28T23:59:59Z", false},
		{"2026-03-01T00:00:00Z", "2026-03-01T00:00:00Z", true},
		{"2026-03-02T23:59:59Z", "2026-03-02T23:59:59Z", true},
		{"2026-03-03T00:00:00Z", "2026-03-03T00:00:00Z", false},
		{"2026-02-28T00:00:00Z", "2026-03-01T00:00:00Z", false},
		{"2026-02-28T00:00:00Z", "2026-03-01T00:00:01Z", true},
		{"2026-03-03T00:00:00Z", "2026-03-04T00:00:00Z", false},
	} {
		if got := v.Overlaps(at(test.from), at(test.until)); got != test.want {
			t.Errorf("%s to %s: %t", test.from, test.until, got)
		}
	}
}
