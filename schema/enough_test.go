package schema

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// peopled makes a policy with a role for each needed number and a person with a
// key for each list of the roles that he may take, a bit for each.
func peopled(needed []int, apart [][2]int, parts []uint32) *Policy {
	p := &Policy{}
	for i, n := range needed {
		p.Roles = append(p.Roles, Role{Name: fmt.Sprint("r", i), Needed: n, Signers: []string{"nobody"}})
	}
	for _, pair := range apart {
		p.Roles[pair[0]].IndependentOf = append(p.Roles[pair[0]].IndependentOf, p.Roles[pair[1]].Name)
	}
	for i, part := range parts {
		name := fmt.Sprint("p", i)
		p.Persons = append(p.Persons, Person{Principal: name})
		p.Keys = append(p.Keys, Key{Principal: name})
		for role := range needed {
			if part&(1<<role) != 0 {
				p.Roles[role].Signers = append(p.Roles[role].Signers, name)
			}
		}
	}
	return p
}

func enoughProblem(p *Policy) string {
	r := &reader{}
	r.checkEnough(p)
	if err := r.faults.Err(); err != nil {
		return err.Error()
	}
	return ""
}

// met tries every way to share out the roles, person by person.
func met(p *Policy, person int, taken []int) bool {
	if person == len(p.Persons) {
		for i, role := range p.Roles {
			if taken[i] < role.Needed {
				return false
			}
		}
		return true
	}
	for set := range 1 << len(p.Roles) {
		next, fits := slices.Clone(taken), true
		for i, a := range p.Roles {
			if set&(1<<i) == 0 {
				continue
			}
			next[i]++
			fits = fits && a.May(p.Persons[person].Principal)
			for j, b := range p.Roles[:i] {
				fits = fits && (set&(1<<j) == 0 || !p.Independent(a.Name, b.Name))
			}
		}
		if fits && met(p, person+1, next) {
			return true
		}
	}
	return false
}

// TestEnough: a policy is refused where no way to share out its roles does, and
// nowhere else.
func TestEnough(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	count := [2]int{}
	for range 3000 {
		var needed []int
		for range 1 + random.IntN(4) {
			needed = append(needed, 1+random.IntN(2))
		}
		var apart [][2]int
		for i := range needed {
			for j := range i {
				if random.IntN(3) > 0 {
					apart = append(apart, [2]int{i, j})
				}
			}
		}
		var parts []uint32
		for range random.IntN(6) {
			parts = append(parts, uint32(random.IntN(1<<len(needed))|random.IntN(1<<len(needed))))
		}
		p := peopled(needed, apart, parts)
		want := met(p, 0, make([]int, len(needed)))
		problem := enoughProblem(p)
		if (problem == "") != want {
			t.Fatalf("needed %v, apart %v, people %b: %q, can be met: %t", needed, apart, parts, problem, want)
		}
		if want {
			count[1]++
		} else {
			count[0]++
		}
	}
	if count[0] < 500 || count[1] < 500 {
		t.Errorf("%d cannot be met and %d can: the cases are one-sided", count[0], count[1])
	}
}

// A ring of five roles: any two and any three can be shared out among two people,
// the five cannot.
func TestEnoughRing(t *testing.T) {
	ring := [][2]int{{0, 1}, {1, 2}, {2, 3}, {3, 4}, {4, 0}}
	one := []int{1, 1, 1, 1, 1}
	if got := enoughProblem(peopled(one, ring, []uint32{31, 31})); !strings.Contains(got, `"r4" must be taken by different people`) {
		t.Errorf("two people: %q", got)
	}
	if got := enoughProblem(peopled(one, ring, []uint32{31, 31, 31})); got != "" {
		t.Errorf("three people: %s", got)
	}
}

// TestEnoughBounds: large policies are quick where there are people in plenty, and
// no policy takes long.
func TestEnoughBounds(t *testing.T) {
	var needed []int
	var apart [][2]int
	for i := range MaxRoles {
		needed = append(needed, 100)
		for j := range i {
			apart = append(apart, [2]int{i, j})
		}
	}
	all := uint32(1<<MaxRoles - 1)
	if got := enoughProblem(peopled(needed, apart, slices.Repeat([]uint32{all}, 100*MaxRoles))); got != "" {
		t.Errorf("as many as are needed: %s", got)
	}
	if got := enoughProblem(peopled(needed, apart, slices.Repeat([]uint32{all}, 100*MaxRoles-1))); !strings.Contains(got, "cannot be told") {
		t.Errorf("one too few: %q", got)
	}
	// As a railway may have it: four roles of different people, and thirty of them
	// with one too few for all.
	parts := slices.Concat(slices.Repeat([]uint32{0b0111}, 10), slices.Repeat([]uint32{0b1110}, 10), slices.Repeat([]uint32{0b1011}, 10))
	four := [][2]int{{0, 1}, {0, 2}, {0, 3}, {1, 2}, {1, 3}, {2, 3}}
	if got := enoughProblem(peopled([]int{8, 8, 8, 7}, four, parts)); !strings.Contains(got, "too few for all of them together") {
		t.Errorf("thirty people for 31: %q", got)
	}
	if got := enoughProblem(peopled([]int{8, 8, 8, 6}, four, parts)); got != "" {
		t.Errorf("thirty people for 30: %s", got)
	}
}
