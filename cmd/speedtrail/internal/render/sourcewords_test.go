package render

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// No number of a row stands without its unit beside another.
func TestSourceWords(t *testing.T) {
	old := assessment.Source{File: "routes/r/speed.csv", Line: 3, Kind: "cant deficiency 150", Value: 140}
	now := assessment.Source{File: "routes/r/speed.csv", Line: 4, Kind: "cant deficiency 150", Value: 160}
	slow := assessment.Source{File: "routes/r/temporary.csv", Line: 2, Kind: "temporary T-7", Value: 30}
	for _, x := range []struct {
		before, after []assessment.Source
		want          string
	}{
		{[]assessment.Source{old}, []assessment.Source{now}, "routes/r/speed.csv:3 now 4 cant deficiency 150: 140 now 160 km/h"},
		{[]assessment.Source{old}, []assessment.Source{slow}, "before routes/r/speed.csv:3 cant deficiency 150: 140 km/h|after routes/r/temporary.csv:2 temporary T-7: 30 km/h"},
	} {
		if got := strings.Join(because(x.before, x.after), "|"); got != x.want {
			t.Errorf("got  %s\nwant %s", got, x.want)
		}
	}
	if got, want := governWords([]assessment.Source{old, slow}), "cant deficiency 150: 140 km/h (speed.csv:3) + temporary T-7: 30 km/h (temporary.csv:2)"; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	train := assessment.Source{File: "trains.toml", Line: 2, Kind: "train", Value: 30}
	if got, want := sourcePlaces([]assessment.Source{old, train}), "routes/r/speed.csv:3 cant deficiency 150; trains.toml:2 maximum speed of the train"; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}
