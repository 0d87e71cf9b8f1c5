package schema

import (
	"bytes"
	"context"
	"errors"
	"io/fs"
	"os"
	"path"
	"reflect"
	"slices"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

const datasets = "../testdata/datasets"

// datasetNames lists the good data sets of testdata.
func datasetNames(t testing.TB) []string {
	t.Helper()
	entries, err := os.ReadDir(datasets)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	return names
}

// open reads a good data set into memory, so that tests can alter it.
func open(t testing.TB, name string) fstest.MapFS {
	t.Helper()
	root, m := os.DirFS(path.Join(datasets, name)), fstest.MapFS{}
	err := fs.WalkDir(root, ".", func(p string, e fs.DirEntry, err error) error {
		if err != nil || e.IsDir() {
			return err
		}
		content, err := fs.ReadFile(root, p)
		m[p] = &fstest.MapFile{Data: content, Mode: 0o644}
		return err
	})
	if err != nil || len(m) == 0 {
		t.Fatalf("%s: %d files, %v", name, len(m), err)
	}
	return m
}

// equal compares two values deeply, lists item by item.
func equal(t *testing.T, what string, got, want any) {
	t.Helper()
	g, w := reflect.ValueOf(got), reflect.ValueOf(want)
	if g.Kind() == reflect.Slice && w.Kind() == reflect.Slice && g.Len() == w.Len() {
		for i := range g.Len() {
			if !reflect.DeepEqual(g.Index(i).Interface(), w.Index(i).Interface()) {
				t.Errorf("%s[%d]:\n got %+v\nwant %+v", what, i, g.Index(i), w.Index(i))
			}
		}
		return
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("%s:\n got %+v\nwant %+v", what, got, want)
	}
}

func point(s string) chainage.Point {
	p, err := chainage.ParsePoint(s)
	if err != nil {
		panic(s + ": " + err.Error())
	}
	return p
}

func span(from, to string, d codes.Directions) Span {
	return Span{From: point(from), To: point(to), Directions: d}
}

func at(file string, line, column int) source.Position {
	return source.Position{File: file, Line: line, Column: column}
}

// row writes a row with the running distances of its ends, in millimetres.
func row(at source.Position, s Span, start, end unit.Distance, delay bool, note string) Row {
	return Row{Pos: at, Span: s, Start: start, End: end, Delay: delay, Note: note}
}

func utc(s string) time.Time {
	if s == "" {
		return time.Time{}
	}
	at, err := time.Parse(time.RFC3339, s)
	if err != nil {
		panic(err)
	}
	return at.UTC()
}

// TestLoadAll checks what every data set has: its files with their content,
// routes, requests and files in order.
func TestLoadAll(t *testing.T) {
	counts := map[string]int{"full": 14, "minimal": 4, "oneway": 9, "realigned": 5, "spreadsheet": 7}
	for _, name := range datasetNames(t) {
		t.Run(name, func(t *testing.T) {
			files := open(t, name)
			d := load(t, files)
			if len(d.Files) != counts[name] {
				t.Errorf("%d files were read, want %d", len(d.Files), counts[name])
			}
			for _, f := range d.Files {
				if file, ok := files[f.Path]; !ok || !bytes.Equal(file.Data, f.Content) {
					t.Errorf("%s is not listed as it is", f.Path)
				}
			}
			if !slices.IsSortedFunc(d.Files, func(a, b File) int { return strings.Compare(a.Path, b.Path) }) {
				t.Error("files are not in byte order")
			}
			if !slices.IsSortedFunc(d.Routes, func(a, b *Route) int { return strings.Compare(a.ID, b.ID) }) {
				t.Error("routes are not in the order of their ids")
			}
			if !slices.IsSortedFunc(d.Requests, func(a, b ChangeRequest) int { return strings.Compare(a.ID, b.ID) }) {
				t.Error("requests are not in the order of their ids")
			}
			if len(d.Unread) > 0 {
				t.Errorf("unread: %v", d.Unread)
			}
			if onDisk := load(t, os.DirFS(path.Join(datasets, name))); !reflect.DeepEqual(plain(d), plain(onDisk)) {
				t.Error("the file system of the machine gives another data set")
			}
		})
	}
}

func TestLoadMinimal(t *testing.T) {
	d := load(t, open(t, "minimal"))
	equal(t, "name", d.Name, "Smallest")
	equal(t, "time zone", d.TimeZone, time.UTC)
	equal(t, "limits", d.Limits, Limits{})
	equal(t, "trains", d.Trains, []Train{{Pos: at("trains.toml", 1, 3), MaxPos: at("trains.toml", 7, 1), ID: "T", Name: "Any",
		Cant: 0, AxleLoad: 0, Length: unit.Metre, Max: 5}})
	if d.Policy != nil || d.Requests != nil || d.Accepted != nil || len(d.Routes) != 1 {
		t.Fatalf("%+v", d)
	}
	r := d.Routes[0]
	equal(t, "speed", r.Speed, []SpeedRow{{Row: row(at("routes/only/speed.csv", 2, 1), span("0", "0.000001", codes.Both), 0, 1, true, ""), Basic: 600}})
	equal(t, "directions", r.Directions, codes.Both)
	equal(t, "length", r.Track.Length(), unit.Millimetre)
}

func TestLoadSpreadsheet(t *testing.T) {
	d := load(t, open(t, "spreadsheet"))
	equal(t, "name", d.Name, "Blanks around")
	equal(t, "trains", d.Trains, []Train{{Pos: at("trains.toml", 2, 3), MaxPos: at("trains.toml", 2, 104), ID: "T1", Name: `Inline, "quoted"`,
		Cant: 3, AxleLoad: 4, Length: 200 * unit.Metre, Max: 160}})
	r := d.Routes[0]
	const speed, places = "routes/s/speed.csv", "routes/s/places.csv"
	equal(t, "name", r.Name, "Longtext")
	equal(t, "places of the ends", []source.Position{r.Pos, r.StartPos, r.EndPos},
		[]source.Position{at("routes/s/route.toml", 5, 1), at("routes/s/route.toml", 2, 1), at("routes/s/route.toml", 1, 1)})
	passenger := SpeedRow{Row: row(at(speed, 10, 1), span("5", "10", codes.Both), 6_500_000, 11_500_000, true, "#no comment"), Basic: 110}
	passenger.Other[codes.Passenger] = 120
	equal(t, "speed", r.Speed, []SpeedRow{
		{Row: row(at(speed, 5, 1), span("-1.5", "0", codes.Both), 0, 1_500_000, true, `first, "quoted"`), Basic: 100},
		{Row: row(at(speed, 7, 1), span("0", "5", codes.Both), 1_500_000, 6_500_000, true, "Ä blanks"), Basic: 95},
		passenger,
	})
	equal(t, "places", r.Places, []PlaceRow{
		{Row: row(at(places, 2, 1), span("-1.5", "-1.5", codes.Both), 0, 0, true, ""), Kind: Station, Name: "Ørvik, north"},
		{Row: row(at(places, 3, 1), span("10", "10", codes.Both), 11_500_000, 11_500_000, true, ""), Kind: Bridge, Name: `Quay "4"`},
	})
	if r.Curves != nil || r.Temporary != nil || r.AxleLoad != nil || r.Gradients != nil {
		t.Errorf("tables without rows: %+v", r)
	}
}

// TestLoadRealigned follows posts that repeat twice and thrice and posts that
// are missing.
func TestLoadRealigned(t *testing.T) {
	r := load(t, open(t, "realigned")).Routes[0]
	const route, speed, places = "routes/r/route.toml", "routes/r/speed.csv", "routes/r/places.csv"
	jump := func(line int, arriving, leaving unit.Distance) JumpRow {
		return JumpRow{at(route, line, 3), chainage.Jump{Arriving: arriving, Leaving: leaving}}
	}
	equal(t, "jumps", r.Jumps, []JumpRow{jump(7, 3_000_000, 2_500_000), jump(11, 6_000_000, 2_750_000), jump(15, 4_000_000, 7_000_000)})
	equal(t, "length", r.Track.Length(), 11_750_000*unit.Millimetre)
	basic := func(line int, from, to string, start, end unit.Distance, v unit.Speed) SpeedRow {
		return SpeedRow{Row: row(at(speed, line, 1), span(from, to, codes.Both), start, end, true, ""), Basic: v}
	}
	equal(t, "speed", r.Speed, []SpeedRow{
		basic(2, "-2", "2.75#1", 0, 4_750_000, 80),
		basic(3, "2.75#1", "3#1", 4_750_000, 5_000_000, 85),
		basic(4, "2.5#2", "3#2", 5_000_000, 5_500_000, 90), // 2.500#2 is the joint
		basic(5, "3#2", "6", 5_500_000, 8_500_000, 95),
		basic(6, "2.75#3", "3#3", 8_500_000, 8_750_000, 100),
		basic(7, "3#3", "4#2", 8_750_000, 9_750_000, 105),
		basic(8, "7", "9", 9_750_000, 11_750_000, 110),
	})
	place := func(line int, from, to string, s unit.Distance, kind PlaceKind, name string) PlaceRow {
		return PlaceRow{Row: row(at(places, line, 1), span(from, to, codes.Both), s, s, true, ""), Kind: kind, Name: name}
	}
	equal(t, "places", r.Places, []PlaceRow{
		place(2, "3#1", "3#1", 5_000_000, Bridge, "Joint as it arrives"),
		place(3, "2.5#2", "2.5#2", 5_000_000, Bridge, "Joint as it leaves"),
		place(4, "6", "6", 8_500_000, Bridge, "Second joint"),
		place(5, "2.75#3", "2.75#3", 8_500_000, Bridge, "Second joint again"),
		place(6, "4#2", "7", 9_750_000, Station, "Third joint"),
	})
}

// TestLoadOneway checks directions and orders: routes by id whatever their
// folder, trains and rows as they stand.
func TestLoadOneway(t *testing.T) {
	d := load(t, open(t, "oneway"))
	var ids, folders, trains []string
	var directions []codes.Directions
	for _, r := range d.Routes {
		ids, folders, directions = append(ids, r.ID), append(folders, r.Folder), append(directions, r.Directions)
	}
	for _, train := range d.Trains {
		trains = append(trains, train.ID)
	}
	equal(t, "ids", ids, []string{"B", "a", "b"})
	equal(t, "folders", folders, []string{"routes/c", "routes/b", "routes/a"})
	equal(t, "directions", directions, []codes.Directions{codes.Both, codes.OnlyReverse, codes.OnlyNominal})
	equal(t, "trains", trains, []string{"T2", "T1"})
	const down, up = "routes/a/speed.csv", "routes/b/speed.csv"
	equal(t, "speed of b", d.Routes[2].Speed, []SpeedRow{
		{Row: row(at(down, 2, 1), span("2", "3", codes.Both), 2_000_000, 3_000_000, true, ""), Basic: 70},
		{Row: row(at(down, 3, 1), span("0", "1", codes.OnlyNominal), 0, 1_000_000, true, ""), Basic: 50},
		{Row: row(at(down, 4, 1), span("1", "2", codes.Both), 1_000_000, 2_000_000, true, ""), Basic: 60},
	})
	equal(t, "speed of a", d.Routes[1].Speed, []SpeedRow{
		{Row: row(at(up, 2, 1), span("0", "3", codes.OnlyReverse), 0, 3_000_000, false, ""), Basic: 75},
	})
}

// TestLoadCancelled gives the error of the context, not a fault.
func TestLoadCancelled(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	var faults *source.Faults
	if _, err := Load(ctx, small()); !errors.Is(err, context.Canceled) || errors.As(err, &faults) {
		t.Errorf("Load: %v", err)
	}
	if _, _, err := LoadPair(ctx, small(), small()); !errors.Is(err, context.Canceled) || errors.As(err, &faults) {
		t.Errorf("LoadPair: %v", err)
	}
}

// failing is a file system in which one path cannot be read.
type failing struct {
	fstest.MapFS
	path string
}

var errDisk = errors.New("disk on fire")

func (f failing) Open(name string) (fs.File, error) {
	if name == f.path {
		return nil, &fs.PathError{Op: "open", Path: name, Err: errDisk}
	}
	return f.MapFS.Open(name)
}

func (f failing) ReadDir(name string) ([]fs.DirEntry, error) {
	if name == f.path {
		return nil, &fs.PathError{Op: "readdir", Path: name, Err: errDisk}
	}
	return f.MapFS.ReadDir(name)
}

// TestLoadRefusedIsNotOpened: what is neither a file nor a folder is told and
// not touched.
func TestLoadRefusedIsNotOpened(t *testing.T) {
	for _, p := range []string{datasetFile, trainsFile, acceptedFile, signoffFile, signersFile, requestsDir, "requests/a.toml", "routes/main/curves.csv"} {
		t.Run(p, func(t *testing.T) {
			files := clone(open(t, "full"))
			for name := range files {
				if name == p || strings.HasPrefix(name, p+"/") {
					delete(files, name)
				}
			}
			files[p] = &fstest.MapFile{Mode: fs.ModeSymlink | 0o777}
			_, err := Load(t.Context(), failing{files, p})
			want := p + ": is a symbolic link, a data set holds plain files and folders only"
			if err == nil || err.Error() != want {
				t.Errorf("got %v\nwant %s", err, want)
			}
		})
	}
}

// TestLoadFailing wants the error of a file system that fails, wherever it
// does: what could not be read must not look as if it were not there.
func TestLoadFailing(t *testing.T) {
	files := open(t, "full")
	paths := []string{".", "routes", "routes/main", "routes/main/drawings", "routes/main/drawings/2026", "requests"}
	for name := range files {
		if ending := path.Ext(name); ending == ".toml" || ending == ".csv" || name == signersFile {
			paths = append(paths, name)
		}
	}
	slices.Sort(paths)
	for _, p := range paths {
		t.Run(p, func(t *testing.T) {
			_, err := Load(t.Context(), failing{files, p})
			if !errors.Is(err, errDisk) {
				t.Errorf("error %v", err)
			}
		})
	}
}
