package render

import (
	"slices"

	"speedtrail/history/assessment"
)

// pageRoute is a line of the table of routes.
type pageRoute struct {
	Link              pageLink
	Name              string
	Raise, Reduction  string
	Trains, Outsiders int // trains that see a change; findings outside, as the verdict counts them
}

// fewRoutes is up to how many routes the charts themselves are overview enough.
const fewRoutes = 3

// fillRoutes sums up each route that changes: between the charts of dozens nobody finds
// which routes are the ones to look at. What lies outside comes first, then by name.
func (p *page) fillRoutes() {
	outsiders := map[string]int{}
	for _, f := range p.C.Findings {
		if f.ID == assessment.Outside {
			outsiders[f.Route]++
		}
	}
	for i := range p.C.Routes {
		r := &p.C.Routes[i]
		if len(r.Changes) == 0 {
			continue
		}
		line := pageRoute{Link: pageLink{r.ID, p.firstOf(r.ID)}, Name: r.Name, Outsiders: outsiders[r.ID]}
		raise, reduction := 0, 0
		var trains []int
		for k := range r.Changes {
			x := &r.Changes[k]
			raise, reduction = max(raise, x.After-x.Before), max(reduction, x.Before-x.After)
			trains = append(trains, x.Trains...)
		}
		slices.Sort(trains)
		line.Trains = len(slices.Compact(trains))
		line.Raise, line.Reduction = stepCell(raise), stepCell(-reduction)
		p.RouteLines = append(p.RouteLines, line)
	}
	if len(p.RouteLines) <= fewRoutes {
		p.RouteLines = nil
	}
	slices.SortStableFunc(p.RouteLines, func(a, b pageRoute) int { return min(b.Outsiders, 1) - min(a.Outsiders, 1) })
}

// firstOf gives the first chart or table of a route.
func (p *page) firstOf(route string) string {
	for _, s := range p.Stretches {
		if s.Route == route {
			return s.ID
		}
	}
	for _, t := range p.Undrawn {
		if t.Route == route {
			return t.IDs[0]
		}
	}
	return ""
}

// routesShown lists the routes that have a chart or a table, for the filter.
func (p *page) routesShown() (routes []string) {
	for _, r := range p.C.Routes {
		if p.firstOf(r.ID) != "" || slices.ContainsFunc(p.Hidden, func(t pageTable) bool { return t.Route == r.ID }) {
			routes = append(routes, r.ID)
		}
	}
	return routes
}
