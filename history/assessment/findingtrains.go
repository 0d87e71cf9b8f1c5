package assessment

import (
	"cmp"
	"fmt"
	"strings"

	"speedtrail/diff"
	"speedtrail/schema/unit"
)

// trains finds reference trains that differ and that nobody declares.
func (c *collector) trains() {
	for _, t := range c.in.Account.Trains {
		if t.Fate == diff.Kept || t.Declared {
			continue
		}
		text := fmt.Sprintf("reference train %s is %s", t.ID, t.Fate)
		if t.Fate == diff.Altered {
			text += ": " + strings.Join(definitionChanges(definition(t.Before), definition(t.Train)), ", ")
		}
		c.add(ranked{Finding: Finding{ID: TrainsChanged, Row: fmt.Sprintf("%s:%d", t.Pos.File, t.Pos.Line), Text: text}})
	}
}

// definitionChanges words how a train differs.
func definitionChanges(a, b *Definition) []string {
	var list []string
	add := func(name, x, y string) {
		if x != y {
			list = append(list, fmt.Sprintf("%s %s now %s", name, cmp.Or(x, "none"), cmp.Or(y, "none")))
		}
	}
	add("name", a.Name, b.Name)
	add("cant deficiency", fmt.Sprint(a.CantDeficiency), fmt.Sprint(b.CantDeficiency))
	add("categories", strings.Join(a.Categories, "+"), strings.Join(b.Categories, "+"))
	add("axle load", a.AxleLoad, b.AxleLoad)
	add("length", unit.Distance(a.Length).M()+" m", unit.Distance(b.Length).M()+" m")
	add("maximum speed", fmt.Sprint(a.MaxSpeed), fmt.Sprint(b.MaxSpeed))
	add("acceleration", a.Acceleration, b.Acceleration)
	add("braking", a.Braking, b.Braking)
	return list
}

// requests finds declarations of which nothing is seen.
func (c *collector) requests() {
	for _, q := range c.doc.Requests {
		for _, d := range q.Declares {
			if !d.Unseen {
				continue
			}
			who := "any train"
			if len(d.Trains) > 0 {
				who = strings.Join(d.Trains, ", ")
			}
			c.add(ranked{Finding: Finding{
				ID: Unseen, Route: d.Route, Direction: d.Direction, From: d.From, To: d.To, Row: fmt.Sprintf("%s:%d", q.File, d.Line),
				Text: fmt.Sprintf("%s declares %s for %s, and no such change is seen there", q.ID, map[string]string{"raise": "a raise", "lower": "a reduction", "any": "a change"}[d.Effect], who),
			}})
		}
	}
}
