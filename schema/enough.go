package schema

import (
	"cmp"
	"math/bits"
	"slices"
	"strconv"
	"strings"

	"speedtrail/schema/source"
)

// Namespace is that of every signature of a sign-off.
const Namespace = "speedtrail-signoff"

// MaxRoles is how many roles a policy has at most.
const MaxRoles = 20

// maxEnoughSteps bounds the search for people who can take all roles. A policy of
// thirty people, however they are shared out, takes some thousands.
const maxEnoughSteps = 1 << 18

// Signs tells whether the key may sign statements of a sign-off at all; when, is
// another question.
func (k *Key) Signs() bool {
	return len(k.Namespaces) == 0 || slices.Contains(k.Namespaces, Namespace)
}

// checkEnough checks that there are people with keys for every role, and for those
// that must be taken by different people. A key counts whatever its term: the file
// does not know what time it is. Who prepares the changes to come is not known
// either, so this is the least that a policy needs and no promise.
//
// What is wrong with one role, or with two, is said of them; only where nothing is,
// all of them are looked at together.
func (r *reader) checkEnough(p *Policy) {
	if n := len(p.Roles); n > MaxRoles {
		r.faults.Add(p.Roles[MaxRoles].Pos, "%d roles, at most %d are allowed", n, MaxRoles)
		return
	}
	parts := partsOf(p)
	before := r.faults.Count()
	r.enoughForEach(p, parts)
	if r.faults.Count() > before {
		return
	}
	apart := apartIn(p)
	r.enoughForPairs(p, apart, parts)
	if r.faults.Count() > before {
		return
	}
	r.enoughForAll(p, apart, parts)
}

// partsOf gives what each person with a key may take, a bit for each role.
func partsOf(p *Policy) []uint32 {
	keyed := map[string]int{}
	for i := range p.Keys {
		if _, ok := keyed[p.Keys[i].Principal]; !ok && p.Keys[i].Signs() {
			keyed[p.Keys[i].Principal] = len(keyed)
		}
	}
	parts := make([]uint32, len(keyed))
	for i := range p.Roles {
		if len(p.Roles[i].Signers) == 0 {
			for person := range parts {
				parts[person] |= 1 << i
			}
		}
		for _, s := range p.Roles[i].Signers {
			if person, ok := keyed[s]; ok {
				parts[person] |= 1 << i
			}
		}
	}
	return parts
}

// able counts the people who may take one of some roles.
func able(parts []uint32, roles uint32) (n int) {
	for _, part := range parts {
		if part&roles != 0 {
			n++
		}
	}
	return n
}

// apartIn gives for each role those that others must take, a bit for each.
func apartIn(p *Policy) []uint32 {
	apart := make([]uint32, len(p.Roles))
	for i := range p.Roles {
		for j := range i {
			if p.Independent(p.Roles[j].Name, p.Roles[i].Name) {
				apart[i] |= 1 << j
				apart[j] |= 1 << i
			}
		}
	}
	return apart
}

func (r *reader) enoughForEach(p *Policy, parts []uint32) {
	for i := range p.Roles {
		if role, n := &p.Roles[i], able(parts, 1<<i); n < role.Needed {
			r.faults.Add(role.Places.Needed, "role %s needs %d people with a key in %s and has %d", source.Quote(role.Name), role.Needed, signersFile, n)
		}
	}
}

func (r *reader) enoughForPairs(p *Policy, apart, parts []uint32) {
	for i := range p.Roles {
		for j := range i {
			a, b := &p.Roles[j], &p.Roles[i]
			if n := able(parts, 1<<i|1<<j); apart[i]&(1<<j) != 0 && n < a.Needed+b.Needed {
				r.faults.Add(b.Pos, "roles %s and %s need %d different people with a key in %s and have %d",
					source.Quote(a.Name), source.Quote(b.Name), a.Needed+b.Needed, signersFile, n)
			}
		}
	}
}

func (r *reader) enoughForAll(p *Policy, apart, parts []uint32) {
	s := newEnough(p.Roles, apart, parts)
	if s.from(0) {
		return
	}
	var names []string
	var at source.Position
	for i := range p.Roles {
		if apart[i] != 0 {
			names = append(names, source.Quote(p.Roles[i].Name))
			at = p.Roles[i].Pos
		}
	}
	list := strings.Join(names, ", ")
	if s.steps > maxEnoughSteps {
		r.faults.Add(at, "whether there are people for all of the roles %s cannot be told, they are too many and too entangled; take fewer roles or fewer people for each", list)
		return
	}
	r.faults.Add(at, "roles %s must be taken by different people, and those who have a key in %s are too few for all of them together", list, signersFile)
}

// enough looks for people who can take all roles, when some roles must be taken by
// different people and others need not. Every way is tried, so the answer is exact
// unless the steps give out; what was found to fail is not tried again.
type enough struct {
	apart []uint32 // for each role those that the same person may not take
	parts []uint32 // what each person may take
	left  []int    // how many people each role still needs
	fails map[string]bool
	steps int
}

// newEnough leaves out roles that anybody may take besides others, since counting
// does for them, and people who can take nothing else. Those who have the least
// choice come first, and those with the same choice beside one another.
func newEnough(roles []Role, apart, parts []uint32) *enough {
	s := &enough{apart: apart, left: make([]int, len(roles)), fails: map[string]bool{}}
	all, sum := uint32(0), 0
	for i, others := range apart {
		if others != 0 {
			all |= 1 << i
			s.left[i] = roles[i].Needed
			sum += roles[i].Needed
		}
	}
	same := map[uint32]int{}
	for _, part := range parts {
		// More people of the same choice than are needed in all change nothing.
		if part &= all; part != 0 && same[part] < sum {
			same[part]++
			s.parts = append(s.parts, part)
		}
	}
	slices.SortFunc(s.parts, func(a, b uint32) int {
		return cmp.Or(bits.OnesCount32(a)-bits.OnesCount32(b), cmp.Compare(a, b))
	})
	return s
}

// from tells whether the people from one on can take what is left.
func (s *enough) from(person int) bool {
	needed := uint32(0)
	for i, n := range s.left {
		if n > 0 {
			needed |= 1 << i
		}
	}
	if needed == 0 {
		return true
	}
	if person == len(s.parts) {
		return false
	}
	state := strconv.AppendInt(nil, int64(person), 10)
	for _, n := range s.left {
		state = append(state, ' ', byte(n)) // at most 100
	}
	if s.fails[string(state)] {
		return false
	}
	if s.choose(person, s.parts[person]&needed) {
		return true
	}
	s.fails[string(state)] = true
	return false
}

// choose lets a person take some of the roles that are free to her: the first of
// them, or, where it keeps her from another one, not the first.
func (s *enough) choose(person int, free uint32) bool {
	if s.steps++; s.steps > maxEnoughSteps {
		return false
	}
	if free == 0 {
		return s.from(person + 1)
	}
	first := bits.TrailingZeros32(free)
	free &^= 1 << first
	s.left[first]--
	if s.choose(person, free&^s.apart[first]) {
		return true
	}
	s.left[first]++
	return free&s.apart[first] != 0 && s.choose(person, free)
}
