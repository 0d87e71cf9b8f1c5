package render

import "speedtrail/history/assessment"

// fillUndrawn lists the changes outside all declarations that have no chart, as far as
// the page has room, and counts the others. Charts are those of the largest steps, and
// what nobody has asked for need not be among them.
func (p *page) fillUndrawn() {
	n := 0
	for i := range p.C.Routes {
		r := &p.C.Routes[i]
		var list []*assessment.Change
		flush := func() {
			room := max(0, min(len(list), mostHTMLRows-p.ShownRows))
			p.UndrawnLeft += len(list) - room
			if room > 0 {
				p.Undrawn = append(p.Undrawn, p.table(r, list[:room], "u", n))
				n, p.ShownRows = n+room, p.ShownRows+room
			}
			list = nil
		}
		for k := range r.Changes {
			x := &r.Changes[k]
			switch {
			case p.drawn[x]:
			case !isOutside(p.C, r, x.Pieces):
				p.UndrawnLeft++
			default:
				if len(list) > 0 && list[0].Direction != x.Direction {
					flush()
				}
				list = append(list, x)
			}
		}
		flush()
	}
}
