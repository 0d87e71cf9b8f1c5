package trace_test

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"

	"speedtrail/history/internal/network"
	"speedtrail/history/internal/past"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// drawn is a random history in a repository.
type drawn struct {
	brute *past.Brute
	dir   string
	repo  *revision.Repo
	tip   trace.Hash
}

func draw(t *testing.T, seed uint64, commits int) *drawn {
	t.Helper()
	rnd := rand.New(rand.NewPCG(seed, 7))
	history := past.History(rnd, commits)
	d := &drawn{brute: past.Load(history), dir: past.Write(t, history)}
	if d.brute.Data[commits-1] == nil {
		t.Fatal("the newest commit does not load")
	}
	var err error
	if d.repo, err = revision.Open(d.dir); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { d.repo.Close() })
	c, err := d.repo.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	if d.tip, err = trace.ParseHash(c.Hash); err != nil {
		t.Fatal(err)
	}
	return d
}

// number gives the number of a commit in the drawn history.
func (d *drawn) number(t *testing.T, h *trace.History, c int32) int {
	t.Helper()
	commit, err := d.repo.Resolve(h.Commits[c].Hash.String())
	if err != nil {
		t.Fatal(err)
	}
	var n int
	if _, err := fmt.Sscanf(commit.Subject, "commit %d", &n); err != nil {
		t.Fatal(err)
	}
	return n
}

// Of every two commits, one comes before the other where parents lead to it.
func TestBeforeAndAfter(t *testing.T) {
	d := draw(t, 5, 60)
	h, err := trace.NewReader(d.repo, ".").History(context.Background(), d.tip, "R1", trace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	var leads func(from, to int32) bool
	leads = func(from, to int32) bool {
		return from == to || slices.ContainsFunc(h.Commits[from].Parents, func(p int32) bool { return leads(p, to) })
	}
	merges := 0
	for a := range int32(len(h.Commits)) {
		before, after := h.Ancestors(a), h.Descendants(a)
		for b := range int32(len(h.Commits)) {
			if before[b] != leads(a, b) || after[b] != leads(b, a) {
				t.Fatalf("of %d, %d is an ancestor: %t, a descendant: %t", a, b, before[b], after[b])
			}
		}
		if len(h.Commits[a].Parents) > 1 {
			merges++
		}
	}
	if merges == 0 {
		t.Error("nothing was merged")
	}
}

// A merge of a commit that is not in the repository has no history that could be told:
// that is an error, unless only first parents count.
func TestMissingParent(t *testing.T) {
	d := draw(t, 1, 10)
	c := network.Command(t.Context(), d.dir, "hash-object", "-t", "commit", "-w", "--stdin")
	c.Stdin = strings.NewReader(fmt.Sprintf("tree %s\nparent %s\nparent %040d\nauthor A <a@story.example> 1 +0000\ncommitter A <a@story.example> 1 +0000\n\nm\n", treeOf(t, d), d.tip, 7))
	out, err := c.Output()
	if err != nil {
		t.Fatal(err)
	}
	tip, err := trace.ParseHash(strings.TrimSpace(string(out)))
	if err != nil {
		t.Fatal(err)
	}
	repo, err := revision.Open(d.dir)
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	for first, want := range map[bool]error{false: revision.ErrMissingObject, true: nil} {
		h, err := trace.NewReader(repo, ".").History(t.Context(), tip, "R1", trace.Options{FirstParent: first})
		if !errors.Is(err, want) || (h == nil) != (want != nil) {
			t.Errorf("first parents only %t: %v, %v", first, h, err)
		}
	}
}

func treeOf(t *testing.T, d *drawn) trace.Hash {
	t.Helper()
	link, err := d.repo.Link(d.tip)
	if err != nil {
		t.Fatal(err)
	}
	return link.Tree
}

// cases are points of the newest track, joints and ends included.
func cases(rnd *rand.Rand, b *past.Brute) []past.Case {
	newest := b.Route(len(b.Data)-1, "R1")
	points := []unit.Distance{0, newest.Track.Length()}
	for _, s := range newest.Track.Segments() {
		points = append(points, s.Start, max(0, s.Start-1))
	}
	for range 6 {
		points = append(points, unit.Distance(rnd.Int64N(int64(newest.Track.Length()))))
		points = append(points, unit.Distance(rnd.Int64N(int64(newest.Track.Length()/unit.Kilometre)))*unit.Kilometre)
	}
	var list []past.Case
	for _, at := range points {
		for _, d := range codes.AllDirections {
			if !newest.Directions.Has(d) {
				continue
			}
			for _, train := range b.Data[len(b.Data)-1].Trains {
				for _, first := range []bool{false, true} {
					list = append(list, past.Case{Route: "R1", Train: train, Direction: d, At: at, FirstParent: first})
				}
			}
		}
	}
	return list
}

// For random histories, a trace gives the same as compiling the profile at every
// commit.
func TestPointAgainstEveryCommit(t *testing.T) {
	steps, aside, across, merges := 0, 0, 0, 0
	for seed := range uint64(40) {
		d := draw(t, seed, 30)
		h, err := trace.NewReader(d.repo, ".").History(context.Background(), d.tip, "R1", trace.Options{})
		if err != nil {
			t.Fatal(seed, err)
		}
		checkGaps(t, d, h)
		for _, q := range cases(rand.New(rand.NewPCG(seed, 8)), d.brute) {
			trail := h.View(q.Direction, q.FirstParent).Point(q.Train, q.At)
			want := d.brute.Steps(q)
			var got []past.Step
			origin := -1
			for _, s := range trail.Steps {
				g := past.Step{Commit: d.number(t, h, s.After.Commit), After: s.After.Speed}
				for _, b := range s.Before {
					g.Before = append(g.Before, b.Speed)
				}
				if origin < 0 && !s.Aside && s.After.Speed == trail.Now.Speed {
					origin = g.Commit
				}
				got = append(got, g)
				if s.Aside {
					aside++
				}
				if s.Across > 0 {
					across++
				}
				if len(s.Before) > 1 {
					merges++
				}
			}
			steps += len(got)
			slices.SortFunc(got, func(a, b past.Step) int { return a.Commit - b.Commit })
			if !reflect.DeepEqual(got, want) {
				t.Fatalf("seed %d, %s %s at %s, first parent %v:\ngot  %v\nwant %v", seed, q.Train.ID, q.Direction, q.At.M(), q.FirstParent, got, want)
			}
			if now := d.brute.Speed(29, q); trail.Now.Speed != now {
				t.Fatalf("seed %d: now %d, want %d", seed, trail.Now.Speed, now)
			}
		}
	}
	if steps < 1000 || aside < 5 || across < 5 || merges < 5 {
		t.Fatalf("the histories are too tame: %d steps, %d set aside, %d across gaps, %d merges", steps, aside, across, merges)
	}
}

// checkGaps compares the gaps with the data sets that do not load.
func checkGaps(t *testing.T, d *drawn, h *trace.History) {
	t.Helper()
	for i := range h.Commits {
		n := d.number(t, h, int32(i))
		if loads := d.brute.Data[n] != nil; loads == (h.State[i] == trace.Gap) || loads != (h.Commits[i].Gap == "") {
			t.Fatalf("commit %d: loads is %v, gap %q, state %d", n, loads, h.Commits[i].Gap, h.State[i])
		}
	}
}

// Every point of a stretch dates from the commit that going back from the newest
// one comes to, and the pieces are those of the profile, cut where that differs.
func TestStretchAgainstEveryCommit(t *testing.T) {
	pieces := 0
	for seed := range uint64(40) {
		d := draw(t, seed, 30)
		h, err := trace.NewReader(d.repo, ".").History(context.Background(), d.tip, "R1", trace.Options{})
		if err != nil {
			t.Fatal(err)
		}
		length := h.Newest().Track.Length()
		rnd := rand.New(rand.NewPCG(seed, 9))
		for _, first := range []bool{false, true} {
			for _, train := range d.brute.Data[29].Trains {
				from := unit.Distance(rnd.Int64N(int64(length / 2)))
				to := from + 1 + unit.Distance(rnd.Int64N(int64(length-from)))
				view := h.View(codes.Nominal, first)
				at := from
				for i, p := range view.Stretch(train, from, to) {
					pieces++
					if p.From != at || p.To <= p.From {
						t.Fatalf("seed %d: piece %d begins at %d, not %d", seed, i, p.From, at)
					}
					at = p.To
					for _, s := range []unit.Distance{p.From, p.To - 1, p.From + (p.To-p.From)/2} {
						q := past.Case{Route: "R1", Train: train, Direction: codes.Nominal, At: s, FirstParent: first}
						if want, speed := d.brute.Origin(q), d.brute.Speed(29, q); d.number(t, h, p.Origin) != want || p.Speed != speed {
							t.Fatalf("seed %d, %s at %s: %d from commit %d, want %d from %d", seed, train.ID, s.M(), p.Speed, d.number(t, h, p.Origin), speed, want)
						}
					}
				}
				if at != to {
					t.Fatalf("seed %d: the pieces end at %d, not %d", seed, at, to)
				}
				checkBands(t, d, h, view.Bands(train, from, to), train, (from+to)/2)
			}
		}
	}
	if pieces < 150 {
		t.Fatalf("only %d pieces", pieces)
	}
}

// checkBands compares a column of the bands with the reigns at its point.
func checkBands(t *testing.T, d *drawn, h *trace.History, bands []trace.Band, train schema.Train, at unit.Distance) {
	t.Helper()
	var got []trace.Reign
	for _, b := range bands {
		r := trace.Reign{From: b.From, Speed: b.Profile.At(at), Gap: b.Gap}
		if n := len(got); n == 0 || got[n-1].Speed != r.Speed || got[n-1].Gap != r.Gap {
			got = append(got, r)
		}
	}
	if want := h.View(codes.Nominal, false).Point(train, at).Line; !slices.Equal(got, want) {
		t.Fatalf("bands %v, reigns %v", got, want)
	}
}

// The order is that of `git log --date-order`.
func TestOrderAgainstGit(t *testing.T) {
	for seed := range uint64(10) {
		d := draw(t, seed, 40)
		h, err := trace.NewReader(d.repo, ".").History(context.Background(), d.tip, "R1", trace.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, first := range []bool{false, true} {
			args := []string{"log", "--date-order", "--format=%H"}
			if first {
				args = append(args, "--first-parent")
			}
			out, err := network.Command(context.Background(), d.dir, args...).Output()
			if err != nil {
				t.Fatal(err)
			}
			order := strings.Fields(string(out))
			last := -1
			for _, s := range h.View(codes.Nominal, first).Point(d.brute.Data[39].Trains[0], 2500*unit.Metre).Steps {
				at := slices.Index(order, h.Commits[s.After.Commit].Hash.String())
				if at <= last {
					t.Fatalf("seed %d: a step at place %d of git's order follows one at %d", seed, at, last)
				}
				last = at
			}
		}
	}
}
