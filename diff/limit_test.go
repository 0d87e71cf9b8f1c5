package diff

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"
	"testing/fstest"

	"speedtrail/schema"
)

// raised is a data set before and after a raise of two rows that each of its
// trains sees, in both directions: four changes a train.
func raised(t *testing.T, trains int) (before, after *schema.Dataset) {
	t.Helper()
	var list strings.Builder
	for i := range trains {
		fmt.Fprintf(&list, "[[train]]\nid = \"T%d\"\nname = \"A train\"\ncant_deficiency_mm = 150\ncategories = []\naxle_load = \"C2\"\nlength_m = %d\nmax_speed_kmh = 200\n", i, 100+i)
	}
	load := func(one, two int) *schema.Dataset {
		files := map[string]string{
			"dataset.toml":          "format = 1\nname = \"Test\"\n",
			"trains.toml":           list.String(),
			"routes/one/route.toml": "id = \"R1\"\nname = \"One\"\nstart_km = 0\nend_km = 10\n",
			"routes/one/speed.csv":  fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,4,%d,no\n4,10,%d,no\n", one, two),
		}
		tree := fstest.MapFS{}
		for name, text := range files {
			tree[name] = &fstest.MapFile{Data: []byte(text)}
		}
		d, err := schema.Load(t.Context(), tree)
		if err != nil {
			t.Fatal(err)
		}
		return d
	}
	return load(80, 90), load(100, 120)
}

// Law: a comparison with as many changes as are allowed is made, one with one
// more is refused.
func TestLimit(t *testing.T) {
	before, after := raised(t, 25)
	for _, test := range []struct {
		limit int64
		want  error
	}{{100, nil}, {99, ErrTooMany}, {1, ErrTooMany}, {MaxChanges, nil}} {
		a, err := Compare(t.Context(), before, after, Options{limit: test.limit})
		if !errors.Is(err, test.want) {
			t.Errorf("at most %d: %v, want %v", test.limit, err, test.want)
		}
		if err == nil && len(a.Routes[0].Changes) != 100 {
			t.Errorf("%d changes, want 100", len(a.Routes[0].Changes))
		}
	}
}

// Ctrl-C: a comparison of one route ends with the train that it is at.
func TestEndsBetweenTrains(t *testing.T) {
	before, after := raised(t, 25)
	ctx, cancel := context.WithCancel(t.Context())
	r := pairRoutes(before.Routes, after.Routes)[0]
	r.Files = pairFiles([]Route{r}, before.Files, after.Files)
	looked := 0
	err := compareRoute(ctx, &r, pairTrains(before.Trains, after.Trains), &Options{}, func(int) error {
		if looked++; looked == 3 {
			cancel()
		}
		return nil
	})
	if !errors.Is(err, context.Canceled) || looked != 3 {
		t.Errorf("%v after %d trains, want an end after 3", err, looked)
	}
}
