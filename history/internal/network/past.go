package network

import (
	"context"
	"fmt"
	"io"
	"math/rand/v2"
	"testing"
)

// PastSize says how long the history of a data set is.
type PastSize struct {
	Size
	Commits int // after the first, merges included
	// Branch: every so many commits, three are a commit on a branch, one beside
	// it and their merge; 0: the history is a line.
	Branch int
	// Storage is how the objects lie on disk; everything in one pack, if empty.
	Storage Storage
}

// Decade is the history of a large network: 500 routes of 60 rows, 5,000
// commits that alter one to three routes each.
var Decade = PastSize{Size: Size{Routes: 500, Rows: 60, AxleLoad: 15, Temp: 3, Trains: 10}, Commits: 5000, Branch: 20}

// RepositoryWithPast writes the network of a size with its history into a new
// folder that lives as long as the test, nothing checked out. It skips the test
// where the git program is absent; in CI that is a failure.
func RepositoryWithPast(tb testing.TB, s PastSize) (dir string) {
	tb.Helper()
	return written(tb, func(ctx context.Context, dir string) error { return WritePast(ctx, dir, s) })
}

// WritePast writes the network of a size with its history into an empty folder.
func WritePast(ctx context.Context, dir string, s PastSize) error {
	if err := fastImport(ctx, dir, func(w io.Writer) { newPast(w, s).write() }); err != nil {
		return err
	}
	return s.Storage.store(ctx, dir)
}

// past writes a history.
type past struct {
	w      io.Writer
	size   PastSize
	rnd    *rand.Rand
	routes []*route
	mark   int
}

func newPast(w io.Writer, s PastSize) *past {
	return &past{w: w, size: s, rnd: rand.New(rand.NewPCG(2, 1))}
}

func (p *past) write() {
	first := frame(p.size.Size)
	for n := 1; n <= p.size.Routes; n++ {
		r := newRoute(p.size.Size, n)
		p.routes = append(p.routes, r)
		first = append(first, r.files()...)
	}
	p.commit(0, 0, "main", "All routes", first)
	for p.mark <= p.size.Commits {
		tip := p.mark
		if p.size.Branch == 0 || tip%p.size.Branch != 0 || tip+3 > p.size.Commits {
			p.commit(tip, 0, "main", "Alter "+fmt.Sprint(tip), p.edit())
			continue
		}
		// A branch alters other routes than main does beside it.
		aside := p.edit()
		p.commit(tip, 0, "branch", "Alter aside", aside)
		branch := p.mark
		p.commit(tip, 0, "main", "Alter beside", p.edit())
		// A file that main has altered beside keeps main's content.
		p.commit(p.mark, branch, "main", "Merge", p.now(aside))
	}
	fmt.Fprint(p.w, "done\n")
}

// edit alters cells of one to three routes and gives the files that differ.
func (p *past) edit() []file {
	var list []file
	for range 1 + p.rnd.IntN(3) {
		r := p.routes[p.rnd.IntN(len(p.routes))]
		by := 5 - 10*p.rnd.IntN(2)
		switch p.rnd.IntN(8) {
		case 0:
			r.shiftWithin(r.graded, p.rnd.IntN(64), cd165, by)
		case 1:
			if len(r.axle) > 0 {
				row := r.axle[p.rnd.IntN(len(r.axle))]
				row[4] = fmt.Sprint(30 + 5*p.rnd.IntN(20))
				list = append(list, r.files()[2])
				continue
			}
			fallthrough
		default:
			r.shiftWithin(r.plain, p.rnd.IntN(64), basic, by)
		}
		list = append(list, r.files()[1])
	}
	return list
}

// now gives the present content of files.
func (p *past) now(list []file) []file {
	var out []file
	for _, f := range list {
		for _, r := range p.routes {
			for _, g := range r.files() {
				if g.path == f.path {
					out = append(out, g)
				}
			}
		}
	}
	return out
}

// shiftWithin is shift within the speeds that a table may hold.
func (r *route) shiftWithin(rows []int, n, column, by int) {
	if len(rows) == 0 {
		rows, column = []int{0}, basic
	}
	var v int
	fmt.Sscan(r.speed[rows[n%len(rows)]][column], &v)
	if v+by < 20 || v+by > 300 {
		by = -by
	}
	r.shift(rows, n, column, by)
}

func (p *past) commit(from, merge int, branch, message string, files []file) {
	p.mark++
	fmt.Fprintf(p.w, "commit refs/heads/%s\nmark :%d\n", branch, p.mark)
	fmt.Fprintf(p.w, "committer Rowan Teal <r.teal@network.example> %d +0000\n", 1451606400+p.mark*60000)
	fmt.Fprintf(p.w, "data %d\n%s\n", len(message), message)
	if from > 0 {
		fmt.Fprintf(p.w, "from :%d\n", from)
	}
	if merge > 0 {
		fmt.Fprintf(p.w, "merge :%d\n", merge)
	}
	for _, f := range files {
		fmt.Fprintf(p.w, "M 100644 inline %s\ndata %d\n%s\n", f.path, len(f.content), f.content)
	}
	fmt.Fprint(p.w, "\n")
}
