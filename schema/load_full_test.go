package schema

import (
	"strings"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// The data set "full" has every file, column and key.

func TestLoadFullFrame(t *testing.T) {
	d := load(t, open(t, "full"))
	equal(t, "name", d.Name, "Fenwater network")
	equal(t, "time zone", d.TimeZone.String(), "Europe/Oslo")
	equal(t, "limits", d.Limits, Limits{CantExcessMM: 110, LargestStep: 60, ShortestStretch: 100 * unit.Metre})
	equal(t, "trains", d.Trains, []Train{
		{Pos: at("trains.toml", 1, 3), MaxPos: at("trains.toml", 8, 1), ID: "EXP-3", Name: "Express, three units", Cant: 3,
			Categories: 1 << codes.Passenger, AxleLoad: 4, Length: 240_000, Max: 200, Acceleration: 450, Braking: 600},
		{Pos: at("trains.toml", 12, 3), MaxPos: at("trains.toml", 19, 1), ID: "FRT", Name: "Freight", Cant: 0,
			Categories: 1<<codes.FreightP | 1<<codes.FreightG, AxleLoad: 10, Length: 4_095_000, Max: 100},
		{Pos: at("trains.toml", 21, 3), MaxPos: at("trains.toml", 28, 1), ID: "TLT", Name: "Tilting", Cant: 10,
			AxleLoad: 0, Length: 1000, Max: 600, Acceleration: 3000, Braking: 1},
	})
	const first, second = "requests/b-first.toml", "requests/a-second.toml"
	equal(t, "requests", d.Requests, []ChangeRequest{
		{Pos: at(first, 1, 1), ID: "CR-0001", Title: "Lower through Hollow tunnel", Reason: "Lining under repair", Declare: []Declaration{
			{Pos: at(first, 5, 3), Route: "FW.1_a-b", Span: span("3", "3.4", codes.OnlyNominal), Effect: Lower, Trains: []string{"EXP-3", "TLT"},
				Places: Places{Route: at(first, 6, 9), From: at(first, 8, 11), To: at(first, 9, 9), Trains: []source.Position{at(first, 11, 11), at(first, 11, 20)}}},
			{Pos: at(first, 13, 3), Route: "FW.1_a-b", Span: span("-0.35", "4.2", codes.Both), Effect: AnyEffect,
				Places: Places{Route: at(first, 14, 9), From: at(first, 15, 11), To: at(first, 16, 9)}},
		}},
		{Pos: at(second, 1, 1), ID: "CR-0002", Title: "Raise at a place with posts twice", Reason: "Renewed", Declare: []Declaration{
			{Pos: at(second, 5, 3), Route: "no such route, which is not checked here", Span: span("31.18#1", "31.18#2", codes.Both), Effect: Raise,
				Places: Places{Route: at(second, 6, 9), From: at(second, 8, 11), To: at(second, 9, 9)}},
		}},
	})
	equal(t, "accepted", d.Accepted, []Acceptance{
		{Pos: at("accepted.toml", 1, 3), Finding: "step-size", Route: "FW.1_a-b", Span: span("1.4", "1.6", codes.Both), Reason: "Station throat", Until: "2027-06-30",
			Places: Places{Finding: at("accepted.toml", 2, 11), Route: at("accepted.toml", 3, 9), From: at("accepted.toml", 4, 11), To: at("accepted.toml", 5, 9)}},
		{Pos: at("accepted.toml", 9, 3), Finding: "short-stretch", Route: "FW.1_a-b", Span: span("31.18#1", "31.2", codes.Both), Reason: "Bridge",
			Places: Places{Finding: at("accepted.toml", 10, 11), Route: at("accepted.toml", 11, 9), From: at("accepted.toml", 12, 11), To: at("accepted.toml", 13, 9)}},
	})
}

func TestLoadFullRoute(t *testing.T) {
	r := load(t, open(t, "full")).Routes[0]
	const file = "routes/main/route.toml"
	equal(t, "texts", []string{r.ID, r.Name, r.Folder}, []string{"FW.1_a-b", "Fenwater – Aldersund", "routes/main"})
	equal(t, "places", []source.Position{r.Pos, r.StartPos, r.EndPos}, []source.Position{at(file, 1, 1), at(file, 3, 1), at(file, 4, 1)})
	equal(t, "directions", r.Directions, codes.Both)
	equal(t, "jumps", r.Jumps, []JumpRow{{at(file, 7, 3), chainage.Jump{Arriving: 4_200_000, Leaving: 4_500_000}}})
	equal(t, "segments", r.Track.Segments(), []chainage.Segment{{From: -350_000, To: 4_200_000}, {From: 4_500_000, To: 12_000_000, Start: 4_550_000}})
}

func TestLoadFullTables(t *testing.T) {
	r := load(t, open(t, "full")).Routes[0]
	place := func(name string) func(line int) source.Position {
		return func(line int) source.Position { return at("routes/main/"+name, line, 1) }
	}

	pos := place("speed.csv")
	equal(t, "speed", r.Speed, []SpeedRow{
		{Row: row(pos(2), span("-0.35", "4.5", codes.Both), 0, 4_550_000, false, "station throat"), Basic: 100,
			Cant:  [11]unit.Speed{105, 110, 115, 120, 125, 130, 135, 140, 145, 150, 155},
			Other: [3]unit.Speed{80, 75, 160}, Replaces: [3]bool{true, false, false}},
		{Row: row(pos(3), span("4.5", "12", codes.OnlyNominal), 4_550_000, 12_050_000, true, ""), Basic: 5,
			Cant: [11]unit.Speed{10: 600}, Other: [3]unit.Speed{90, 0, 165}, Replaces: [3]bool{false, false, true}},
		{Row: row(pos(4), span("4.2", "12", codes.OnlyReverse), 4_550_000, 12_050_000, true, "same joint, other reading"), Basic: 140},
	})

	pos = place("axle-load.csv")
	equal(t, "axle load", r.AxleLoad, []AxleLoadRow{
		{Row: row(pos(2), span("1", "2", codes.OnlyReverse), 1_350_000, 2_350_000, false, "old bridge"),
			Limit: [13]unit.Speed{130, 125, 120, 115, 110, 105, 100, 95, 90, 85, 80, 75, 70}},
		{Row: row(pos(3), span("1.5", "3", codes.Both), 1_850_000, 3_350_000, true, ""), Limit: [13]unit.Speed{9: 60}},
	})

	pos = place("temporary.csv")
	for i := range r.Temporary {
		v := &r.Temporary[i].Valid
		v.From, v.Until = v.From.UTC(), v.Until.UTC()
	}
	valid := func(from, to, start, until string) Validity {
		return Validity{WrittenFrom: from, WrittenTo: to, From: utc(start), Until: utc(until)}
	}
	equal(t, "temporary", r.Temporary, []TemporaryRow{
		{Row: row(pos(2), span("0", "0.5", codes.OnlyNominal), 350_000, 850_000, false, "two days of 47 hours"), ID: "L-1", Speed: 40,
			Valid: valid("2026-03-28", "2026-03-29", "2026-03-27T23:00:00Z", "2026-03-29T22:00:00Z"), Reason: "clocks go forward"},
		{Row: row(pos(3), span("0.25", "0.75", codes.Both), 600_000, 1_100_000, true, ""), ID: "L-2", Speed: 50,
			Valid: valid("2026-03-01T06:00:00Z", "2026-03-01T08:30:00+01:00", "2026-03-01T06:00:00Z", "2026-03-01T07:30:00Z")},
		{Row: row(pos(4), span("3", "4", codes.Both), 3_350_000, 4_350_000, true, "no bounds"), ID: "L-3", Speed: 30},
		{Row: row(pos(5), span("3", "4", codes.Both), 3_350_000, 4_350_000, true, ""), ID: "L-4", Speed: 35,
			Valid: valid("2026-10-25", "", "2026-10-24T22:00:00Z", ""), Reason: "clocks go back"},
		{Row: row(pos(6), span("3", "4", codes.Both), 3_350_000, 4_350_000, true, ""), ID: "L-5", Speed: 45,
			Valid: valid("", "2026-10-25", "", "2026-10-25T23:00:00Z"), Reason: "clocks go back"},
	})

	pos = place("curves.csv")
	equal(t, "curves", r.Curves, []CurveRow{
		{Row: row(pos(2), span("0.1", "0.6", codes.Both), 450_000, 950_000, true, ""), RadiusM: 500, CantMM: 150, Hand: "left"},
		{Row: row(pos(3), span("0.6", "0.8", codes.Both), 950_000, 1_150_000, true, "touches"), RadiusM: 1, CantMM: 0, Hand: "right"},
		{Row: row(pos(4), span("2", "3", codes.Both), 2_350_000, 3_350_000, true, ""), RadiusM: 1_000_000, CantMM: 300},
	})

	pos = place("gradients.csv")
	gradient := func(line int, from, to string, start, end unit.Distance, slope int, note string) GradientRow {
		return GradientRow{Row: row(pos(line), span(from, to, codes.Both), start, end, true, note), Slope: slope}
	}
	equal(t, "gradients", r.Gradients, []GradientRow{
		gradient(2, "0", "1", 350_000, 1_350_000, 12_500, "up"),
		gradient(3, "1", "4.2", 1_350_000, 4_550_000, -8_000, "down"),
		gradient(4, "4.5", "5", 4_550_000, 5_050_000, 1, ""),
		gradient(5, "5", "6", 5_050_000, 6_050_000, 200_000, ""),
		gradient(6, "6", "7", 6_050_000, 7_050_000, -200_000, ""),
		gradient(7, "7", "8", 7_050_000, 8_050_000, 0, ""),
	})

	pos = place("places.csv")
	there := func(line int, from, to string, d codes.Directions, start, end unit.Distance) Row {
		return row(pos(line), span(from, to, d), start, end, true, "")
	}
	equal(t, "places", r.Places, []PlaceRow{
		{Row: there(2, "-0.2", "0.15", codes.Both, 150_000, 500_000), Kind: Station, Name: "Fenwater"},
		{Row: there(3, "1", "1", codes.Both, 1_350_000, 1_350_000), Kind: Crossing, Name: "Mill Lane", StrikeIn: 900_000, WarningDS: 270},
		{Row: there(4, "1.1", "1.1", codes.OnlyReverse, 1_450_000, 1_450_000), Kind: Crossing, Name: "Peat Road", StrikeIn: 1_050_125, WarningDS: 275},
		{Row: there(5, "2", "2", codes.Both, 2_350_000, 2_350_000), Kind: Bridge, Name: "Low Bridge"},
		{Row: there(6, "3", "3.4", codes.OnlyNominal, 3_350_000, 3_750_000), Kind: Tunnel, Name: "Hollow"},
		{Row: there(7, "4.5", "4.5", codes.Both, 4_550_000, 4_550_000), Kind: Junction, Name: "Aldersund East"},
		{Row: there(8, "5", "5", codes.Both, 5_050_000, 5_050_000), Kind: Signal, Name: "S 12"},
		{Row: there(9, "6", "6", codes.Both, 6_050_000, 6_050_000), Kind: Other, Name: "Hut"},
	})
}

// TestLoadFullPolicy compares the keys with the fingerprints that ssh-keygen
// -l gives for them.
func TestLoadFullPolicy(t *testing.T) {
	files := open(t, "full")
	p := load(t, files).Policy
	const lio, ruta = "lio@harbourline.example", "ruta@harbourline.example"
	equal(t, "persons", p.Persons, []Person{
		{Pos: at("signoff.toml", 3, 3), Principal: lio, Emails: []string{lio, "lio@users.example"}},
		{Pos: at("signoff.toml", 7, 3), Principal: ruta, Emails: []string{ruta}},
		{Pos: at("signoff.toml", 11, 3), Principal: "nils"},
	})
	equal(t, "roles", p.Roles, []Role{
		{Pos: at("signoff.toml", 14, 3), Name: "checker", Needed: 1, IndependentOf: []string{"preparer"},
			Places: RolePlaces{Needed: at("signoff.toml", 16, 10), IndependentOf: []source.Position{at("signoff.toml", 17, 19)}}},
		{Pos: at("signoff.toml", 19, 3), Name: "approver-2", Needed: 2, IndependentOf: []string{"preparer", "checker"}, Signers: []string{lio, ruta},
			Places: RolePlaces{
				Needed:        at("signoff.toml", 21, 10),
				IndependentOf: []source.Position{at("signoff.toml", 22, 19), at("signoff.toml", 22, 31)},
				Signers:       []source.Position{at("signoff.toml", 23, 12), at("signoff.toml", 23, 39)},
			}},
		{Pos: at("signoff.toml", 25, 3), Name: "in-service", Needed: 3, Places: RolePlaces{Needed: at("signoff.toml", 27, 10)}},
	})
	content := string(files[signersFile].Data)
	for i := range p.Keys {
		k := &p.Keys[i]
		k.ValidAfter, k.ValidBefore = k.ValidAfter.UTC(), k.ValidBefore.UTC()
		if written := strings.TrimSpace(string(ssh.MarshalAuthorizedKey(k.Public))); !strings.Contains(content, written) {
			t.Errorf("key %d is %s, which does not stand in the file", i, written)
		}
		k.Public = nil
	}
	equal(t, "keys", p.Keys, []Key{
		{Pos: at(signersFile, 3, 1), Principal: lio, Fingerprint: "SHA256:0UfJelI04bRQPByw0VKoHAgea7UUhGPQKDtoxA2IoEw"},
		{Pos: at(signersFile, 4, 1), Principal: lio, Fingerprint: "SHA256:9mVInt2njmVNWv8E1aqyohCa7yv13XBkDZk37AN9zCo",
			Namespaces: []string{"speedtrail-signoff", "file"}, ValidAfter: utc("2026-03-01T00:00:00Z"), ValidBefore: utc("2027-03-01T06:30:00Z")},
		{Pos: at(signersFile, 5, 1), Principal: ruta, Fingerprint: "SHA256:5JGcNG60/JTflXoetZm8rEB5fdaeJ1vrJp+inOiiNQg",
			ValidBefore: utc("2027-03-01T06:30:59Z")},
		{Pos: at(signersFile, 6, 1), Principal: "nils", Fingerprint: "SHA256:5lGJ7Sk3tKyvbdYcA2j6UxfC+z3+EDd/5pJTuxa5pQ0",
			Namespaces: []string{"speedtrail-signoff"}},
		{Pos: at(signersFile, 7, 1), Principal: "nils", Fingerprint: "SHA256:Qe2kPf007/3n3oqEkJOFFW26jAAUJ05ckMgB7CjpIE4"},
	})
}

// TestValidityWholeDays checks bare dates in zones where a day begins at one
// o'clock, because clocks go forward at midnight (IANA time zone database).
func TestValidityWholeDays(t *testing.T) {
	tests := []struct{ zone, from, to, start, until string }{
		{"UTC", "2026-02-28", "2026-02-28", "2026-02-28T00:00:00Z", "2026-03-01T00:00:00Z"},
		{"Europe/Oslo", "2026-12-31", "2026-12-31", "2026-12-30T23:00:00Z", "2026-12-31T23:00:00Z"},
		{"Asia/Kathmandu", "2026-01-01", "2026-01-02", "2025-12-31T18:15:00Z", "2026-01-02T18:15:00Z"},
		{"Africa/Cairo", "2025-04-25", "2025-04-25", "2025-04-24T22:00:00Z", "2025-04-25T21:00:00Z"},
		{"Africa/Cairo", "2025-04-24", "2025-04-24", "2025-04-23T22:00:00Z", "2025-04-24T22:00:00Z"},
		{"America/Santiago", "2025-09-07", "2025-09-07", "2025-09-07T04:00:00Z", "2025-09-08T03:00:00Z"},
		{"America/Santiago", "2025-09-06", "2025-09-06", "2025-09-06T04:00:00Z", "2025-09-07T04:00:00Z"},
		{"America/Havana", "2025-11-02", "2025-11-02", "2025-11-02T04:00:00Z", "2025-11-03T05:00:00Z"}, // midnight comes twice
		{"Pacific/Apia", "2011-12-29", "2011-12-29", "2011-12-29T10:00:00Z", "2011-12-30T10:00:00Z"},   // the next day does not exist
		{"Pacific/Apia", "2011-12-30", "2011-12-31", "2011-12-30T10:00:00Z", "2011-12-31T10:00:00Z"},   // nor this one
		{"Pacific/Kiritimati", "9999-12-31", "9999-12-31", "9999-12-30T10:00:00Z", "9999-12-31T10:00:00Z"},
	}
	for _, c := range tests {
		t.Run(c.zone+" "+c.from, func(t *testing.T) {
			files := with(small(), "dataset.toml", "format = 1\nname = \"Zone\"\ntime_zone = \""+c.zone+"\"\n")
			files = with(files, "routes/r1/temporary.csv", "id,from_km,to_km,speed,valid_from,valid_to\nL,1,2,50,"+c.from+","+c.to+"\n")
			v := load(t, files).Routes[0].Temporary[0].Valid
			got := v.From.UTC().Format(time.RFC3339) + " " + v.Until.UTC().Format(time.RFC3339)
			if want := c.start + " " + c.until; got != want {
				t.Errorf("valid %s, want %s", got, want)
			}
		})
	}
}
