package main

import (
	"context"
	"io"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff/profile"
	"speedtrail/history/assessment"
	"speedtrail/schema"
	"speedtrail/schema/codes"
)

func (a *app) profileCommand() *cobra.Command {
	var route, direction, on string
	var trains []string
	c := &cobra.Command{
		Use:   "profile [REV] --route R --train T",
		Short: "the effective speed profile of a train on a route",
		Long: `profile compiles the most restrictive speed profile of a reference train on a
route at a revision (the working tree unless given) and prints each piece with
the rows that govern it, in the order of the kilometres for both directions of
travel.

All temporary restrictions count, whatever their validity; with --on a date,
those in force at any moment of that day, with --on a date-time (RFC 3339),
those in force at that instant.`,
		Example: `  speedtrail profile --route SM1 --train EXP-3
  speedtrail profile release-2 --route SM1 --train EXP-3 --direction reverse --format chart
  speedtrail profile --route SM1 --train EXP-3 --on 2026-03-01 --format csv`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error {
			rev := workingTree
			if len(args) == 1 {
				rev = args[0]
			}
			if err := chosen("--direction", direction, "nominal", "reverse", "both"); err != nil {
				return err
			}
			directions, _ := codes.ParseDirections(direction)
			if route == "" || len(trains) == 0 {
				missing := "--train is missing"
				if route == "" {
					missing = "--route is missing"
				}
				return badCall("usage: "+c.UseLine(), "%s", missing)
			}
			return a.profile(c.Context(), rev, route, trains, directions, on)
		},
	}
	a.outputFlags(c, "text", "chart", "csv", "json", "svg")
	c.Flags().StringVar(&route, "route", "", "the `id` of the route")
	c.Flags().StringArrayVar(&trains, "train", nil, "the `id` of a reference train; can be given again")
	c.Flags().StringVar(&direction, "direction", "both", "nominal, reverse or both")
	c.Flags().StringVar(&on, "on", "", "count only the temporary restrictions in force on this `date` or date-time")
	return c
}

func (a *app) profile(ctx context.Context, rev, routeID string, trainIDs []string, directions codes.Directions, on string) error {
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	s, err := a.openSide(repo, rev)
	if err != nil {
		return err
	}
	data, err := s.load(ctx)
	if err != nil {
		return err
	}
	route, err := routeOf(data, routeID)
	if err != nil {
		return err
	}
	if directions != codes.Both && route.Directions&directions == 0 {
		return badCall("leave --direction out", "route %s is not used in direction %s", route.ID, directions)
	}
	filter, err := inForce(on, data.TimeZone)
	if err != nil {
		return err
	}
	var list []render.Profile
	for _, d := range codes.AllDirections {
		if !(directions & route.Directions).Has(d) {
			continue
		}
		compiler := profile.New(route, d, filter)
		for _, id := range trainIDs {
			train, err := trainOf(data, id)
			if err != nil {
				return err
			}
			p := profileOf(compiler, route, d, train)
			p.Revision, p.On = s.label(), on
			list = append(list, p)
		}
	}
	return a.write(func(w io.Writer) error {
		switch a.format {
		case "chart":
			return render.ProfileChart(w, a.style(), list...)
		case "csv":
			return render.ProfileCSV(w, list...)
		case "json":
			return render.ProfileJSON(w, list...)
		case "svg":
			return render.ProfileSVG(w, list...)
		}
		return render.ProfileText(w, a.style(), list...)
	})
}

// profileOf writes a profile for printing.
func profileOf(c *profile.Compiler, route *schema.Route, d codes.Direction, t schema.Train) render.Profile {
	p := render.Profile{
		Route: route.ID, RouteName: route.Name, Direction: d.String(), Train: t.ID, TrainName: t.Name,
		Segments: assessment.Segments(route.Track, 0, route.Track.Length()),
		Places:   assessment.Places(route, d, 0, route.Track.Length()),
	}
	for _, piece := range c.Profile(t) {
		p.Pieces = append(p.Pieces, render.Piece{
			From: route.Track.Begins(piece.From).String(), To: route.Track.Ends(piece.To).String(),
			Start: int64(piece.From), End: int64(piece.To), Speed: int(piece.Speed),
			Sources: assessment.Sources(piece.Sources),
		})
	}
	return p
}

func routeOf(data *schema.Dataset, id string) (*schema.Route, error) {
	ids := make([]string, len(data.Routes))
	for i, r := range data.Routes {
		if r.ID == id {
			return r, nil
		}
		ids[i] = r.ID
	}
	return nil, badCall(meant(id, ids, "its routes: "+some(ids)+"; another revision, as REV, can have had others"), "the data set has no route %q", id)
}

func trainOf(data *schema.Dataset, id string) (schema.Train, error) {
	ids := make([]string, len(data.Trains))
	for i, t := range data.Trains {
		if t.ID == id {
			return t, nil
		}
		ids[i] = t.ID
	}
	return schema.Train{}, badCall(meant(id, ids, "its reference trains: "+some(ids)), "the data set has no reference train %q", id)
}

// inForce reads --on: nothing counts every temporary restriction, a date those
// in force at any moment of that day in the data set's time zone, a date-time
// those in force at that instant (SUBSET-026 3.11.5 knows no validity; it is a
// matter of the data).
func inForce(on string, zone *time.Location) (profile.Filter, error) {
	if on == "" {
		return profile.All, nil
	}
	from, err := time.Parse(time.RFC3339, on)
	until := from
	if day, bad := time.Parse(time.DateOnly, on); bad == nil {
		from, until = schema.Day(day, zone)
		err = nil
	}
	if err != nil {
		return nil, badCall("write 2026-03-01 or 2026-03-01T06:00:00Z", "%q is no date or date-time", on)
	}
	return func(t *schema.TemporaryRow) bool { return t.Valid.Overlaps(from, until) }, nil
}
