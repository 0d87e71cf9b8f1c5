package schema

import (
	"cmp"
	"errors"
	"io/fs"
	"path"
	"slices"
	"strconv"
	"strings"
	"time"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
	"speedtrail/schema/unit"
)

// frame reads everything but the routes.
func (r *reader) frame(d *Dataset) {
	r.dataset(d)
	r.trains(d)
	r.requests(d)
	r.accepted(d)
	d.Policy = r.policy()
}

func (r *reader) dataset(d *Dataset) {
	d.TimeZone = time.UTC
	m, ok := r.toml(datasetFile, true)
	if !ok {
		return
	}
	if v := m.Number("format", true); v != nil && v.Text != strconv.Itoa(Format) {
		r.faults.Add(v.Pos, "format %s is not known, this program reads format %d", source.Quote(v.Text), Format)
	}
	d.Name = m.Text("name", true)
	if zone := m.Text("time_zone", false); zone != "" {
		location, ok := Zone(zone)
		if !ok {
			r.faults.Add(valuePlace(m, "time_zone"), "time_zone %s is no IANA time zone name", source.Quote(zone))
		} else {
			d.TimeZone = location
		}
	}
	if limits, ok := m.Inner("limits"); ok {
		d.Limits.CantExcessMM = whole(limits, "cant_excess_mm", 1, 300)
		if v := limits.Number("largest_step_kmh", false); v != nil {
			d.Limits.LargestStep = r.speed(v.Text, v.Pos, "largest_step_kmh")
		}
		d.Limits.ShortestStretch = unit.Distance(whole(limits, "shortest_stretch_m", 1, 100_000)) * unit.Metre
		limits.Finish()
	}
	m.Finish()
}

// whole reads an optional whole number from least to most; 0 where it is not
// there or faulty.
func whole(m table.Reader, key string, least, most int) int {
	v := m.Number(key, false)
	if v == nil {
		return 0
	}
	n, err := strconv.Atoi(v.Text)
	if err != nil || n < least || n > most || strings.HasPrefix(v.Text, "+") {
		m.Faults.Add(v.Pos, "%s %s is not a whole number from %d to %d", key, source.Quote(v.Text), least, most)
		return 0
	}
	return n
}

// speed reads a speed; 0 where it is faulty.
func (r *reader) speed(text string, at source.Position, name string) unit.Speed {
	v, err := unit.ParseSpeed(text)
	if err != nil {
		r.faults.Add(at, "%s %s is %v", name, source.Quote(text), err)
	}
	return v
}

func (r *reader) trains(d *Dataset) {
	m, ok := r.toml(trainsFile, true)
	if !ok {
		return
	}
	before := r.faults.Count()
	seen := map[string]source.Position{}
	list := m.Tables("train")
	if len(list) > MaxTrains {
		r.faults.Add(m.Place("train"), "%d reference trains, at most %d are allowed", len(list), MaxTrains)
		list = list[:MaxTrains]
	}
	for _, t := range list {
		train := r.train(t)
		r.unique(seen, "train", train.ID, valuePlace(t, "id"))
		d.Trains = append(d.Trains, train)
	}
	if len(list) == 0 && r.faults.Count() == before {
		r.faults.Add(source.Position{File: trainsFile}, "no reference train, at least one [[train]] is needed")
	}
	m.Finish()
}

func (r *reader) train(t table.Reader) Train {
	train := Train{Pos: t.Pos, MaxPos: t.Place("max_speed_kmh"), ID: r.identifier(t, "id"), Name: t.Text("name", true)}
	if v := t.Number("cant_deficiency_mm", true); v != nil {
		mm, err := strconv.Atoi(v.Text)
		c, ok := codes.CantDeficiencyOf(mm)
		if err != nil || !ok || strings.HasPrefix(v.Text, "+") {
			r.faults.Add(v.Pos, "cant_deficiency_mm %s is none of 80, 100, 130, 150, 165, 180, 210, 225, 245, 275, 300", source.Quote(v.Text))
		}
		train.Cant = c
	}
	for _, v := range t.Texts("categories") {
		c, ok := codes.ParseCategory(v.Text)
		switch {
		case !ok:
			r.faults.Add(v.Pos, "category %s is none of freight_p, freight_g, passenger", source.Quote(v.Text))
		case train.Categories.Has(c):
			r.faults.Add(v.Pos, "category %s stands twice", source.Quote(v.Text))
		default:
			train.Categories = train.Categories.With(c)
		}
	}
	if text := t.Text("axle_load", true); text != "" {
		a, ok := codes.ParseAxleLoad(text)
		if !ok {
			r.faults.Add(valuePlace(t, "axle_load"), "axle_load %s is none of %s", source.Quote(text), strings.Join(axleLoadNames(), ", "))
		}
		train.AxleLoad = a
	}
	if v := t.Number("length_m", true); v != nil {
		n, err := strconv.Atoi(v.Text)
		if err != nil || n < 1 || n > 4095 || strings.HasPrefix(v.Text, "+") {
			r.faults.Add(v.Pos, "length_m %s is not a whole number from 1 to 4095", source.Quote(v.Text))
		}
		train.Length = unit.Distance(n) * unit.Metre
	}
	if v := t.Number("max_speed_kmh", true); v != nil {
		train.Max = r.speed(v.Text, v.Pos, "max_speed_kmh")
	}
	train.Acceleration = r.rate(t, "acceleration_ms2")
	train.Braking = r.rate(t, "braking_ms2")
	t.Finish()
	return train
}

// rate reads an optional acceleration in thousandths of m/s², above 0 and up to
// 3 m/s².
func (r *reader) rate(t table.Reader, key string) int {
	v := t.Number(key, false)
	if v == nil {
		return 0
	}
	n, ok := decimal(v.Text, 3)
	if !ok || n < 1 || n > 3000 {
		r.faults.Add(v.Pos, "%s %s is not a number above 0 and up to 3 with at most three decimals", key, source.Quote(v.Text))
		return 0
	}
	return int(n)
}

// decimal reads a decimal number as a whole number of 10^-places; signs are
// allowed, exponents are not.
func decimal(text string, places int) (int64, bool) {
	// A chainage has the same form, with six decimals.
	d, err := unit.ParseKM(text)
	if err != nil {
		return 0, false
	}
	n := int64(d)
	for range 6 - places {
		if n%10 != 0 {
			return 0, false
		}
		n /= 10
	}
	return n, true
}

// identifier reads a required id: up to 100 bytes of visible text.
func (r *reader) identifier(m table.Reader, key string) string {
	id := m.Text(key, true)
	if len(id) > 100 {
		r.faults.Add(valuePlace(m, key), "%s %s is longer than 100 bytes", key, source.Quote(id))
	}
	return id
}

// unique records an id that stands twice.
func (r *reader) unique(seen map[string]source.Position, what, id string, at source.Position) {
	if id == "" {
		return
	}
	if first, ok := seen[id]; ok {
		r.faults.Add(at, "%s id %s is that of %s, too; ids are unique", what, source.Quote(id), first)
		return
	}
	seen[id] = at
}

// once records a name that stands twice.
func (r *reader) once(seen map[string]source.Position, what, name string, at source.Position) {
	if name == "" {
		return
	}
	if first, ok := seen[name]; ok {
		r.faults.Add(at, "%s %s stands twice, first at %s", what, source.Quote(name), first)
		return
	}
	seen[name] = at
}

func axleLoadNames() []string {
	names := make([]string, codes.AxleLoads)
	for a := range names {
		names[a] = codes.AxleLoad(a).String()
	}
	return names
}

func (r *reader) requests(d *Dataset) {
	if r.err != nil || r.refused[requestsDir] {
		return
	}
	entries, err := fs.ReadDir(r.fsys, requestsDir)
	if errors.Is(err, fs.ErrNotExist) {
		return
	}
	if err != nil {
		r.err = err
		return
	}
	seen := map[string]source.Position{}
	count := 0
	for _, e := range entries {
		p := requestsDir + "/" + e.Name()
		switch {
		case r.badName(e, p):
			continue
		case e.IsDir():
			r.noDataBelow(p, 1)
			continue
		case !checkType(&r.faults, e, p, false):
			continue
		case !isData(e.Name()):
			if ext := path.Ext(e.Name()); len(ext) > 2 && near(strings.ToLower(ext), ".toml") {
				r.faults.Add(source.Position{File: p}, "the name nearly ends in .toml and the file is not read, a mistyped name would hide data")
			}
			continue
		case !strings.HasSuffix(e.Name(), ".toml"):
			r.faults.Add(source.Position{File: p}, "a file that is no request; requests end in .toml")
			continue
		}
		if count++; count > MaxRequests {
			r.faults.Add(source.Position{File: requestsDir}, "more than %d requests", MaxRequests)
			return
		}
		m, ok := r.toml(p, true)
		if !ok {
			continue
		}
		q := ChangeRequest{Pos: m.Place("id"), ID: r.identifier(m, "id"), Title: m.Text("title", true), Reason: m.Text("reason", true)}
		for _, t := range m.Tables("declares") {
			q.Declare = append(q.Declare, r.declaration(t))
		}
		m.Finish()
		r.unique(seen, "request", q.ID, valuePlace(m, "id"))
		d.Requests = append(d.Requests, q)
	}
	slices.SortStableFunc(d.Requests, func(a, b ChangeRequest) int { return strings.Compare(a.ID, b.ID) })
}

func (r *reader) declaration(t table.Reader) Declaration {
	d := Declaration{Pos: t.Pos, Route: t.Text("route", true)}
	d.Span = r.span(t, false)
	d.Span.Directions = codes.Both
	d.Places = placesOf(t)
	if text := t.Text("direction", false); text != "" {
		s, ok := codes.ParseDirections(text)
		if !ok {
			r.faults.Add(valuePlace(t, "direction"), "direction %s is none of nominal, reverse, both", source.Quote(text))
		}
		d.Span.Directions = s
	}
	switch text := t.Text("effect", true); text {
	case "raise":
		d.Effect = Raise
	case "lower":
		d.Effect = Lower
	case "any", "":
	default:
		r.faults.Add(valuePlace(t, "effect"), "effect %s is none of raise, lower, any", source.Quote(text))
	}
	for _, v := range t.Texts("trains") {
		d.Trains = append(d.Trains, v.Text)
		d.Places.Trains = append(d.Places.Trains, v.Pos)
	}
	if v := t.Get("trains"); v != nil && v.Kind == table.ArrayKind && len(v.Items) == 0 {
		r.faults.Add(v.Pos, "trains is empty, leave it out for every train")
	}
	t.Finish()
	return d
}

func (r *reader) accepted(d *Dataset) {
	m, ok := r.toml(acceptedFile, false)
	if !ok {
		return
	}
	for _, t := range m.Tables("accepted") {
		a := Acceptance{Pos: t.Pos, Finding: t.Text("finding", true), Route: t.Text("route", true), Reason: t.Text("reason", true)}
		a.Span = r.span(t, true)
		a.Span.Directions = codes.Both
		a.Places = placesOf(t)
		a.Places.Finding = valuePlace(t, "finding")
		if v := t.Get("until"); v != nil {
			day, err := time.Parse(time.DateOnly, v.Text)
			switch {
			case v.Kind == table.StringKind || v.Kind == table.ArrayKind || v.Kind == table.TableKind:
				r.faults.Add(v.Pos, "until is %s, a date such as 2027-06-30, without quotes, is needed", v.Kind)
			case v.Kind != table.DateKind || err != nil:
				r.faults.Add(v.Pos, "until %s is no date such as 2027-06-30", source.Quote(v.Text))
			case !plausible(day):
				r.faults.Add(v.Pos, "until %s "+implausible, source.Quote(v.Text))
			}
			a.Until = v.Text
		}
		t.Finish()
		d.Accepted = append(d.Accepted, a)
	}
	m.Finish()
}

// placesOf gives where the values stand that a declaration and an acceptance have in
// common.
func placesOf(t table.Reader) Places {
	return Places{Route: valuePlace(t, "route"), From: valuePlace(t, "from_km"), To: valuePlace(t, "to_km")}
}

// span reads from_km and to_km as they are written. What cannot be a stretch on any
// track is a fault, whether or not the route is there; point: both may be one place.
func (r *reader) span(t table.Reader, point bool) Span {
	before := r.faults.Count()
	s := Span{From: r.pointOf(t, "from_km"), To: r.pointOf(t, "to_km")}
	if r.faults.Count() > before {
		return s
	}
	at := valuePlace(t, "to_km")
	switch order := writtenOrder(s.From, s.To); {
	case order > 0:
		r.faults.Add(at, "to_km %s does not lie after from_km %s; from_km comes first in the nominal direction, whatever the direction of travel", s.To, s.From)
	case order == 0 && !point:
		r.faults.Add(at, "to_km %s is the place of from_km, a stretch is needed: write where it ends", s.To)
	}
	return s
}

// writtenOrder compares two positions by what is written: 1 where the first cannot
// lie before the second on any track. Of different posts only the track can tell: behind
// a jump back they are lower, also where none repeats.
func writtenOrder(a, b chainage.Point) int {
	if a.Chainage == b.Chainage {
		return cmp.Compare(max(a.Occurrence, 1), max(b.Occurrence, 1)) // bare is the first
	}
	return -1
}
