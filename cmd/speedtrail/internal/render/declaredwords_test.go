package render

import (
	"testing"

	"speedtrail/history/assessment"
)

// Of a request that declares too little the terminal says where, for each train.
func TestDeclaredFamilySaysWhere(t *testing.T) {
	in := assessment.Piece{From: "22.000", To: "35.000"}
	out := assessment.Piece{From: "20.000", To: "22.000", By: -1}
	c := &assessment.Computed{
		Trains:   []assessment.Train{{ID: "A"}, {ID: "B"}, {ID: "C"}},
		Requests: []assessment.Request{{ID: "CR-1", Declares: make([]assessment.Declaration, 1)}},
	}
	r := &assessment.Route{Pieces: [][]assessment.Piece{{out, in}, {}, {in}}}
	change := func(train, pieces int) *assessment.Change {
		return &assessment.Change{Trains: []int{train}, Pieces: pieces}
	}
	for want, all := range map[string][]*assessment.Change{
		"CR-1, outside at km 20.000 to 22.000":                            {change(0, 0), change(1, 0)},
		"CR-1 (C); CR-1, outside at km 20.000 to 22.000 (A); outside (B)": {change(0, 0), change(1, 1), change(2, 2)},
		"outside": {change(0, 1)},
		"CR-1":    {change(0, 2)},
	} {
		if got := declaredFamily(c, r, family{all: all}); got != want {
			t.Errorf("got  %s\nwant %s", got, want)
		}
	}
}
