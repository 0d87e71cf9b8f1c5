package main

import (
	"fmt"
	"strings"

	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// showPolicy says whom a policy lets do what, before somebody signs its hash as the
// root of all approvals.
func (a *app) showPolicy(p *schema.Policy) {
	a.endProgress()
	line := func(format string, args ...any) {
		text := wrap(source.Visible(fmt.Sprintf(format, args...)), 78)
		fmt.Fprintf(a.err, "  %s\n", strings.ReplaceAll(text, "\n", "\n    "))
	}
	fmt.Fprintln(a.err, "The policy:")
	for _, r := range p.Roles {
		who, apart := "any person", ""
		if len(r.Signers) > 0 {
			who = joined(r.Signers)
		}
		if len(r.IndependentOf) > 0 {
			apart = ", independent of " + joined(r.IndependentOf)
		}
		line("role %s: needed %d, of %s%s", r.Name, r.Needed, who, apart)
	}
	for _, x := range p.Persons {
		line("person %s: %s", x.Principal, joined(x.Emails))
	}
	for _, k := range p.Keys {
		terms := ""
		if !k.ValidAfter.IsZero() {
			terms += ", from " + k.ValidAfter.UTC().Format(signoff.TimeLayout)
		}
		if !k.ValidBefore.IsZero() {
			terms += ", to " + k.ValidBefore.UTC().Format(signoff.TimeLayout)
		}
		if !k.Signs() {
			terms += ", for other namespaces than " + schema.Namespace
		}
		line("key %s of %s%s", k.Fingerprint, k.Principal, terms)
	}
	fmt.Fprintln(a.err)
}
