// Package network makes data sets of any size for tests and benchmarks: invented
// routes with invented speeds, the same bytes for the same Size, in a Git
// repository with three revisions.
//
//	dir := network.Repository(b, network.Full)
//	// assess network.Base against network.Five in dir
//
// Only tests import it.
package network

import (
	"fmt"
	"math/rand/v2"
	"strings"

	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Size says how large a data set is.
type Size struct {
	Routes   int
	Rows     int // of speed.csv of each route
	AxleLoad int // rows of axle-load.csv of each route
	Temp     int // rows of temporary.csv of each route
	Trains   int
}

// Full is a large network: 500 routes of 60 rows, 100 trains.
var Full = Size{Routes: 500, Rows: 60, AxleLoad: 15, Temp: 3, Trains: 100}

// Tags of the revisions of Repository. Five and All both follow Base.
const (
	Base = "base"
	Five = "five" // a few cells in five routes differ from Base
	All  = "all"  // one or two cells in every route do
)

// Columns of speed.csv in which a row's edits are made.
const (
	from = iota
	to
	direction
	basic
	cd100
	cd130
	cd165
	freightP
	freightG
	delay
)

const (
	speedHeader = "from_km,to_km,direction,basic,cd100,cd130,cd165,freight_p,freight_g,train_length_delay\n"
	axleHeader  = "from_km,to_km,C4,D4,E4,train_length_delay\n"
	tempHeader  = "id,from_km,to_km,speed,valid_from,valid_to,reason,train_length_delay\n"
)

// route is one route before it is written.
type route struct {
	number      int
	length      unit.Distance
	speed, axle [][]string
	temporary   [][]string
	plain       []int // rows of speed that give one speed to all trains, for both directions
	graded      []int // rows of speed with speeds by cant deficiency
}

// folder is the route's folder from the root of the repository.
func (r *route) folder() string { return fmt.Sprintf("routes/r%04d/", r.number) }

// newRoute makes the route of a number from 1. Each has a random source of its
// own, so that a route is the same in networks of different size.
func newRoute(s Size, number int) *route {
	rnd := rand.New(rand.NewPCG(1, uint64(number)))
	r := &route{number: number}
	for len(r.speed) < s.Rows {
		start := r.length
		r.length += unit.Distance(300+rnd.IntN(2200)) * unit.Metre
		row := []string{start.KM(), r.length.KM(), "", "", "", "", "", "", "", ""}
		v := 60 + 5*rnd.IntN(17)
		row[basic] = fmt.Sprint(v)
		i := len(r.speed)
		switch rnd.IntN(10) {
		case 0, 1, 2:
			row[cd100], row[cd130], row[cd165] = fmt.Sprint(v+5), fmt.Sprint(v+10), fmt.Sprint(v+20)
			r.graded = append(r.graded, i)
		case 3, 4:
			row[freightP], row[freightG] = fmt.Sprint(v-10), fmt.Sprint(v-20)
		case 5:
			row[delay] = "no"
			r.plain = append(r.plain, i)
		case 6:
			// Rows of their own for each direction of travel.
			if len(r.speed)+2 > s.Rows {
				r.plain = append(r.plain, i)
				break
			}
			other := append([]string(nil), row...)
			row[direction], other[direction] = "nominal", "reverse"
			other[basic] = fmt.Sprint(v - 5)
			r.speed = append(r.speed, other)
		default:
			r.plain = append(r.plain, i)
		}
		r.speed = append(r.speed, row)
	}
	for i := range s.AxleLoad {
		start, end := r.piece(rnd, 60, 700)
		row := []string{start, end, "", fmt.Sprint(60 + 5*rnd.IntN(9)), fmt.Sprint(40 + 5*rnd.IntN(9)), ""}
		if i%4 == 0 {
			row[2] = fmt.Sprint(70 + 5*rnd.IntN(9))
		}
		if i%5 == 0 {
			row[5] = "no"
		}
		r.axle = append(r.axle, row)
	}
	for i := range s.Temp {
		start, end := r.piece(rnd, 200, 1500)
		row := []string{fmt.Sprintf("TSR-%d", i+1), start, end, fmt.Sprint(20 + 5*rnd.IntN(13)), "2026-03-01", "2026-06-30", "track work", ""}
		if i%3 == 1 {
			row[7] = "no"
		}
		r.temporary = append(r.temporary, row)
	}
	return r
}

// piece gives a random stretch of the route of a length in metres.
func (r *route) piece(rnd *rand.Rand, least, most int) (start, end string) {
	length := unit.Distance(least+rnd.IntN(most-least)) * unit.Metre
	length = min(length, r.length-unit.Metre)
	at := unit.Distance(rnd.Int64N(int64((r.length-length)/unit.Metre))) * unit.Metre
	return at.KM(), (at + length).KM()
}

// editFew alters a few cells, as one of the five routes of Five has them.
func (r *route) editFew() {
	r.editOne()
	r.shift(r.graded, 1, cd165, 10)
	r.shift(r.plain, 2, basic, -10)
	if len(r.axle) > 0 {
		r.axle[0][4] = "30"
	}
}

// editOne alters one cell or, in every other route, two.
func (r *route) editOne() {
	r.shift(r.plain, r.number, basic, 15)
	if r.number%2 == 0 {
		r.shift(r.graded, r.number, cd130, 5)
	}
}

// shift adds to a speed in the n-th of some rows of speed.csv.
func (r *route) shift(rows []int, n, column, by int) {
	if len(rows) == 0 {
		rows, column = []int{0}, basic
	}
	cell := &r.speed[rows[n%len(rows)]][column]
	var v int
	fmt.Sscan(*cell, &v)
	*cell = fmt.Sprint(v + by)
}

// file is a file with its path from the root of the repository.
type file struct{ path, content string }

// files writes the route.
func (r *route) files() []file {
	head := fmt.Sprintf("id = \"R%04d\"\nname = \"Route %d\"\nstart_km = 0\nend_km = %s\n", r.number, r.number, r.length.KM())
	list := []file{{r.folder() + "route.toml", head}, {r.folder() + "speed.csv", table(speedHeader, r.speed)}}
	if len(r.axle) > 0 {
		list = append(list, file{r.folder() + "axle-load.csv", table(axleHeader, r.axle)})
	}
	if len(r.temporary) > 0 {
		list = append(list, file{r.folder() + "temporary.csv", table(tempHeader, r.temporary)})
	}
	return list
}

func table(header string, rows [][]string) string {
	var b strings.Builder
	b.WriteString(header)
	for _, row := range rows {
		b.WriteString(strings.Join(row, ","))
		b.WriteByte('\n')
	}
	return b.String()
}

// frame writes the files beside the routes. No two trains are the same in
// length; cant deficiency, axle load, categories and maximum speed are mixed.
func frame(s Size) []file {
	var b strings.Builder
	for i := range s.Trains {
		categories := [...]string{`"passenger"`, `"freight_p"`, `"freight_g"`, ""}[i%4]
		fmt.Fprintf(&b, "[[train]]\nid = \"T%03d\"\nname = \"Train %d\"\n", i+1, i+1)
		fmt.Fprintf(&b, "cant_deficiency_mm = %d\ncategories = [%s]\n", codes.CantDeficiency(i%codes.CantDeficiencies).MM(), categories)
		fmt.Fprintf(&b, "axle_load = \"%s\"\nlength_m = %d\n", codes.AxleLoad(i%codes.AxleLoads), 25+i*4000/max(s.Trains, 1)/6)
		fmt.Fprintf(&b, "max_speed_kmh = %d\nacceleration_ms2 = 0.%d\nbraking_ms2 = 0.%d\n\n", 80+5*(i*7%25), 30+i%40, 50+i%30)
	}
	return []file{{"dataset.toml", "format = 1\nname = \"Invented network\"\n"}, {"trains.toml", b.String()}}
}
