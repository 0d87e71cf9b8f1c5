package assessment

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/diff"
	"speedtrail/diff/fleet"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// unseenBy is the trains of a product that change where no reference train of
// theirs does.
type unseenBy struct {
	product    fleet.Product
	raised     bool
	directions codes.Directions
	hidden     bool // only without temporary restrictions
	changes    []diff.FleetChange
	largest    diff.FleetChange
	causes     [][]diff.Cause // of each change, for this product
}

// unrepresented finds changes that only trains see which no reference train
// stands for: one finding for each kind of train and sense.
func (c *collector) unrepresented(r *diff.Route) {
	var list []unseenBy
	for _, f := range r.Fleet {
		for _, x := range f.Changes {
			for k, p := range x.Products {
				if !x.Represented[k] {
					list = note(list, x, p, f, x.Causes[k])
				}
			}
		}
	}
	for _, u := range list {
		c.add(c.unrepresentedFinding(r, u))
	}
	for _, f := range r.Fleet {
		if len(f.LeftOut.Lengths) > 0 {
			c.add(leftOutFinding(r, &f))
		}
	}
}

// leftOutFinding says that there is more than an account looks at: nobody knows
// whether a reference train stands for it.
func leftOutFinding(r *diff.Route, f *diff.Fleet) ranked {
	text := "changes that only trains of " + lengthsBetween(f.LeftOut.Lengths) + " see are not listed, and no reference train was held against them"
	if f.Permanent {
		text += ", without temporary restrictions"
	}
	track := r.Target.Track
	return ranked{Finding: Finding{
		ID: NotRepresented, Route: r.ID, Direction: f.Direction.String(),
		From: track.Begins(f.LeftOut.From).String(), To: track.Ends(f.LeftOut.To).String(), Text: text,
	}}
}

// lengthsBetween words lengths of trains: the first few, and how many more.
func lengthsBetween(list []unit.Distance) string {
	var parts []string
	for _, l := range list[:min(len(list), mostRows)] {
		parts = append(parts, l.M()+" m")
	}
	text := strings.Join(parts, ", ")
	if more := len(list) - mostRows; more > 0 {
		text += fmt.Sprintf(" and %d more lengths", more)
	}
	return text
}

// note adds a change to the entry of its trains and sense.
func note(list []unseenBy, x diff.FleetChange, p fleet.Product, f diff.Fleet, causes []diff.Cause) []unseenBy {
	raised := x.After > x.Before
	i := slices.IndexFunc(list, func(u unseenBy) bool { return u.product == p && u.raised == raised && u.hidden == f.Permanent })
	if i < 0 {
		list = append(list, unseenBy{product: p, raised: raised, hidden: f.Permanent, largest: x})
		i = len(list) - 1
	}
	u := &list[i]
	u.changes, u.causes = append(u.changes, x), append(u.causes, causes)
	u.directions |= 1 << f.Direction
	if abs(x.After-x.Before) > abs(u.largest.After-u.largest.Before) {
		u.largest = x
	}
	return list
}

func (c *collector) unrepresentedFinding(r *diff.Route, u unseenBy) ranked {
	track := r.Target.Track
	first, last := u.changes[0].Target, u.changes[0].Target+u.changes[0].Length
	top := unit.Speed(0)
	for _, x := range u.changes {
		first, last = min(first, x.Target), max(last, x.Target+x.Length)
		top = max(top, x.Before, x.After)
	}
	word := "raised"
	if !u.raised {
		word = "lowered"
	}
	text := fmt.Sprintf("%s: %s by up to %d km/h, %d to %d", u.product, word, abs(u.largest.After-u.largest.Before), u.largest.Before, u.largest.After)
	places := map[[2]unit.Distance]bool{}
	for _, x := range u.changes {
		places[[2]unit.Distance{x.Target, x.Length}] = true
	}
	if n := len(places); n > 1 {
		text += fmt.Sprintf(", in %d pieces", n)
	}
	if u.hidden {
		text += ", without temporary restrictions"
	}
	return ranked{
		Finding: Finding{
			ID: NotRepresented, Route: r.ID, Direction: u.directions.String(), From: track.Begins(first).String(), To: track.Ends(last).String(),
			Row: causesText(r, u.causes), Text: text, Example: c.example(r.ID, u, top),
		},
		raised: u.raised, step: int(abs(u.largest.After - u.largest.Before)),
		structure: u.product.Axle != 1<<codes.AxleLoads-1,
	}
}

// example writes a reference train that shows the change, for trains.toml.
func (c *collector) example(route string, u unseenBy, top unit.Speed) string {
	class := u.product.Example()
	length := u.largest.Lengths[0] / unit.Metre
	var categories, names []string
	for k := range codes.Category(codes.Categories) {
		if class.Categories.Has(k) {
			categories, names = append(categories, fmt.Sprintf("%q", k)), append(names, k.String())
		}
	}
	// Two examples have one id only if they are the same train.
	names = append(names, class.AxleLoad.String(), fmt.Sprintf("%dm", length), fmt.Sprint(top))
	id := fmt.Sprintf("X-%d-%s", class.Cant.MM(), strings.Join(names, "-"))
	for n, first := 2, id; slices.ContainsFunc(c.in.Account.Trains, func(t diff.Train) bool { return t.ID == id }); n++ {
		id = fmt.Sprintf("%s-%d", first, n)
	}
	var b strings.Builder
	fmt.Fprintf(&b, "[[train]]\nid = %q\nname = \"Shows a change on %s\"\ncant_deficiency_mm = %d\n", id, route, class.Cant.MM())
	if len(categories) > 0 {
		fmt.Fprintf(&b, "categories = [%s]\n", strings.Join(categories, ", "))
	}
	fmt.Fprintf(&b, "axle_load = %q\nlength_m = %d\nmax_speed_kmh = %d\n", class.AxleLoad, length, top)
	return b.String()
}
