package main

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"slices"
	"strings"
	"time"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff/profile"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
)

// inForceAnswer is the JSON form of what was in force at an instant.
type inForceAnswer struct {
	Format  string         `json:"format"`
	When    string         `json:"when"`
	Future  bool           `json:"in_future"` // the instant is still to come: later records can say otherwise
	Route   string         `json:"route"`
	At      string         `json:"at_km"`
	Record  *serviceRecord `json:"record" jsonschema:"nullable"` // null: nothing is recorded
	Commit  string         `json:"commit"`
	Subject string         `json:"subject"`
	// Routes are the records of single routes that hold then in place of Record,
	// where no route is asked for.
	Routes []heldRecord `json:"routes"`
	// Corrected are records that said otherwise of that instant until another one
	// replaced or voided them, by entry.
	Corrected []correctedRecord `json:"corrected"`
	// Signed are the decisions on the assessments that led to the revision, and the
	// statements of the anchor where it has the anchor's content.
	Signed []evidence   `json:"signed"`
	Speeds []pointSpeed `json:"speeds"`
	Head   string       `json:"head"`
}

// heldRecord is a record with the routes on which it is the one that holds at an
// instant: of those that it names, later records can have taken some.
type heldRecord struct {
	serviceRecord
	HoldsOn []string `json:"holds_on"`
}

// evidence is a decision that somebody signed.
type evidence struct {
	Assessment  int64  `json:"assessment"` // 0: the anchor
	Entry       int64  `json:"entry"`
	Role        string `json:"role"`
	Decision    string `json:"decision" jsonschema:"enum=approve,enum=reject,enum=anchor"`
	Signer      string `json:"signer"`
	Fingerprint string `json:"key"`
	// Elsewhere is null where no older folder knows the signer without this key.
	Elsewhere *render.Elsewhere `json:"key_elsewhere" jsonschema:"nullable"`
	// Revoked is null while the key is in use.
	Revoked *render.Revocation `json:"key_revoked" jsonschema:"nullable"`
	Time    string             `json:"time"`
}

// review says why somebody has to look at it again; empty where nobody has to.
func (e *evidence) review() string {
	return strings.TrimPrefix(e.Elsewhere.Behind()+e.shortlyRevoked(), "; ! ")
}

func (e *evidence) shortlyRevoked() string {
	if e.Revoked == nil {
		return ""
	}
	return "; ! " + e.Revoked.Short()
}

// by says what was signed, and who did.
func (e *evidence) by() string {
	if e.Assessment == 0 {
		return fmt.Sprintf("the anchor as %s by %s", e.Role, e.Signer)
	}
	return fmt.Sprintf("assessment %d: %s as %s by %s", e.Assessment, e.Decision, e.Role, e.Signer)
}

// pointSpeed is the effective speed of a train at a point.
type pointSpeed struct {
	Train     string   `json:"train"`
	Direction string   `json:"direction"`
	Speed     int      `json:"speed_kmh"`
	Governed  []string `json:"governed_by"`
	words     []string // the same for a reader, who has the speed beside it
}

func (a *app) inforceWhen(ctx context.Context, when time.Time, route, at string) error {
	folder, err := a.folder()
	if err != nil {
		return err
	}
	l, err := a.openLedger(ctx, false)
	if err != nil {
		return err
	}
	defer l.Close()
	line, err := a.readLine(ctx, l)
	if err != nil {
		return err
	}
	answer := inForceAnswer{Format: "speedtrail-inforce-at 1", When: when.Format(signoff.TimeLayout), Future: when.After(time.Now()), Route: route, At: at, Routes: []heldRecord{}, Corrected: []correctedRecord{}, Signed: []evidence{}, Speeds: []pointSpeed{}, Head: line.Head().String()}
	now, _ := line.InForceAt(folder, route, when)
	if route == "" {
		answer.Routes = recordsOfRoutes(line, folder, when, now)
	}
	for _, x := range corrections(line, folder) {
		if saidOtherwise(x.record, now, when, route) {
			answer.Corrected = append(answer.Corrected, x)
		}
	}
	if now != nil {
		if err := a.fillInForce(ctx, &answer, line, *now, when); err != nil {
			return err
		}
	}
	err = a.write(func(w io.Writer) error {
		if a.format == "json" {
			return indentedJSON(w, answer)
		}
		return a.printInForce(w, &answer, a.style().Width)
	})
	if err == nil && answer.unapproved() {
		return errFindings
	}
	return err
}

// unapproved tells whether what was in force, or was said to be until that was
// corrected, went into service without approval, or has lost it: inforce without an
// instant has a finding for each.
func (a *inForceAnswer) unapproved() bool {
	against := func(r *serviceRecord) bool { return !r.Approved || r.Late != "" }
	return a.Record != nil && against(a.Record) ||
		slices.ContainsFunc(a.Routes, func(r heldRecord) bool { return against(&r.serviceRecord) }) ||
		slices.ContainsFunc(a.Corrected, func(x correctedRecord) bool { return against(&x.Record) })
}

// saidOtherwise tells whether a record that was corrected would be the answer, for a
// route or for any, beside the one that is.
func saidOtherwise(r approval.Record, now *approval.Record, when time.Time, route string) bool {
	return !r.Since.After(when) && (now == nil || !r.Since.Before(now.Since)) && (route == "" || len(r.Routes) == 0 || slices.Contains(r.Routes, route))
}

// recordsOfRoutes gives the records that hold on some routes in place of that of the
// whole network, by instant.
func recordsOfRoutes(line *approval.Line, folder string, when time.Time, network *approval.Record) []heldRecord {
	standing := line.Standing(folder)
	var ids []string
	for _, r := range standing {
		ids = append(ids, r.Routes...)
	}
	slices.Sort(ids)
	held := map[int64][]string{} // entry -> routes
	for _, id := range slices.Compact(ids) {
		if x, _ := line.InForceAt(folder, id, when); x != nil && (network == nil || x.Entry != network.Entry) {
			held[x.Entry.Seq] = append(held[x.Entry.Seq], id)
		}
	}
	list := []heldRecord{}
	for _, r := range standing {
		if on := held[r.Entry.Seq]; on != nil {
			list = append(list, heldRecord{serviceRecordOf(line, history.ServiceOf(line, r)), on})
		}
	}
	return list
}

// fillInForce adds the evidence, and the speeds at the point that was asked for.
func (a *app) fillInForce(ctx context.Context, answer *inForceAnswer, line *approval.Line, now approval.Record, when time.Time) error {
	s := history.ServiceOf(line, now)
	r := serviceRecordOf(line, s)
	answer.Record = &r
	answer.Signed = evidenceOf(line, now.Folder, now.Content, s.Through)
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	commit, err := repo.Resolve(now.Revision)
	if err != nil {
		return err
	}
	answer.Commit, answer.Subject = commit.Hash, validText(commit.Subject)
	files, err := repo.Snapshot(commit.Hash, now.Folder)
	if err != nil {
		return err
	}
	// What is approved is the content that the statement names: a commit of another one
	// would be shown as approved.
	if tree := content(files); tree != now.Content {
		return ledger.Damaged(fmt.Errorf("entry %d says that commit %s has the content %s, in Git it has %s", now.Entry.Seq, now.Revision, now.Content, tree))
	}
	if answer.Route == "" {
		return nil
	}
	data, err := schema.Load(ctx, files)
	if err != nil {
		return &sideError{"the revision in force", err}
	}
	answer.Speeds, err = speedsAt(data, answer.Route, answer.At, when)
	return err
}

// speedsAt gives the effective speeds at a point at an instant for every
// reference train and direction of travel.
func speedsAt(data *schema.Dataset, id, at string, when time.Time) ([]pointSpeed, error) {
	route := routeByID(data, id)
	if route == nil {
		return nil, badCall(meant(id, routeIDs(data), "routes in force then: "+some(routeIDs(data))), "there is no route %q", id)
	}
	s, err := located(route, "--at", at)
	if err != nil {
		return nil, err
	}
	inForce := func(t *schema.TemporaryRow) bool { return t.Valid.Overlaps(when, when) }
	var list []pointSpeed
	for _, d := range codes.AllDirections {
		if !route.Directions.Has(d) {
			continue
		}
		c := profile.New(route, d, inForce)
		for _, t := range data.Trains {
			v := c.Compile(t).At(s)
			x := pointSpeed{Train: t.ID, Direction: d.String(), Speed: int(v), Governed: []string{}}
			// The last point of a route belongs to its last piece.
			within := min(s, route.Track.Length()-1)
			for _, row := range c.Governing(c.Select(profile.ClassOf(t)), t.Length, t.Max, within, within+1, v) {
				from := c.Source(row, t)
				x.Governed = append(x.Governed, from.String())
				x.words = append(x.words, render.SourcePlace(from.Pos.File, from.Pos.Line, from.Kind))
			}
			list = append(list, x)
		}
	}
	return list, nil
}

func (a *app) printInForce(w io.Writer, x *inForceAnswer, width int) error {
	if x.Future {
		fmt.Fprintf(w, "%s\n\n", render.Hanging("! "+x.When+" lies in the future: this is what is recorded so far, nobody knows yet whether it will be so, and later records can say otherwise", width, "  "))
	}
	var apart []string
	if len(x.Routes) > 0 {
		fmt.Fprintf(w, "On single routes at %s:\n", x.When)
		for _, r := range x.Routes {
			apart = append(apart, r.HoldsOn...)
			fmt.Fprintf(w, "%s\n", render.Hanging(source.Visible(joined(r.HoldsOn))+": "+r.words(a.named), width, "  "))
		}
		fmt.Fprintln(w)
	}
	for _, c := range x.Corrected {
		fmt.Fprintf(w, "%s\n\n", wrap("Said otherwise, and not any more: "+c.words(a.named), width))
	}
	if x.Record == nil {
		_, err := fmt.Fprintf(w, "Nothing is recorded as in force on %s at %s; %s lists what is.\nhead %s\n", cmp.Or(source.Visible(x.Route), "the whole network"), x.When, source.Visible(a.advise("speedtrail inforce")), x.Head)
		return err
	}
	except := ""
	if len(apart) > 0 {
		slices.Sort(apart)
		except = ", except on " + source.Visible(joined(apart))
	}
	fmt.Fprintf(w, "In force at %s%s:\n%s\n%s\n", x.When, except, render.Hanging(x.Record.words(a.named), width, "  "), render.Hanging(source.Visible("commit "+x.Commit+", "+x.Subject), width, "  "))
	direction := ""
	names := 8 // the width of the names of trains; a longer one has a line of its own
	for _, s := range x.Speeds {
		names = max(names, min(render.Cells(source.Visible(s.Train)), 24))
	}
	for _, s := range x.Speeds {
		if s.Direction != direction {
			direction = s.Direction
			fmt.Fprintf(w, "\n%s km %s, %s\n", source.Visible(x.Route), source.Visible(x.At), direction)
		}
		name := source.Visible(s.Train)
		if render.Cells(name) > names {
			fmt.Fprintf(w, "  %s\n", name)
			name = ""
		}
		indent := strings.Repeat(" ", names+14)
		governed := render.Hanging(source.Visible(strings.Join(s.words, "; ")), max(width, len(indent)+30), indent)
		fmt.Fprintf(w, "  %s%s %3d km/h   %s\n", name, strings.Repeat(" ", names-render.Cells(name)), s.Speed, governed)
	}
	if len(x.Speeds) > 0 {
		// trace counts them all: without this line the two seem to contradict each other.
		fmt.Fprintf(w, "\n%s\n", wrap("Temporary restrictions count from valid_from to valid_to alone; one that the data still holds after its last day is not counted.", width))
	}
	fmt.Fprintf(w, "\n%s\n", render.Hanging(source.Visible(fmt.Sprintf("Evidence: recorded %s as entry %d, stated %s, key %s", x.Record.Recorded, x.Record.Entry, x.Record.Stated, x.Record.Key)+x.Record.Elsewhere.Behind()+x.Record.Revoked.Behind()), width, "  "))
	for _, e := range x.Signed {
		fmt.Fprintf(w, "%s\n", render.Hanging(source.Visible(fmt.Sprintf("%s at %s, entry %d, key %s", e.by(), e.Time, e.Entry, e.Fingerprint)+e.Elsewhere.Behind()+e.Revoked.Behind()), width, "  "))
	}
	_, err := fmt.Fprintf(w, "head %s\n%s proves the chain and the signatures\n", x.Head, source.Visible(a.advise("speedtrail verify")))
	return err
}
