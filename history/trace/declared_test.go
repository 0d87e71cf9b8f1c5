package trace_test

import (
	"testing"
	"time"

	"speedtrail/diff/step"
	"speedtrail/history/compose"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// declaredStory raises 5 to 10 km, takes the last two kilometres away and, on other
// posts, lays them again.
func declaredStory(t *testing.T) *trace.History {
	t.Helper()
	jump := "start_km = 0\nend_km = 10.5\n[[jump]]\narriving_km = 3\nleaving_km = 3.5\n"
	history := []compose.Commit{
		{Files: files("r", plainHead, "0,5,100\n5,10,80\n"), Message: "0"},
		{Parents: []int{0}, Files: files("r", plainHead, "0,5,100\n5,10,120\n"), Message: "1"},
		{Parents: []int{1}, Files: files("r", "start_km = 0\nend_km = 8\n", "0,5,100\n5,8,120\n"), Message: "2"},
		{Parents: []int{2}, Files: files("r", jump, "0,5,100\n5,10.5,120\n"), Message: "3"},
	}
	for i := range history {
		history[i].Author, history[i].When = compose.Person{Name: "A", Email: "a@story.example"}, time.Date(2024, 1, 1+i, 0, 0, 0, 0, time.UTC)
	}
	_, h := readStory(t, history)
	return h
}

// A declaration is for a change if it holds its route, train, sense and place, on the
// posts of the revision that changed it; see rules.md, declared against observed.
func TestDeclared(t *testing.T) {
	h := declaredStory(t)
	train := schema.Train{ID: "T", Length: unit.Metre, Max: 200}
	declares := func(route, from, to string, effect schema.Effect, trains ...string) *schema.ChangeRequest {
		var at [2]chainage.Point
		for i, km := range []string{from, to} {
			var err error
			if at[i], err = chainage.ParsePoint(km); err != nil {
				t.Fatal(err)
			}
		}
		return &schema.ChangeRequest{Declare: []schema.Declaration{{Route: route, Span: schema.Span{From: at[0], To: at[1], Directions: codes.Both}, Effect: effect, Trains: trains}}}
	}
	in := func(set codes.Directions, q *schema.ChangeRequest) *schema.ChangeRequest {
		q.Declare[0].Span.Directions = set
		return q
	}
	for _, x := range []struct {
		name  string
		at    unit.Distance // on the newest track: behind its jump, 500 m less than the posts read
		step  int           // of the trail, the newest first
		q     *schema.ChangeRequest
		want  bool
		piece bool // of the newest profile around it
	}{
		{"the place, raised", 4_700 * unit.Metre, 0, declares("R", "5", "10", schema.Raise), true, true},
		{"any sense", 4_700 * unit.Metre, 0, declares("R", "5", "10", schema.AnyEffect), true, true},
		{"the other sense", 4_700 * unit.Metre, 0, declares("R", "5", "10", schema.Lower), false, false},
		{"the direction of travel", 4_700 * unit.Metre, 0, in(codes.OnlyNominal, declares("R", "5", "10", schema.Raise)), true, true},
		{"the other direction of travel", 4_700 * unit.Metre, 0, in(codes.OnlyReverse, declares("R", "5", "10", schema.Raise)), false, false},
		{"another route", 4_700 * unit.Metre, 0, declares("S", "5", "10", schema.Raise), false, false},
		{"the train", 4_700 * unit.Metre, 0, declares("R", "5", "10", schema.Raise, "S", "T"), true, true},
		{"another train", 4_700 * unit.Metre, 0, declares("R", "5", "10", schema.Raise, "S"), false, false},
		{"from the point on", 4_700 * unit.Metre, 0, declares("R", "5.2", "5.3", schema.Raise), true, true},
		{"up to the point", 4_700 * unit.Metre, 0, declares("R", "5", "5.2", schema.Raise), false, true},
		{"behind it", 4_700 * unit.Metre, 0, declares("R", "5.200001", "6", schema.Raise), false, true},
		{"across posts that are gone now", 4_700 * unit.Metre, 0, declares("R", "3.2", "6", schema.Raise), true, true},
		{"with an end that the track did not have", 4_700 * unit.Metre, 0, declares("R", "5", "10.5", schema.Raise), false, false},
		{"track that came: any", 9_000 * unit.Metre, 0, declares("R", "9", "10", schema.AnyEffect), true, true},
		{"track that came: a raise", 9_000 * unit.Metre, 0, declares("R", "9", "10", schema.Raise), false, false},
		{"track that came: for a train", 9_000 * unit.Metre, 0, declares("R", "9", "10", schema.AnyEffect, "T"), false, false},
		{"track that went: on its posts", 9_000 * unit.Metre, 1, declares("R", "9", "10", schema.AnyEffect), true, true},
		{"track that went: a reduction", 9_000 * unit.Metre, 1, declares("R", "9", "10", schema.Lower), false, false},
		{"the raise before that", 9_000 * unit.Metre, 2, declares("R", "9", "10", schema.Raise), true, false},
		{"where the history begins", 9_000 * unit.Metre, 3, declares("R", "9", "10", schema.AnyEffect), false, true},
	} {
		t.Run(x.name, func(t *testing.T) {
			v := h.View(codes.Nominal, false)
			trail := v.Point(train, x.at)
			if got := v.DeclaredAt(x.q, train, x.at, &trail.Steps[x.step]); got != x.want {
				t.Errorf("the step of %d km/h: %v, want %v", trail.Steps[x.step].After.Speed, got, x.want)
			}
			declared := false
			for _, p := range v.Stretch(train, x.at-100*unit.Metre, x.at+300*unit.Metre) {
				some, _ := v.DeclaredOn(x.q, train, &p)
				declared = declared || some
			}
			if declared != x.piece {
				t.Errorf("a piece around it: %v, want %v", declared, x.piece)
			}
		})
	}
}

// Of a piece that is longer than a declaration only a part is declared.
func TestDeclaredInPart(t *testing.T) {
	h := declaredStory(t)
	train := schema.Train{ID: "T", Length: unit.Metre, Max: 200}
	declares := func(km ...string) *schema.ChangeRequest {
		q := &schema.ChangeRequest{}
		for i := 1; i < len(km); i++ {
			from, errFrom := chainage.ParsePoint(km[i-1])
			to, errTo := chainage.ParsePoint(km[i])
			if errFrom != nil || errTo != nil {
				t.Fatal(errFrom, errTo)
			}
			q.Declare = append(q.Declare, schema.Declaration{Route: "R", Span: schema.Span{From: from, To: to, Directions: codes.Both}})
		}
		return q
	}
	// The piece up to km 8 was raised at once, whatever the newest posts are; its first
	// metre has the speed of before for a train of one.
	for _, x := range []struct {
		km        []string
		some, all bool
	}{
		{[]string{"5", "8"}, true, true},
		{[]string{"5", "6", "8"}, true, true},
		{[]string{"5", "7.999999"}, true, false},
		{[]string{"5.001", "8"}, true, true},
		{[]string{"5.001001", "8"}, true, false},
		{[]string{"0", "5"}, false, false},
	} {
		v := h.View(codes.Nominal, false)
		pieces := v.Stretch(train, 4_501*unit.Metre, 7_500*unit.Metre)
		if len(pieces) != 1 {
			t.Fatalf("%+v", pieces)
		}
		if some, all := v.DeclaredOn(declares(x.km...), train, &pieces[0]); some != x.some || all != x.all {
			t.Errorf("%v: some %v, all %v, want %v and %v", x.km, some, all, x.some, x.all)
		}
	}
	// A part that had the speed before is no change, and nobody has to declare it.
	v := h.View(codes.Nominal, false)
	p := v.Stretch(train, 4_501*unit.Metre, 7_500*unit.Metre)[0]
	p.Before = []step.Piece{{From: p.From, To: 6_000 * unit.Metre, Speed: p.Speed}, {From: 6_000 * unit.Metre, To: p.To, Speed: 80}}
	if some, all := v.DeclaredOn(declares("6.5", "8"), train, &p); !some || !all {
		t.Errorf("what changed of it: some %v, all %v", some, all)
	}
}
