package assessment

import (
	"cmp"
	"fmt"
	"strings"

	"speedtrail/schema"
)

// policy finds changes of the files that decide about changes.
func (c *collector) policy() {
	for _, f := range c.doc.Source {
		switch name := cmp.Or(f.Target, f.Base); name {
		case "signoff.toml", "allowed_signers":
			c.add(ranked{Finding: Finding{ID: PolicyChanged, Row: name, Text: name + " differs" + noteWords(f.Note) + policyWords(f, c.in.Target.Policy)}})
		}
	}
	if p := c.in.Base.Policy; p != nil {
		for _, x := range c.in.Preparers {
			if p.Person(x.Email) == nil {
				c.add(ranked{Finding: Finding{ID: UnknownPreparer, Row: "signoff.toml", Text: x.String() + " is no person of the base's policy"}})
			}
		}
	}
	for _, a := range c.in.Target.Accepted {
		if !c.inBase(a) {
			c.add(ranked{Finding: Finding{
				ID: AcceptedChanged, Route: a.Route, From: a.Span.From.String(), To: a.Span.To.String(), Row: fmt.Sprintf("%s:%d", a.Pos.File, a.Pos.Line),
				Text: "an entry of accepted.toml for " + a.Finding + " is new or altered: " + a.Reason,
			}})
		}
	}
}

// policyWords says whom and what a change of a policy file touches. Names that did not
// change are those of the target's policy, nil where it has none.
func policyWords(f SourceFile, target *schema.Policy) string {
	var parts []string
	for _, d := range f.Rows {
		who := ""
		for _, c := range d.Cells {
			switch text := cmp.Or(c.After, c.Before); c.Column {
			case "principal", "name":
				who = strings.Trim(text, `"`)
			case "line":
				who, _, _ = strings.Cut(text, " ")
			}
		}
		if who == "" && target != nil && len(d.TargetLines) > 0 {
			who = policyTable(target, d.Table, d.TargetLines[0])
		}
		var keys []string
		for _, c := range d.Cells {
			if d.Kind == "altered" && c.Column != "line" {
				keys = append(keys, c.Column+" "+cmp.Or(c.Before, "none")+" now "+cmp.Or(c.After, "none"))
			}
		}
		part := strings.Join(strings.Fields(d.Kind+" "+d.Table+" "+who), " ")
		if len(keys) > 0 {
			part += " " + strings.Join(keys, ", ")
		}
		if len(parts) == mostRows {
			parts = append(parts, fmt.Sprintf("%d more", len(f.Rows)-mostRows))
			break
		}
		parts = append(parts, part)
	}
	if parts == nil {
		return ""
	}
	return ": " + strings.Join(parts, "; ")
}

// policyTable names the person or role of a policy whose table holds a line.
func policyTable(p *schema.Policy, table string, line int) (name string) {
	switch table {
	case "person":
		for _, x := range p.Persons {
			if x.Pos.Line <= line {
				name = x.Principal
			}
		}
	case "role":
		for _, x := range p.Roles {
			if x.Pos.Line <= line {
				name = x.Name
			}
		}
	}
	return name
}

func noteWords(note string) string {
	if note == "" {
		return ""
	}
	return " (" + note + ")"
}
