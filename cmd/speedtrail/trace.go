package main

import (
	"context"
	"errors"
	"io"
	"path/filepath"
	"runtime/debug"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/index"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// traceCall is what trace is asked.
type traceCall struct {
	rev, route, at, from, to string
	trains                   []string
	directions               codes.Directions
	firstParent, noIndex     bool
}

func (a *app) traceCommand() *cobra.Command {
	var call traceCall
	var direction string
	c := &cobra.Command{
		Use:   "trace --route R (--at KM | --from KM --to KM) [REV]",
		Short: "since when, by whom and why a speed holds at a place",
		Long: `trace lists every revision at which the effective speed at a point changed, the
newest first: before, after, the commit with its author and dates, the rows that
governed as they stood, the change requests in play and the recorded assessments
whose range holds the commit. For a stretch it says which revision each piece of
today's profile dates from.

Positions and trains are read as in the newest revision, HEAD unless REV is
given; a position is found in older revisions by its chainage, whatever the
folder of the route was called. A revision that has no such track says so; one
whose data set does not load is named as a gap, and the revisions around it are
compared with each other.

With merges, a change is listed at the commit at which the speed differs from
that of all parents. With --first-parent only the line of first parents counts:
the releases, where work is merged into one branch.

What is read is kept in an index beside the ledger. It can be deleted at any
time; --no-index does without and gives the same answer.`,
		Example: `  speedtrail trace --route SM1 --at 12.4 --train EXP-3
  speedtrail trace --route SM1 --from 10 --to 20 --train EXP-3
  speedtrail trace --route SM1 --at 31.180#2 --first-parent --out trail.html v4`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error {
			call.rev = "HEAD"
			if len(args) == 1 {
				call.rev = args[0]
			}
			if err := chosen("--direction", direction, "nominal", "reverse", "both"); err != nil {
				return err
			}
			call.directions, _ = codes.ParseDirections(direction)
			point, stretch := call.at != "", call.from != "" || call.to != ""
			switch {
			case call.rev == workingTree:
				return badCall("commit first, or ask for HEAD", "a trace goes from commit to commit, the working tree is none")
			case call.route == "":
				return badCall("usage: "+c.UseLine(), "--route is missing")
			case point == stretch || stretch && (call.from == "" || call.to == ""):
				return badCall("usage: "+c.UseLine(), "either --at is needed, for a point, or --from and --to, for a stretch")
			}
			return a.trace(c.Context(), call)
		},
	}
	a.outputFlags(c, "text", "csv", "json", "html")
	c.Flags().StringVar(&call.route, "route", "", "the `id` of the route")
	c.Flags().StringVar(&call.at, "at", "", "the point, as a `km` of the newest revision")
	c.Flags().StringVar(&call.from, "from", "", "where the stretch begins, as a `km` of the newest revision")
	c.Flags().StringVar(&call.to, "to", "", "where the stretch ends, as a `km` of the newest revision")
	c.Flags().StringArrayVar(&call.trains, "train", nil, "the `id` of a reference train (repeatable); all unless given")
	c.Flags().StringVar(&direction, "direction", "both", "nominal, reverse or both")
	c.Flags().BoolVar(&call.firstParent, "first-parent", false, "only the line of first parents, each compared with its first parent")
	c.Flags().BoolVar(&call.noIndex, "no-index", false, "read the repository instead of the index")
	return c
}

func (a *app) trace(ctx context.Context, call traceCall) error {
	defer debug.SetGCPercent(debug.SetGCPercent(littleGarbage))
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	folder, err := a.folder()
	if err != nil {
		return err
	}
	newest, err := resolve(repo, call.rev)
	if err != nil {
		return err
	}
	tip, err := trace.ParseHash(newest.Hash)
	if err != nil {
		return err
	}
	h, err := a.pastOf(ctx, repo, folder, tip, call)
	if err != nil {
		return err
	}
	data, route, err := a.newestOf(ctx, repo, folder, h, call)
	if err != nil {
		return err
	}
	t := &tracing{app: a, repo: repo, folder: folder, h: h, call: call, route: route}
	if err := t.choose(data); err != nil {
		return err
	}
	t.doc.Revision = render.TraceRevision{
		Commit: newest.Hash, Committed: instant(newest.Committer.When), Typed: validText(call.rev),
	}
	if call.at != "" {
		err = t.point(ctx)
	} else {
		err = t.stretch(ctx)
	}
	if err != nil {
		return err
	}
	if err := t.describe(ctx); err != nil {
		return err
	}
	a.remarkGaps(&t.doc)
	return a.write(func(w io.Writer) error {
		switch a.format {
		case "csv":
			return render.TraceCSV(w, &t.doc)
		case "json":
			return render.TraceJSON(w, &t.doc)
		case "html":
			return render.TraceHTML(w, &t.doc)
		}
		return render.TraceText(w, &t.doc, a.style())
	})
}

// mostGapRemarks is how many revisions are named that do not load.
const mostGapRemarks = 10

// remarkGaps says what the rows of CSV, which are changes, leave out.
func (a *app) remarkGaps(t *render.Trace) {
	if a.format != "csv" {
		return
	}
	for i, g := range t.Gaps {
		if i == mostGapRemarks {
			a.remark("! and %d more revisions that do not load; the other formats have them", len(t.Gaps)-i)
			break
		}
		a.remark("! revision %s does not load and has no row: %s", t.Commits[g.Commit].Hash, source.Visible(g.Fault))
	}
	for _, c := range t.Cut {
		a.remark("! the clone is shallow: what came before revision %s is not known", t.Commits[c].Hash)
	}
}

// pastOf gives the past of the route, from the index where that is possible.
func (a *app) pastOf(ctx context.Context, repo *revision.Repo, folder string, tip trace.Hash, call traceCall) (*trace.History, error) {
	reader := trace.NewReader(repo, folder)
	if !call.noIndex {
		h, err := a.indexed(ctx, repo, reader, folder, tip, call.route)
		if err == nil || !errors.Is(err, index.ErrForeign) && !errors.Is(err, index.ErrFailed) {
			return h, err
		}
		a.remark("read without an index: %v", err)
	}
	h, err := reader.History(ctx, tip, call.route, trace.Options{FirstParent: call.firstParent, Progress: longer(a.progress("reading the history"))})
	return h, err
}

// How much may become garbage before it is collected, in per cent of what is in
// use. A question takes some milliseconds and little memory, of which collecting
// would be a third. To read a whole history takes some 100 MB, of which the usual
// 100 per cent would save a quarter and cost a tenth of the time.
const (
	littleGarbage = 400
	muchGarbage   = 200
)

// longer is progress of what turns out to be more than a few commits.
func longer(progress func(done, total int)) func(done, total int) {
	return func(done, total int) {
		if done < total {
			debug.SetGCPercent(muchGarbage)
		}
		progress(done, total)
	}
}

// indexed brings the index up to date and asks it.
func (a *app) indexed(ctx context.Context, repo *revision.Repo, reader *trace.Reader, folder string, tip trace.Hash, route string) (*trace.History, error) {
	file, err := filepath.Abs(filepath.Join(filepath.Dir(a.ledgerPath(repo)), "index.db"))
	if err != nil {
		return nil, err
	}
	if a.ledger != "" {
		// Inside the working tree it could be a file of the user.
		if tracked, err := a.tracked(repo, file); err != nil {
			return nil, err
		} else if tracked != "" {
			return nil, index.ErrForeign
		}
	}
	name, err := index.Name(repo, folder)
	if err != nil {
		return nil, err
	}
	x, err := index.Open(ctx, file)
	if err != nil {
		return nil, err
	}
	defer x.Close()
	return x.Past(ctx, reader, name, tip, route, longer(a.progress("indexing the history")), func() {
		a.remark("the index is damaged, it is made again")
	})
}

// newestOf gives the trains and the route of the newest revision.
func (a *app) newestOf(ctx context.Context, repo *revision.Repo, folder string, h *trace.History, call traceCall) (*schema.Dataset, *schema.Route, error) {
	hash := h.Commits[h.Tip].Hash
	if h.Newest() == nil {
		// The faults, or the ids that there are, come from the whole data set.
		files, err := repo.Snapshot(hash.String(), folder)
		if err != nil {
			return nil, nil, err
		}
		data, err := schema.Load(ctx, files)
		if err != nil {
			return nil, nil, &sideError{call.rev, err}
		}
		route, err := routeOf(data, call.route)
		return data, route, err
	}
	data, err := trace.Newest(ctx, repo, folder, hash, h.Newest().Folder, call.at == "")
	if err != nil {
		return nil, nil, &sideError{call.rev, err}
	}
	route, err := routeOf(data, call.route)
	if err == nil && call.directions != codes.Both && route.Directions&call.directions == 0 {
		err = badCall("leave --direction out", "route %s is not used in direction %s", route.ID, call.directions)
	}
	return data, route, err
}

// located finds a position on a route's track.
func located(route *schema.Route, option, text string) (unit.Distance, error) {
	p, err := chainage.ParsePoint(text)
	if err != nil {
		return 0, badCall("write a position as in the data set, for example 12.4 or 31.180#2", "%s %q: %v", option, text, err)
	}
	at, err := route.Track.Locate(p)
	if err != nil {
		segments := route.Track.Segments()
		hint := "route " + route.ID + " runs from " + segments[0].From.KM() + " to " + segments[len(segments)-1].To.KM()
		if j, ok := route.Track.Skipped(p.Chainage); ok && errors.Is(err, chainage.ErrMissingPosts) {
			hint = "from " + j.Arriving.KM() + " the posts go on at " + j.Leaving.KM()
		}
		if errors.Is(err, chainage.ErrAmbiguous) {
			hint = "write the occurrence along the track: " + text + "#1, " + text + "#2"
		}
		return 0, badCall(hint, "%s %s is %v", option, text, err)
	}
	return at, nil
}
