package history_test

import (
	"context"
	"errors"
	"slices"
	"strings"

	"speedtrail/history"
	"speedtrail/history/assessment"
)

// commit is one of the repository that the tests invent.
type commit struct {
	parent, tree, policy string
	authors              []string // addresses
	findings             []string // ids, "id=reason" for an accepted one
}

// repository is what Git holds, by name. It is a history.Checker.
//
//	a - b - c - d - g (empty)      c turns the keys over
//	     \       \- f              f is a sibling of d
//	      (a) - e                  eva, who is no person, had a part in e
//	c - h, i                       h turns to a policy in which dan has another name
//	a - m - o                      mal writes a policy of his own into m
//	c - n - q                      n has no policy
//	c - l - p, t - u               l has a lax policy, t a key of two principals
//	x                              has no common ancestor
//	s                              its history ends at a shallow boundary
type repository struct {
	commits map[string]commit
	rules   map[string]bool   // targets whose assessments were made by other rules
	content map[string]string // commit -> tree, where it differs from what was recorded
	policy  map[string]string // commit -> policy
}

func newRepository() *repository {
	dan := []string{"dan@tarn.example"}
	return &repository{rules: map[string]bool{}, content: map[string]string{}, policy: map[string]string{}, commits: map[string]commit{
		"a": {"", "a", "P1", dan, nil},
		"b": {"a", "b", "P1", dan, []string{"outside", "masked", "masked=renewed next week"}},
		"r": {"b", "a", "P1", dan, nil}, // takes b back
		"c": {"b", "c", "P2", dan, []string{"policy-changed"}},
		"d": {"c", "d", "P2", dan, nil},
		"e": {"a", "e", "P1", []string{"dan@users.example", "eva@fell.example"}, nil},
		"f": {"c", "f", "P2", dan, nil},
		"g": {"d", "d", "P2", []string{"cem@users.example"}, nil},
		"h": {"c", "h", "P3", dan, []string{"policy-changed"}},
		"i": {"c", "i", "P2", dan, nil},
		"m": {"a", "m", "own", dan, []string{"policy-changed"}},
		"o": {"m", "o", "own", dan, nil},
		"n": {"c", "n", "none", dan, nil},
		"q": {"n", "q", "P2", dan, nil},
		"l": {"c", "l", "lax", dan, []string{"policy-changed"}},
		"p": {"l", "p", "lax", dan, nil},
		"t": {"c", "t", "two", dan, []string{"policy-changed"}},
		"u": {"t", "u", "P2", dan, nil},
		"x": {"", "x", "P2", dan, nil},
		"s": {"shallow", "s", "P2", dan, nil},
	}}
}

// document is what an honest assessment of two commits says.
func (r *repository) document(base, target string) *assessment.Document {
	b, t := r.commits[base], r.commits[target]
	revision := func(name string, c commit) assessment.Revision {
		return assessment.Revision{Author: assessment.Person{Email: c.authors[0], Name: "Author"}, Commit: commitOf(name), Committed: "2026-02-27T10:00:00Z", Subject: "Commit " + name, Tree: treeOf(c.tree)}
	}
	policy := func(name string) assessment.Policy {
		s, k := policyFiles(name)
		return assessment.Policy{AllowedSigners: k, SignOff: s}
	}
	d := &assessment.Document{Format: assessment.Format, Named: assessment.Named{Base: base, Target: target}}
	c := &d.Computed
	c.At, c.Dataset, c.Folder, c.RulesVersion = "2026-02-28T12:00:00Z", "Tarn", ".", 2
	c.Base, c.Target = revision(base, b), revision(target, t)
	c.Policy = assessment.Policies{Base: policy(b.policy), Target: policy(t.policy)}
	at := target
	for at != base && at != "" && at != "shallow" {
		for _, email := range r.commits[at].authors {
			p := assessment.Person{Email: email, Name: "Author"}
			if !slices.Contains(c.Preparers, p) {
				c.Preparers = append(c.Preparers, p)
			}
		}
		at = r.commits[at].parent
	}
	ids := t.findings
	switch at {
	case "":
		ids = append([]string{assessment.BaseNotAncestor}, ids...)
	case "shallow":
		c.Preparers = nil
	}
	for _, id := range ids {
		id, accepted, _ := strings.Cut(id, "=")
		c.Findings = append(c.Findings, assessment.Finding{ID: id, Accepted: accepted, Route: "R1", Direction: "nominal", From: "1", To: "2", Text: "see for yourself"})
	}
	c.Requests = []assessment.Request{{ID: "CR-" + target, Title: "Request " + target, Reason: "renewed", File: "requests/cr.toml"}}
	c.Trains = []assessment.Train{{ID: "T1", Fate: "kept"}, {ID: "T2", Fate: "kept"}}
	c.Routes = []assessment.Route{{ID: "R1", Name: "Route", Fate: "kept", Folder: "routes/r1", Start: "0", End: "5", Causes: [][]assessment.Cause{{}}, Pieces: [][]assessment.Piece{{}},
		Sources: [][]assessment.Source{{{File: "routes/r1/speed.csv", Kind: "basic", Line: 3, Value: 60}}, {{File: "routes/r1/speed.csv", Kind: "basic", Line: 3, Value: 80}}},
		Changes: []assessment.Change{
			{Direction: "nominal", From: "1", To: "2", Length: 1_000_000, Start: 1_000_000, Before: 60, After: 80, BeforeSource: 0, AfterSource: 1, Trains: []int{0, 1}},
			{Direction: "reverse", From: "2", To: "1", Length: 1_000_000, Start: 3_000_000, Before: 60, After: 80, BeforeSource: 0, AfterSource: 1, Trains: []int{0}, RunOut: true},
		},
	}}
	return d
}

// encoded gives the body and digest of a document.
func encoded(d *assessment.Document) (body []byte, digest string) {
	body, digest, err := d.Encode()
	if err != nil {
		panic(err)
	}
	return body, digest
}

// named finds the name of a commit; empty where there is none.
func (r *repository) named(hash string) string {
	for name := range r.commits {
		if commitOf(name) == hash {
			return name
		}
	}
	return ""
}

// Recompute makes the honest document of the two commits.
func (r *repository) Recompute(_ context.Context, d *assessment.Document) (string, error) {
	base, target := r.named(d.Computed.Base.Commit), r.named(d.Computed.Target.Commit)
	if base == "" {
		return "", &history.LackingError{Side: "base", Commit: d.Computed.Base.Commit, Todo: "fetch it"}
	}
	if target == "" {
		return "", &history.LackingError{Side: "target", Commit: d.Computed.Target.Commit, Todo: "fetch it"}
	}
	if r.rules[target] {
		return "", history.ErrOtherRules
	}
	if tree, ok := r.content[target]; ok {
		c := r.commits[target]
		c.tree = tree
		other := newRepository()
		other.commits[target] = c
		_, digest := encoded(other.document(base, target))
		return digest, nil
	}
	_, digest := encoded(r.document(base, target))
	return digest, nil
}

// Content gives the tree and the policy of a commit.
func (r *repository) Content(_ context.Context, hash, _ string) (history.Content, error) {
	name := r.named(hash)
	if name == "" {
		return history.Content{}, errors.New("there is no such commit")
	}
	c := r.commits[name]
	if other, ok := r.content[name]; ok {
		c.tree = other
	}
	if other, ok := r.policy[name]; ok {
		c.policy = other
	}
	signOff, allowedSigners := policyFiles(c.policy)
	return history.Content{Tree: treeOf(c.tree), SignOff: signOff, AllowedSigners: allowedSigners}, nil
}
