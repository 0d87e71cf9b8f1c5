package demo

import (
	"time"

	"speedtrail/history/compose"
)

// The people of the Brackwater network. All of them are invented.
var (
	okello  = compose.Person{Name: "Ilse Okello", Email: "i.okello@brackwater.example"}
	marsh   = compose.Person{Name: "Tobin Marsh", Email: "t.marsh@brackwater.example"}
	deverel = compose.Person{Name: "Ana Deverel", Email: "a.deverel@brackwater.example"}
	quist   = compose.Person{Name: "Per Quist", Email: "p.quist@brackwater.example"}
)

// step is one commit of the history: edits on a branch, or a merge into main.
type step struct {
	branch string // "main", or the branch it is made on, which begins at main
	merge  string // branch that is merged into main
	who    compose.Person
	when   string // 2025-03-04T09:00
	text   string
	edits  []edit
	tag    string
}

// edit replaces a piece of a file that occurs once. An empty old is the whole
// file, which is then new or replaced; an empty new together with it removes
// the file. A rename moves a folder.
type edit struct {
	file, old, now string
	rename         string        // new name of the folder "file"
	made           func() string // in place of now, where it takes time that a start of the program is to be spared
}

func at(when string) time.Time {
	t, err := time.Parse("2006-01-02T15:04", when)
	if err != nil {
		panic(err) // a date of this file is mistyped
	}
	return t.UTC()
}

// steps is the year of the network. The last release, from release-2025.4 to
// release-2026.1, is the one to look at; see the package comment.
var steps = []step{
	{branch: "main", who: okello, when: "2025-03-03T08:30", text: "Start the register of line speeds", tag: "release-2025.1",
		edits: nil},
	{branch: "main", who: marsh, when: "2025-03-19T10:05", text: "BW1: temporary restriction at Doubledean\n\nPoints renewal.",
		edits: []edit{{file: "routes/bw1/temporary.csv", old: "formation wet bed\n", now: "formation wet bed\nTSR-12,41.050#2,41.200#2,40,2025-03-24,2025-05-16,points renewal\n"}}},
	{branch: "tolden", who: deverel, when: "2025-04-02T09:40", text: "BW3: raise Ashling plain to 110\n\nSleepers renewed from 13.6 to 27.8.",
		edits: []edit{
			{file: "routes/bw3/speed.csv", old: "13.600,27.800,100,110,120,80,", now: "13.600,27.800,110,120,130,80,"},
			{file: "requests/CR-2501.toml", now: request("CR-2501", "Raise 100 to 110 on the Ashling plain", "Sleepers renewed, design note BN-118", declare("BW3", 13.6, 27.8, "raise", ""))},
		}},
	{branch: "main", who: marsh, when: "2025-04-22T14:20", text: "BW2: track renewal done, TSR-14 lifted early",
		edits: []edit{{file: "routes/bw2/temporary.csv", old: "TSR-14,30.500,31.000,80,2025-04-01,2025-06-30,track renewal\n", now: ""}}},
	{branch: "main", merge: "tolden", who: okello, when: "2025-05-06T11:00", text: "Merge the Ashling plain"},
	{branch: "main", who: marsh, when: "2025-05-19T07:50", text: "BW1: points at Doubledean renewed, TSR-12 lifted",
		edits: []edit{{file: "routes/bw1/temporary.csv", old: "TSR-12,41.050#2,41.200#2,40,2025-03-24,2025-05-16,points renewal\n", now: ""}}},
	{branch: "main", who: okello, when: "2025-06-02T12:00", text: "Limits for doubtful data", tag: "release-2025.2",
		edits: []edit{{file: "dataset.toml", old: "time_zone = \"UTC\"\n", now: "time_zone = \"UTC\"\n\n[limits]\ncant_excess_mm = 110\nlargest_step_kmh = 130\nshortest_stretch_m = 120\n"}}},
	{branch: "railcar", who: quist, when: "2025-06-16T09:15", text: "Add the light railcar to the reference trains\n\nCo-authored-by: Ana Deverel <a.deverel@brackwater.example>",
		edits: []edit{{file: "trains.toml", old: "[[train]]\nid = \"MAIL\"", now: "[[train]]\nid = \"CAR\"\nname = \"Light railcar\"\ncant_deficiency_mm = 130\ncategories = [\"passenger\"]\naxle_load = \"A\"\nlength_m = 25\nmax_speed_kmh = 120\nacceleration_ms2 = 0.70\nbraking_ms2 = 0.90\n\n[[train]]\nid = \"MAIL\""}}},
	{branch: "saddle", who: deverel, when: "2025-06-24T16:30", text: "BW1: realignment at Saddle Junction\n\nThe new alignment is 450 m shorter: the posts from 18.200 to 18.650 are gone.",
		edits: []edit{
			{file: "routes/bw1/route.toml", old: "# Survey of 1911", now: "# Realignment of 2025: the posts between 18.200 and 18.650 are gone.\n[[jump]]\narriving_km = 18.200\nleaving_km = 18.650\n\n# Survey of 1911"},
			{file: "requests/CR-2507.toml", now: request("CR-2507", "Realignment at Saddle Junction", "New alignment in service, as-built survey of June", declare("BW1", 18.2, 18.65, "any", ""))},
		}},
	{branch: "main", merge: "railcar", who: okello, when: "2025-07-01T10:00", text: "Merge the light railcar"},
	{branch: "main", who: marsh, when: "2025-07-14T08:10", text: "BW2: embankment at Reedham cut shows movement, 60 km/h",
		edits: []edit{{file: "routes/bw2/temporary.csv", old: "reason\n", now: "reason\nTSR-31,19.800,24.200,60,2025-07-14,,embankment movement\n"}}},
	{branch: "main", who: okello, when: "2025-07-28T09:00", text: "A new key for R. Holm from August on",
		edits: []edit{{file: "allowed_signers", made: func() string { return allowedSigners(true) }}}},
	{branch: "main", merge: "saddle", who: okello, when: "2025-08-04T09:00", text: "Merge the realignment", tag: "release-2025.3"},
	{branch: "main", who: quist, when: "2025-08-20T15:45", text: "Rename the folder of the flyover\n\nIt was the only one with a name of its own.",
		edits: []edit{{file: "routes/bw5-flyover", rename: "routes/bw5"}}},
	{branch: "main", who: marsh, when: "2025-09-03T07:30", text: "BW3: Ashling platform works",
		edits: []edit{{file: "routes/bw3/temporary.csv", now: "id,from_km,to_km,speed,valid_from,valid_to,reason\nTSR-36,20.300,20.600,50,2025-09-08,2025-12-12,platform works\n"}}},
	{branch: "larch", who: deverel, when: "2025-09-16T11:20", text: "BW1: recanting of Larch Hill curve, 120 to 140 mm",
		edits: []edit{
			{file: "routes/bw1/curves.csv", old: "6.200,9.800,700,120,left", now: "6.200,9.800,700,140,left"},
			{file: "routes/bw1/speed.csv", old: "# Larch Hill curve, R 700 m, cant 120 mm\n6.200,9.800,105,120,125,130,150,80,", now: "# Larch Hill curve, R 700 m, cant 140 mm\n6.200,9.800,110,125,130,130,155,80,"},
			{file: "requests/CR-2511.toml", now: request("CR-2511", "Raise speeds through Larch Hill curve", "Recanted to 140 mm, design note BN-131", declare("BW1", 6.2, 9.8, "raise", ""))},
		}},
	{branch: "main", who: quist, when: "2025-09-30T17:05", text: "BW4: table saved again from the spreadsheet", // byte order mark, CRLF, trailing commas, other order of columns
		edits: []edit{{file: "routes/bw4/speed.csv", now: "\uFEFFfrom_km,to_km,basic,freight_g,direction,note,,\r\n100.000,101.000,60,,both,Tolden,,\r\n101.000,112.000,80,70,both,,,\r\n112.000,118.000,80,70,nominal,,,\r\n112.000,118.000,80,50,reverse,loaded trains downhill,,\r\n118.000,124.300,90,70,both,,,\r\n124.300,125.000,30,,both,Quarrow pit,,\r\n,,,,,,,\r\n"}}},
	{branch: "main", merge: "larch", who: okello, when: "2025-10-07T10:40", text: "Merge the recanting of Larch Hill"},
	{branch: "main", who: marsh, when: "2025-10-13T08:00", text: "BW1: formation at 14.2 rebuilt, TSR-11 lifted",
		edits: []edit{{file: "routes/bw1/temporary.csv", old: "TSR-11,14.200,14.600,60,2025-03-10,2025-09-30,formation wet bed\n", now: ""}}},
	{branch: "main", who: okello, when: "2025-11-10T13:00", text: "Accept the steps at the two termini", tag: "release-2025.4",
		edits: []edit{{file: "accepted.toml", now: "# Findings that were looked at.\n\n[[accepted]]\nfinding = \"step-size\"\nroute = \"BW2\"\nfrom_km = 44.0\nto_km = 44.2\nreason = \"Terminus throat behind a long straight, design note BN-090\"\n\n[[accepted]]\nfinding = \"step-size\"\nroute = \"BW1\"\nfrom_km = 58.8\nto_km = 59.0\nreason = \"Terminus throat, design note BN-091\"\n"}}},

	// From here on: the last release.
	{branch: "priors", who: deverel, when: "2025-12-01T09:30", text: "BW1: recanting of Priors Wood curve, 100 to 140 mm",
		edits: []edit{
			{file: "routes/bw1/curves.csv", old: "33.000,34.500,450,100,left", now: "33.000,34.500,450,140,left"},
			{file: "routes/bw1/speed.csv", old: "33.000,34.500,80,90,95,100,115,70,\"Priors Wood curve, R 450 m, cant 100 mm\"", now: "33.000,34.500,90,100,105,105,125,70,\"Priors Wood curve, R 450 m, cant 140 mm\""},
			{file: "requests/CR-2601.toml", now: request("CR-2601", "Raise speeds through Priors Wood curve", "Recanted to 140 mm, design note BN-144", declare("BW1", 33.0, 34.5, "raise", ""), declare("BW1", 22.4, 25.1, "raise", ""))},
		}},
	{branch: "sallow", who: quist, when: "2025-12-09T15:10", text: "BW2: Sallow sidings and the embankment\n\nCo-authored-by: Tobin Marsh <t.marsh@brackwater.example>",
		edits: []edit{
			{file: "routes/bw2/speed.csv", old: "20.000,24.000,100,100,100,100,,,80,embankment under observation", now: "20.000,24.000,120,130,130,130,,,80,embankment rebuilt"},
			{file: "routes/bw2/speed.csv", old: "from_km,to_km,basic,cd130,cd150,cd275,freight_p", now: "from_km,to_km,basic,cd130,cd150,cd275,cd300,freight_p"},
			{file: "routes/bw2/speed.csv", old: "0.000,1.200,60,,,,,,,", now: "0.000,1.200,60,,,,,,,,"},
			{file: "routes/bw2/speed.csv", old: "1.200,8.400,140,150,160,180,120", now: "1.200,8.400,140,150,160,180,,120"},
			{file: "routes/bw2/speed.csv", old: "8.400,10.100,100,110,115,140,,,80", now: "8.400,10.100,100,110,115,140,160,,,80"},
			{file: "routes/bw2/speed.csv", old: "10.100,20.000,140,150,160,180,120", now: "10.100,20.000,140,150,160,180,,120"},
			{file: "routes/bw2/speed.csv", old: "20.000,24.000,120,130,130,130,,,80", now: "20.000,24.000,120,130,130,130,,,,80"},
			{file: "routes/bw2/speed.csv", old: "24.000,37.500,140,150,160,180,120", now: "24.000,37.500,140,150,160,180,,120"},
			{file: "routes/bw2/speed.csv", old: "37.500,38.300,120,130,135,160,100", now: "37.500,38.300,120,130,135,160,,120"},
			{file: "routes/bw2/speed.csv", old: "38.300,44.100,140,150,160,180,120", now: "38.300,44.100,140,150,160,180,,120"},
			{file: "routes/bw2/speed.csv", old: "44.100,45.000,40,,,,,,,", now: "44.100,45.000,40,,,,,,,,"},
			{file: "requests/CR-2603.toml", now: request("CR-2603", "Sallow sidings: freight in P from 100 to 120", "Sidings closed, design note BN-147", declare("BW2", 37.5, 38.3, "raise", `["MAIL", "TIMB"]`))},
		}},
	{branch: "main", who: marsh, when: "2025-12-15T08:20", text: "BW3: platform works at Ashling take longer, TSR-36 stays in the table",
		edits: []edit{{file: "routes/bw3/temporary.csv", old: "2025-12-12,platform works", now: "2026-01-30,platform works"}}},
	{branch: "pit", who: deverel, when: "2026-01-12T10:00", text: "BW4: Quarrow pit line",
		edits: []edit{
			{file: "routes/bw4/speed.csv", old: "101.000,112.000,80,70,both,,,\r\n", now: "101.000,109.000,80,70,both,,,\r\n109.000,109.600,60,60,both,Pit Lane sighting,,\r\n109.600,112.000,80,70,both,,,\r\n"},
			{file: "routes/bw4/speed.csv", old: "118.000,124.300,90,70,both", now: "118.000,124.300,100,70,both"},
			{file: "requests/CR-2604.toml", now: request("CR-2604", "Quarrow pit line: sighting at Pit Lane, better track from 118", "Hedge of a neighbour, resurfacing", declare("BW4", 109.0, 109.6, "lower", ""), declare("BW4", 118.0, 124.3, "raise", `["TIMB", "ENG"]`))},
		}},
	{branch: "main", merge: "priors", who: okello, when: "2026-01-19T11:30", text: "Merge Priors Wood curve"},
	{branch: "bridge", who: quist, when: "2026-01-27T16:50", text: "BW3: tidy up the table of the Ferrow bridge\n\nOne row for each bearing plan, as the bridge office numbers them. No change of speeds.",
		edits: []edit{{file: "routes/bw3/axle-load.csv", old: "12.280,12.500,60,40,30,30,\"Ferrow bridge, three spans\"", now: "12.280,12.390,60,40,30,30,\"Ferrow bridge, spans 1 and 2\"\n12.390,12.500,60,40,,30,\"Ferrow bridge, span 3\""}}},
	{branch: "main", merge: "sallow", who: okello, when: "2026-02-03T10:15", text: "Merge Sallow and the embankment"},
	{branch: "flyover", who: deverel, when: "2026-02-10T09:05", text: "BW5: new expansion joint on the flyover",
		edits: []edit{
			{file: "routes/bw5/speed.csv", old: "7.400,7.900,60,60,70\n", now: "7.400,7.550,60,60,70\n7.550,7.800,100,110,120\n7.800,7.900,60,60,70\n"},
			{file: "requests/CR-2606.toml", now: request("CR-2606", "Flyover: 100 between the joints", "Expansion joint renewed", declare("BW5", 7.55, 7.8, "raise", ""))},
		}},
	{branch: "main", merge: "bridge", who: okello, when: "2026-02-17T14:00", text: "Merge the table of the Ferrow bridge"},
	{branch: "main", merge: "pit", who: okello, when: "2026-02-17T14:10", text: "Merge the pit line"},
	{branch: "main", merge: "flyover", who: okello, when: "2026-03-02T09:00", text: "Merge the flyover", tag: "release-2026.1"},
}
