package index

import (
	"context"
	"math/rand/v2"
	"reflect"
	"testing"
	"testing/fstest"

	"speedtrail/history/internal/past"
	"speedtrail/schema"
)

// kept gives a route with what the index keeps of it.
func kept(r *schema.Route) *schema.Route {
	out := &schema.Route{Folder: r.Folder, ID: r.ID, Track: r.Track, Directions: r.Directions}
	out.Pos.File = r.Pos.File
	for _, j := range r.Jumps {
		out.Jumps = append(out.Jumps, schema.JumpRow{Jump: j.Jump})
	}
	row := func(x schema.Row) schema.Row {
		y := schema.Row{Start: x.Start, End: x.End, Delay: x.Delay}
		y.Pos.File, y.Pos.Line, y.Directions = x.Pos.File, x.Pos.Line, x.Directions
		return y
	}
	out.Speed = make([]schema.SpeedRow, 0)
	for _, x := range r.Speed {
		x.Row = row(x.Row)
		out.Speed = append(out.Speed, x)
	}
	out.AxleLoad = make([]schema.AxleLoadRow, 0)
	for _, x := range r.AxleLoad {
		x.Row = row(x.Row)
		out.AxleLoad = append(out.AxleLoad, x)
	}
	out.Temporary = make([]schema.TemporaryRow, 0)
	for _, x := range r.Temporary {
		out.Temporary = append(out.Temporary, schema.TemporaryRow{Row: row(x.Row), ID: x.ID, Speed: x.Speed})
	}
	return out
}

// one is a route that has everything that a row can have.
func one(t testing.TB) *schema.Route {
	files := fstest.MapFS{}
	for name, content := range map[string]string{
		"dataset.toml":        "format = 1\nname = \"One\"\n",
		"trains.toml":         "[[train]]\nid = \"T\"\nname = \"T\"\ncant_deficiency_mm = 80\naxle_load = \"A\"\nlength_m = 1\nmax_speed_kmh = 5\n",
		"routes/x/route.toml": "id = \"X-1\"\nname = \"X\"\nstart_km = -1.5\nend_km = 8\n[[jump]]\narriving_km = 2\nleaving_km = 1\n[[jump]]\narriving_km = 5\nleaving_km = 6\n",
		"routes/x/speed.csv": "from_km,to_km,direction,basic,cd80,cd300,freight_p,freight_p_rule,passenger,train_length_delay\n" +
			"6,8,,600,,,,,,\n-1.5,1.7#1,both,100,105,200,80,replaces,90,no\n1.7#1,5,nominal,5,,,,,,yes\n1.7#1,5,reverse,10,,,,,,\n",
		"routes/x/axle-load.csv": "from_km,to_km,A,E5,train_length_delay\n3,4,40,30,no\n",
		"routes/x/temporary.csv": "id,from_km,to_km,speed,direction\nT 1,3,4,40,reverse\n",
	} {
		files[name] = &fstest.MapFile{Data: []byte(content)}
	}
	data, err := schema.Load(context.Background(), files)
	if err != nil {
		t.Fatal(err)
	}
	return data.Routes[0]
}

// Law: decode(encode(r)) is r with what is kept.
func TestEncode(t *testing.T) {
	routes := []*schema.Route{one(t)}
	for seed := range uint64(20) {
		for _, data := range past.Load(past.History(rand.New(rand.NewPCG(seed, 4)), 15)).Data {
			if data != nil {
				routes = append(routes, data.Routes...)
			}
		}
	}
	for _, r := range routes {
		got, err := decode(encode(r), r.Folder)
		if err != nil {
			t.Fatal(err)
		}
		if want := kept(r); !reflect.DeepEqual(got, want) {
			t.Fatalf("got  %+v\nwant %+v", got, want)
		}
	}
}

// What is cut short, and what goes on behind its end, is damaged; so is a number that
// does not end.
func TestDecodeCutShort(t *testing.T) {
	data, err := opened(encode(one(t)))
	if err != nil {
		t.Fatal(err)
	}
	for n := range data {
		if r, err := decodeOpened(data[:n], "routes/x"); err == nil {
			t.Errorf("the first %d of %d bytes are %+v", n, len(data), r)
		}
	}
	if _, err := decodeOpened(append(data[:len(data):len(data)], 0), "routes/x"); err == nil {
		t.Error("a byte more is passed over")
	}
	for _, data := range [][]byte{nil, {0x80}, {0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 1}} {
		for name, read := range map[string]func(r *reader){
			"int": func(r *reader) { r.int() }, "uint": func(r *reader) { r.uint() }, "text": func(r *reader) { r.text() }, "count": func(r *reader) { r.count() },
		} {
			r := &reader{data: data}
			if read(r); !r.bad {
				t.Errorf("%s reads %x", name, data)
			}
		}
	}
}

// What is damaged is an error, never a panic.
func FuzzDecode(f *testing.F) {
	data, _ := opened(encode(one(f)))
	f.Add(data)
	f.Add(data[:len(data)/2])
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, data []byte) {
		r, err := decodeOpened(data, "routes/x")
		if err == nil && r.Track == nil {
			t.Fatal("no track")
		}
	})
}
