package assessment

import (
	"cmp"
	"fmt"
	"slices"

	"speedtrail/diff/doubt"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/parallel"
	"speedtrail/schema/unit"
)

// The ids of the findings that nobody can accept.
const (
	Outside           = "outside"
	Unseen            = "unseen"
	NotRepresented    = "not-represented"
	Masked            = "masked"
	DatesChanged      = "dates-changed"
	PolicyChanged     = "policy-changed"
	AcceptedChanged   = "accepted-changed"
	BaseNotAncestor   = "base-not-ancestor"
	TrainsChanged     = "trains-changed"
	RunOutLeavesRoute = "run-out-leaves-route"
	UnknownPreparer   = "unknown-preparer"
)

// Swapped is the text of BaseNotAncestor where the target lies before the base.
const Swapped = "the target is part of the base's history, and the base not of the target's: the two were perhaps swapped"

// order is the one in which findings are looked at: what is wrong with the
// comparison as a whole, what moves a speed unannounced, what nobody sees, what
// is announced and did not happen, the rest.
var order = append([]string{
	BaseNotAncestor, UnknownPreparer, PolicyChanged, AcceptedChanged, Outside, Masked, DatesChanged, NotRepresented, TrainsChanged, Unseen, RunOutLeavesRoute,
}, doubt.IDs...)

// explained says of each kind why it matters and what to do.
var explained = map[string][2]string{
	Outside: {"Nobody has asked for this change, and nobody may have looked at it.",
		"Find out whether it is meant; declare it in a change request, or take it back."},
	Unseen: {"What was asked for has not happened, or somewhere else.",
		"Look whether the row, the route, the sense or the trains of the declaration are the ones that were meant."},
	NotRepresented: {"A train of this kind that runs, or will run, is faster or slower, and no reference train shows it.",
		"Add the train below to trains.toml, or see that no such train runs here."},
	Masked: {"The change is hidden by temporary restrictions today and appears when they end.",
		"Have it declared and checked like any other change."},
	DatesChanged: {"A temporary restriction begins or ends at another time. All of them count in a comparison, whatever their dates, so that no speed changes there, or less than on the track.",
		"See that the dates are meant: where a restriction ends, trains go faster."},
	PolicyChanged: {"Who may approve changes is itself changed here.",
		"Have the people checked who may sign; the policy of the base decides about this change."},
	AcceptedChanged: {"A change cannot accept its own findings.",
		"Have the entry looked at by itself; it counts from the next change on."},
	UnknownPreparer: {"Whoever prepared the change may not check it, and nobody can tell who this is: the change cannot be approved.",
		"Add the address to its person in signoff.toml, in a change of its own that is approved first."},
	BaseNotAncestor: {"The target does not hold everything that the base holds: changes of the base can silently be undone.",
		"Compare with the last common release, or merge the base into the target first."},
	TrainsChanged: {"The trains that everything is looked at with are not those of the base.",
		"Have the change of the train declared by name with effect \"any\", and look at what the former train would have shown."},
	RunOutLeavesRoute: {"The row holds for the length of a train beyond the end of the route; the neighbouring route is not looked at.",
		"Look at the neighbouring route by hand."},
	doubt.CurveSpeed: {"A train of the category would run with more cant deficiency than it admits.",
		"Check radius, cant and speed against the design."},
	doubt.CantExcess: {"Slow trains load the inner rail of the curve beyond the limit of the network.",
		"Check cant and speed against the design."},
	doubt.CategoryOrder: {"A train that admits more cant deficiency would be slower than one that admits less.",
		"Check whether the two cells are exchanged or one is outdated."},
	doubt.AxleLoadOrder: {"A heavier train may run faster than a lighter one; the categories are not strictly ordered, so this is a question.",
		"Check the row against the assessment of the structure."},
	doubt.AxleLoadMissing: {"A category without a speed is not restricted at all (SUBSET-026 3.11.4.3): the row binds other trains, not this one.",
		"Give the category its speed, or accept the gap."},
	doubt.ShortStretch: {"A speed that holds for so short a stretch is often the remainder of another change.",
		"Check whether the row is still meant."},
	doubt.StepSize: {"A step of this size is often a mistyped speed.",
		"Check both speeds."},
	doubt.TemporaryExpired: {"The restriction still slows the computed profiles, or it is still needed and its dates are not.",
		"Remove the row or correct its dates."},
	doubt.TemporaryNoEffect: {"The restriction protects nothing.",
		"Check its speed and place."},
	doubt.DelayOverBridge: {"A train can accelerate while its rear still loads the bridge.",
		"Check train_length_delay."},
	doubt.DelayOneSided: {"The same stretch lets go of trains earlier in one direction than in the other.",
		"Check train_length_delay of both rows."},
	doubt.CrossingWarning: {"Road users would be warned too late.",
		"Check speed, strike-in and warning time; permanent speeds decide, temporary restrictions end."},
}

// collector gathers findings.
type collector struct {
	in   *Input
	doc  *Computed
	list []ranked
}

// ranked is a finding with what it is sorted by.
type ranked struct {
	Finding
	raised, structure, runOut bool
	step                      int
}

// findings lists what needs eyes, in the order in which to look, and the entries
// of accepted.toml.
func findings(in *Input, doc *Computed) ([]Finding, []Acceptance) {
	c := &collector{in: in, doc: doc}
	if !in.BaseIsAncestor {
		text := "the base is not part of the target's history"
		if in.TargetIsAncestor {
			text = Swapped
		}
		c.add(ranked{Finding: Finding{ID: BaseNotAncestor, Text: text}})
	}
	c.policy()
	c.zone()
	c.trains()
	perRoute := make([]collector, len(in.Account.Routes))
	parallel.Each(len(perRoute), func(i int) {
		perRoute[i] = collector{in: in, doc: doc}
		perRoute[i].route(i)
	})
	for i := range perRoute {
		c.list = append(c.list, perRoute[i].list...)
	}
	c.requests()
	c.joinDirections()
	acceptances := c.accept()
	return c.inOrder(), acceptances
}

// inOrder gives the findings in the order in which to look at them.
func (c *collector) inOrder() []Finding {
	slices.SortStableFunc(c.list, func(a, b ranked) int {
		return cmp.Or(
			before(a.Accepted == "", b.Accepted == ""),
			cmp.Compare(slices.Index(order, a.ID), slices.Index(order, b.ID)),
			before(!a.AlsoInBase, !b.AlsoInBase),
			before(a.raised, b.raised), before(a.structure, b.structure), before(!a.runOut, !b.runOut), cmp.Compare(b.step, a.step),
		)
	})
	list := make([]Finding, len(c.list))
	for i, f := range c.list {
		list[i] = f.Finding
	}
	return list
}

// joinDirections makes one finding of two that say the same of both directions
// of travel.
func (c *collector) joinDirections() {
	opposite := map[string]string{
		codes.Nominal.String(): codes.Reverse.String(), codes.Reverse.String(): codes.Nominal.String(),
	}
	list := c.list[:0]
	alone := map[Finding][]int{} // places in list of findings of one direction
	for _, f := range c.list {
		other := f.Finding
		other.Direction = opposite[f.Direction]
		if other.Direction != "" {
			if at := alone[other]; len(at) > 0 {
				list[at[0]].Direction = codes.Both.String()
				alone[other] = at[1:]
				continue
			}
			alone[f.Finding] = append(alone[f.Finding], len(list))
		}
		list = append(list, f)
	}
	c.list = list
}

// explanations says of each kind of finding in a list why it matters and what to
// do, in the order of the kinds.
func explanations(list []Finding) []Explanation {
	have := map[string]bool{}
	for _, f := range list {
		have[f.ID] = true
	}
	out := []Explanation{}
	for _, id := range order {
		if have[id] {
			out = append(out, Explanation{ID: id, Why: explained[id][0], Do: explained[id][1]})
		}
	}
	return out
}

// before sorts what is true first.
func before(a, b bool) int {
	switch {
	case a == b:
		return 0
	case a:
		return -1
	}
	return 1
}

func (c *collector) add(f ranked) {
	c.list = append(c.list, f)
}

// route finds what needs eyes on a route.
func (c *collector) route(index int) {
	r := &c.in.Account.Routes[index]
	if c.in.Account.Reconciled {
		c.outside(index)
		c.outsideTrack(index)
	}
	c.masked(index)
	c.dated(r)
	c.unrepresented(r)
	for _, l := range r.Leaving {
		of := r.Target
		if l.OfBase {
			of = r.Base
		}
		what, track := "the row differs and reaches", of.Track
		switch {
		case r.Base == nil:
			what = "the route is new, and the row reaches"
		case r.Target == nil:
			what = "the route is there no more, and the row reached"
		case !r.Base.Directions.Has(l.Direction):
			what = "the direction is new, and the row reaches"
		case !r.Target.Directions.Has(l.Direction):
			what = "the direction is there no more, and the row reached"
		case l.ByTrack && l.OfBase:
			what = "the track before the end of the route differs, and the row, which is the same, reaches no more"
		case l.ByTrack:
			what = "the track before the end of the route differs, and the row, which is the same, reaches another length"
		case l.OfBase:
			what = "the row of the base reached, and does no more,"
		}
		c.add(ranked{Finding: Finding{
			ID: RunOutLeavesRoute, Route: r.ID, Direction: l.Direction.String(), Row: rowText(l.Row),
			From: track.Begins(l.Row.Start).String(), To: track.Ends(l.Row.End).String(),
			Text: fmt.Sprintf("%s beyond the end of the route with a train of %s m", what, l.Longest.M()),
		}})
	}
	if r.Target == nil {
		return
	}
	before := map[Finding]bool{}
	if r.Base != nil {
		for _, d := range doubt.Check(r.Base, c.in.Base, c.in.At) {
			before[doubtful(r.Base, d, d.Key)] = true
		}
	}
	judged := *c.in.Target
	judged.Limits = stricter(c.in.Base.Limits, judged.Limits)
	c.doubtful(r.Target, &judged, before)
}

// doubtful finds the doubtful data of a route of a data set. before has what the base
// has, without its rows.
func (c *collector) doubtful(r *schema.Route, d *schema.Dataset, before map[Finding]bool) {
	for _, x := range doubt.Check(r, d, c.in.At) {
		f := doubtful(r, x, x.Text)
		f.AlsoInBase = before[doubtful(r, x, x.Key)]
		f.Row = fmt.Sprintf("%s:%d", x.Row.File, x.Row.Line)
		c.add(ranked{Finding: f})
	}
}

// stricter gives the stricter of each limit of two revisions: a change does not
// switch off the checks that judge it, as it does not accept its own findings.
func stricter(base, target schema.Limits) schema.Limits {
	least := func(a, b int) int {
		if a == 0 || b == 0 {
			return max(a, b)
		}
		return min(a, b)
	}
	return schema.Limits{
		CantExcessMM:    least(base.CantExcessMM, target.CantExcessMM),
		LargestStep:     unit.Speed(least(int(base.LargestStep), int(target.LargestStep))),
		ShortestStretch: max(base.ShortestStretch, target.ShortestStretch),
	}
}

// limits writes the limits that judge a change.
func limits(base, target schema.Limits) Limits {
	l := stricter(base, target)
	return Limits{
		CantExcess: l.CantExcessMM, LargestStep: int(l.LargestStep), ShortestStretch: int64(l.ShortestStretch), Unchecked: doubt.Unchecked(l),
	}
}

// doubtful words doubtful data of a route, without its row.
func doubtful(r *schema.Route, d doubt.Doubt, text string) Finding {
	f := Finding{ID: d.ID, Route: r.ID, Direction: d.Directions.String(), From: r.Track.Begins(d.From).String(), To: r.Track.Ends(d.To).String(), Text: text}
	if d.From == d.To {
		f.To = f.From // the two readings of a joint are no stretch
	}
	return f
}
