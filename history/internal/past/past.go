// Package past makes small random histories of data sets, with merges, renamed
// folders, chainage jumps added later and revisions that do not load, and traces
// them by brute force: every commit is compiled. Only tests import it.
package past

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"slices"
	"strings"
	"time"

	"speedtrail/history/compose"
)

// History draws a history of n commits. The last one loads and has route R1.
// Commits are named by their number in the message.
func History(rnd *rand.Rand, n int) []compose.Commit {
	d := &drawing{rnd: rnd}
	states := []state{d.first()}
	parents := [][]int{nil}
	tips := []int{0}
	for i := 1; i < n; i++ {
		last := i == n-1
		switch {
		case len(tips) > 1 && (last || rnd.IntN(3) == 0):
			// A merge takes each route from one of the sides, or makes a third.
			a := rnd.IntN(len(tips))
			b := (a + 1 + rnd.IntN(len(tips)-1)) % len(tips)
			s := states[tips[a]].clone()
			for k := range s.routes {
				if o := states[tips[b]]; k < len(o.routes) && rnd.IntN(2) == 0 {
					s.routes[k] = o.routes[k].clone()
				}
			}
			switch rnd.IntN(6) {
			case 0:
				d.edit(&s)
			case 1, 2:
				for k := range s.routes[0].speeds {
					s.routes[0].speeds[k] = d.speed()
				}
			}
			p := []int{tips[a], tips[b]}
			states, parents = append(states, s), append(parents, p)
			tips[a] = i
			tips = slices.Delete(tips, b, b+1)
		default:
			t := rnd.IntN(len(tips))
			s := states[tips[t]].clone()
			d.edit(&s)
			states, parents = append(states, s), append(parents, []int{tips[t]})
			if rnd.IntN(4) == 0 && len(tips) < 3 {
				tips = append(tips, i)
			} else {
				tips[t] = i
			}
		}
		if last {
			s := &states[i]
			s.broken, s.routes[0].gone = "", false
			for k := range s.routes {
				s.routes[k].broken = ""
			}
		}
	}
	history := make([]compose.Commit, n)
	for i := range history {
		who := compose.Person{Name: fmt.Sprintf("Author %d", i%3), Email: fmt.Sprintf("a%d@past.example", i%3)}
		// Dates are all different and not always in order.
		when := time.Date(2020, 1, 1, 0, 0, 0, 0, time.UTC).Add(time.Duration(i*3600+rnd.IntN(9000)*7+i%7) * time.Second)
		history[i] = compose.Commit{Parents: parents[i], Files: states[i].files(), Author: who, When: when, Message: fmt.Sprintf("commit %d\n", i)}
	}
	return history
}

// state is a data set.
type state struct {
	routes []line
	broken string // files that are put in, as "name\x00content", joined by "\x01"; most are faulty
	zone   string
	notes  int
}

// line is a route.
type line struct {
	id, folder string
	end        int // km
	jumps      [][2]int
	speeds     []int // one a kilometre of running distance
	axle       []string
	temporary  []string
	directions string
	gone       bool
	broken     string
	comment    int
}

func (l line) clone() line {
	l.jumps, l.speeds, l.axle, l.temporary = slices.Clone(l.jumps), slices.Clone(l.speeds), slices.Clone(l.axle), slices.Clone(l.temporary)
	return l
}

func (s state) clone() state {
	routes := make([]line, len(s.routes))
	for i, l := range s.routes {
		routes[i] = l.clone()
	}
	s.routes = routes
	return s
}

type drawing struct {
	rnd   *rand.Rand
	count int
}

func (d *drawing) speed() int { return 20 + 20*d.rnd.IntN(4) }

func (d *drawing) first() state {
	s := state{}
	for i := range 3 {
		l := line{id: fmt.Sprintf("R%d", i+1), folder: fmt.Sprintf("r%d", i+1), end: 6 + d.rnd.IntN(5)}
		for range l.end {
			l.speeds = append(l.speeds, d.speed())
		}
		s.routes = append(s.routes, l)
	}
	return s
}

// edit alters something.
func (d *drawing) edit(s *state) {
	d.count++
	l := &s.routes[[]int{0, 0, 1, 2}[d.rnd.IntN(4)]]
	switch d.rnd.IntN(16) {
	case 0, 1, 2, 3:
		l.speeds[d.rnd.IntN(len(l.speeds))] = d.speed()
	case 4:
		at := d.rnd.IntN(l.end - 1)
		if len(l.jumps) == 0 {
			l.axle = append(l.axle, fmt.Sprintf("%d.2,%d.7,%d,%s", at, at, d.speed(), []string{"yes", "no"}[d.rnd.IntN(2)]))
		} else {
			l.axle = nil
		}
	case 5:
		if len(l.jumps) == 0 && len(l.temporary) == 0 {
			at := d.rnd.IntN(l.end - 1)
			l.temporary = append(l.temporary, fmt.Sprintf("T%d,%d.4,%d.1,%d,2026-01-01,", d.count, at, at+1, d.speed()))
		} else {
			l.temporary = nil
		}
	case 6:
		// A jump: the posts from here on read otherwise.
		if len(l.jumps) == 0 && len(l.speeds) > 4 {
			at := 1 + d.rnd.IntN(len(l.speeds)-3)
			by := []int{1, 2, -1}[d.rnd.IntN(3)]
			if at+by > 0 {
				l.jumps = [][2]int{{at, at + by}}
				l.end += by
				l.axle, l.temporary = nil, nil
			}
		} else {
			l.jumps = nil
			l.end = len(l.speeds)
		}
	case 7:
		if l.folder == strings.ToLower(l.id) {
			l.folder += "-renamed"
		} else {
			l.folder = strings.ToLower(l.id)
		}
	case 8:
		l.gone = !l.gone
	case 9:
		l.directions = []string{"", "", `["nominal"]`}[d.rnd.IntN(3)]
	case 10:
		if l.broken == "" {
			l.broken = []string{"from_km,to_km,basic\n0,1,47\n", "", "from_km,to_km,basic\n0,1,100\n"}[d.rnd.IntN(3)] + "\n"
		} else {
			l.broken = ""
		}
	case 11:
		s.broken = []string{
			"", "", "requests/q.toml\x00id = \"Q\"\n", "dataset.toml\x00format = 2\n", "trains.toml\x00", "routes/stray.csv\x00a\n",
			"requests/a.toml\x00" + request + "\x01requests/b.toml\x00" + request, "requests/a.toml\x00" + request,
			"routes/R1/route.toml\x00id = \"R9\"\n", "routes/r9/route.toml\x00id = \"R2\"\nname = \"again\"\nstart_km = 0\nend_km = 1\n",
		}[d.rnd.IntN(10)]
	case 12:
		l.comment = d.count // the tree differs, the speeds do not
	case 13:
		s.zone = []string{"", "Europe/Rome", "UTC"}[d.rnd.IntN(3)]
	case 14:
		s.notes++ // a file outside
	case 15:
		n := len(l.speeds)
		if d.rnd.IntN(2) == 0 {
			l.speeds = append(l.speeds, d.speed())
			l.end++
		} else if n > 6 && len(l.jumps) == 0 && len(l.axle)+len(l.temporary) == 0 {
			l.speeds = l.speeds[:n-1]
			l.end--
		}
	}
}

// files writes a state.
func (s state) files() map[string]string {
	files := map[string]string{
		"dataset.toml": "format = 1\nname = \"Past\"\n",
		"trains.toml":  trains,
		"README":       fmt.Sprint(s.notes),
	}
	if s.zone != "" {
		files["dataset.toml"] += fmt.Sprintf("time_zone = %q\n", s.zone)
	}
	for _, l := range s.routes {
		if !l.gone {
			maps.Copy(files, l.files())
		}
	}
	for part := range strings.SplitSeq(s.broken, "\x01") {
		if name, content, ok := strings.Cut(part, "\x00"); ok {
			files[name] = content
		}
	}
	return files
}

const request = "id = \"Q\"\ntitle = \"T\"\nreason = \"R\"\n[[declares]]\nroute = \"R1\"\nfrom_km = 0\nto_km = 1\neffect = \"any\"\n"

const trains = `[[train]]
id = "SHORT"
name = "Short"
cant_deficiency_mm = 150
categories = ["passenger"]
axle_load = "A"
length_m = 50
max_speed_kmh = 70

[[train]]
id = "LONG"
name = "Long"
cant_deficiency_mm = 80
categories = ["freight_g"]
axle_load = "D4"
length_m = 700
max_speed_kmh = 100
`

// km writes the reading at a running distance in kilometres: at a jump the
// arriving one for the end of a row, the leaving one for its beginning.
func (l line) km(at int, ends bool) string {
	read := at
	for _, j := range l.jumps {
		if at > j[0] || at == j[0] && !ends {
			read = at + j[1] - j[0]
		}
	}
	// Posts repeat between the leaving and the arriving reading.
	for _, j := range l.jumps {
		if j[1] < j[0] && read >= j[1] && read <= j[0] {
			n := 1
			if at > j[0] || at == j[0] && !ends {
				n = 2
			}
			return fmt.Sprintf("%d#%d", read, n)
		}
	}
	return fmt.Sprint(read)
}

func (l line) files() map[string]string {
	dir := "routes/" + l.folder + "/"
	head := fmt.Sprintf("id = %q\nname = \"Line\"\nstart_km = 0\nend_km = %d\n", l.id, l.end)
	if l.directions != "" {
		head += "directions = " + l.directions + "\n"
	}
	for _, j := range l.jumps {
		head += fmt.Sprintf("[[jump]]\narriving_km = %d\nleaving_km = %d\n", j[0], j[1])
	}
	var b strings.Builder
	if l.comment > 0 {
		fmt.Fprintf(&b, "# note %d\n", l.comment)
	}
	b.WriteString("from_km,to_km,basic\n")
	for i, v := range l.speeds {
		fmt.Fprintf(&b, "%s,%s,%d\n", l.km(i, false), l.km(i+1, true), v)
	}
	files := map[string]string{dir + "route.toml": head, dir + "speed.csv": b.String()}
	if l.broken != "" {
		files[dir+"speed.csv"] = l.broken
	}
	if len(l.axle) > 0 {
		files[dir+"axle-load.csv"] = "from_km,to_km,D4,train_length_delay\n" + strings.Join(l.axle, "\n") + "\n"
	}
	if len(l.temporary) > 0 {
		files[dir+"temporary.csv"] = "id,from_km,to_km,speed,valid_from,valid_to\n" + strings.Join(l.temporary, "\n") + "\n"
	}
	return files
}
