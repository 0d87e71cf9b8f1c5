package doubt_test

import "time"

// EN 13803: I = 11.8 V²/R - D. On 1180 m, 160 km/h need exactly 256 mm of cant
// and cant deficiency together; on 1000 m, 302.08 mm.
var curveSpeed = []example{
	{name: "302 mm on 1000 m carry 159.98 km/h",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,152\n"},
		want:  "curve-speed both 1.000 2.000 speed.csv:2 cd150 is 160 km/h; on the curve of 1000 m with 152 mm of cant (curves.csv:2) that is a cant deficiency of 150.08 mm, and 150 mm carry 155 km/h\n"},
	{name: "303 mm carry 160.24 km/h",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,153\n"}},
	{name: "exactly at the limit: 256 mm on 1180 m",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,106\n"}},
	{name: "a millimetre below it",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,105\n"},
		want:  "curve-speed both 1.000 2.000 speed.csv:2 cd150 is 160 km/h; on the curve of 1180 m with 105 mm of cant (curves.csv:2) that is a cant deficiency of 151.00 mm, and 150 mm carry 155 km/h\n"},
	{name: "only the part of the curve that the row covers, only the row's direction",
		files: files{"speed.csv": header + "0,4,,100,,,,,,,,\n4,10,nominal,100,,,,160,,,,\n4,10,reverse,100,,,,,,,,\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n3.5,4.25,600,100\n"},
		// 11.8 x 25600 / 600 = 503.47; 250 mm carry sqrt(250 x 600 / 11.8) = 112.7 km/h.
		want: "curve-speed nominal 4.000 4.250 speed.csv:3 cd150 is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 150 mm carry 110 km/h\n"},
	{name: "each category against its own deficiency",
		files: files{"speed.csv": header + "0,10,,100,140,140,140,140,,,,\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,120\n"},
		// 11.8 x 19600 / 1000 = 231.28, 111.28 mm of deficiency: too much for 80 and 100 mm.
		want: "curve-speed both 1.000 2.000 speed.csv:2 cd100 is 140 km/h; on the curve of 1000 m with 120 mm of cant (curves.csv:2) that is a cant deficiency of 111.28 mm, and 100 mm carry 135 km/h\n" +
			"curve-speed both 1.000 2.000 speed.csv:2 cd80 is 140 km/h; on the curve of 1000 m with 120 mm of cant (curves.csv:2) that is a cant deficiency of 111.28 mm, and 80 mm carry 130 km/h\n"},
	{name: "the basic speed, for the highest category without one of its own",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,160,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		// 11.8 x 25600 / 600 = 503.47 mm; 130 + 100 mm carry 105 km/h, 11.8 x 11025 / 600 = 216.83.
		want: "curve-speed both 1.000 2.000 speed.csv:2 basic is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 130 mm carry 105 km/h\n"},
	{name: "a mistyped basic speed, and the column that it is above",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,10,170,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		// 11.8 x 28900 / 600 = 568.37 mm. The row is out of order as well.
		want: "category-order both 0.000 10.000 speed.csv:2 cd150 is 160 km/h, below the 170 km/h of basic\n" +
			"curve-speed both 1.000 2.000 speed.csv:2 basic is 170 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 468.37 mm, and 130 mm carry 105 km/h\n" +
			"curve-speed both 1.000 2.000 speed.csv:2 cd150 is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 150 mm carry 110 km/h\n"},
	{name: "a basic speed that every category has, more than any carries",
		files: files{"speed.csv": "from_km,to_km,basic\n0,10,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		// 300 + 100 mm carry 140 km/h, 11.8 x 19600 / 600 = 385.47.
		want: "curve-speed both 1.000 2.000 speed.csv:2 basic is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 300 mm carry 140 km/h\n"},
	{name: "a basic speed that some category carries, and the reference train does not",
		files: files{"speed.csv": "from_km,to_km,basic\n0,10,120\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		// 11.8 x 14400 / 600 = 283.2 mm.
		want: "curve-speed both 1.000 2.000 speed.csv:2 120 km/h for T; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 183.20 mm, and 150 mm carry 110 km/h\n"},
	{name: "a basic speed that the category of the reference train carries",
		files: files{"speed.csv": "from_km,to_km,basic\n0,10,110\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"}},
	{name: "a category's speed, of which the train's own maximum is left",
		files: files{"trains.toml": train("T", 150, "", "C2", 200, 140), "speed.csv": "from_km,to_km,basic,cd150\n0,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		// 11.8 x 19600 / 600 = 385.47 mm.
		want: "curve-speed both 1.000 2.000 speed.csv:2 140 km/h for T; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 285.47 mm, and 150 mm carry 110 km/h\n" +
			"curve-speed both 1.000 2.000 speed.csv:2 cd150 is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 150 mm carry 110 km/h\n"},
	{name: "another category in place of that of cant deficiency, which is too fast as well",
		files: files{"trains.toml": train("P", 150, `"passenger"`, "C2", 200, 200), "speed.csv": "from_km,to_km,basic,cd150,passenger,passenger_rule\n0,10,100,160,140,replaces\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"},
		want: "curve-speed both 1.000 2.000 speed.csv:2 140 km/h for P; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 285.47 mm, and 150 mm carry 110 km/h\n" +
			"curve-speed both 1.000 2.000 speed.csv:2 cd150 is 160 km/h; on the curve of 600 m with 100 mm of cant (curves.csv:2) that is a cant deficiency of 403.47 mm, and 150 mm carry 110 km/h\n"},
	{name: "a row that only touches the curve",
		files: files{"speed.csv": "from_km,to_km,basic,cd150\n0,1,100,160\n1,2,100,100\n2,10,100,160\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,600,100\n"}},
}

// At 50 km/h on 1180 m the equilibrium cant is 118 x 2500 / 11800 = 25 mm.
var cantExcess = []example{
	{name: "a millimetre above the limit",
		files: files{"dataset.toml": limits("cant_excess_mm = 110"), "speed.csv": "from_km,to_km,basic\n0,10,50\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,136\n"},
		want:  "cant-excess both 1.000 2.000 curves.csv:2 at 50 km/h, the lowest line speed of a reference train, the cant of 136 mm on 1180 m is an excess of 111.00 mm; the limit of dataset.toml is 110 mm\n"},
	{name: "rows of speed.csv that do not stand in the order of the track",
		files: files{"dataset.toml": limits("cant_excess_mm = 110"), "speed.csv": "from_km,to_km,basic\n5,10,100\n0,5,50\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,136\n"},
		want:  "cant-excess both 1.000 2.000 curves.csv:2 at 50 km/h, the lowest line speed of a reference train, the cant of 136 mm on 1180 m is an excess of 111.00 mm; the limit of dataset.toml is 110 mm\n"},
	{name: "exactly at the limit",
		files: files{"dataset.toml": limits("cant_excess_mm = 110"), "speed.csv": "from_km,to_km,basic\n0,10,50\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,135\n"}},
	{name: "no limit is set",
		files: files{"speed.csv": "from_km,to_km,basic\n0,10,50\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,200\n"}},
	{name: "the maximum speed of the slowest train",
		files: files{"dataset.toml": limits("cant_excess_mm = 131"), "trains.toml": train("T", 150, "", "C2", 200, 200) + train("U", 80, "", "C2", 200, 40), "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,150\n"},
		// 11.8 x 1600 / 1000 = 18.88 mm.
		want: "cant-excess both 1.000 2.000 curves.csv:2 at 40 km/h, the lowest line speed of a reference train, the cant of 150 mm on 1000 m is an excess of 131.12 mm; the limit of dataset.toml is 131 mm\n"},
	{name: "the speed of a category that a train has",
		files: files{"dataset.toml": limits("cant_excess_mm = 131"), "trains.toml": train("F", 80, `"freight_p"`, "C2", 200, 100), "speed.csv": header + "0,10,,100,,,,,40,,,\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,150\n"},
		want:  "cant-excess both 1.000 2.000 curves.csv:2 at 40 km/h, the lowest line speed of a reference train, the cant of 150 mm on 1000 m is an excess of 131.12 mm; the limit of dataset.toml is 131 mm\n"},
	{name: "a category that no reference train has",
		files: files{"dataset.toml": limits("cant_excess_mm = 131"), "speed.csv": header + "0,10,,100,,,,,40,,,\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1000,150\n"}},
	{name: "a basic speed that no reference train gets",
		files: files{"dataset.toml": limits("cant_excess_mm = 131"), "speed.csv": header + "0,10,,40,100,,,,,,,\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1200,150\n"}},
	{name: "slow beside the curve only",
		files: files{"dataset.toml": limits("cant_excess_mm = 110"), "speed.csv": "from_km,to_km,basic\n0,1,10\n1,2,100\n2,10,10\n", "curves.csv": "from_km,to_km,radius_m,cant_mm\n1,2,1180,200\n"}},
}

var categoryOrder = []example{
	{name: "below the next lower category",
		files: files{"speed.csv": header + "0,10,,100,,110,,105,,,,\n"},
		want:  "category-order both 0.000 10.000 speed.csv:2 cd150 is 105 km/h, below the 110 km/h of cd100\n"},
	{name: "below the basic speed, in one direction",
		files: files{"speed.csv": header + "0,10,nominal,100,95,,,,,,,\n0,10,reverse,100,,,,,,,,\n"},
		want:  "category-order nominal 0.000 10.000 speed.csv:2 cd80 is 95 km/h, below the 100 km/h of basic\n"},
	{name: "twice in a row",
		files: files{"speed.csv": header + "0,10,,100,,95,,90,,,,\n"},
		want: "category-order both 0.000 10.000 speed.csv:2 cd100 is 95 km/h, below the 100 km/h of basic\n" +
			"category-order both 0.000 10.000 speed.csv:2 cd150 is 90 km/h, below the 100 km/h of basic\n"},
	{name: "equal speeds", files: files{"speed.csv": header + "0,10,,100,100,100,100,100,,,,\n"}},
	{name: "rising", files: files{"speed.csv": header + "0,10,,100,105,110,,120,,,,\n"}},
	{name: "other categories may be slower", files: files{"speed.csv": header + "0,10,,100,,,,120,80,replaces,90,\n"}},
	{name: "lower in the next row", files: files{"speed.csv": header + "0,5,,100,,,,120,,,,\n5,10,,80,,,,90,,,,\n"}},
}

// The order of the categories: EN 15528, table 1, from memory.
var axleLoadOrder = []example{
	{name: "the heavier one faster",
		files: files{"axle-load.csv": "from_km,to_km,C2,D4\n1,2,60,80\n"},
		want:  "axle-load-order both 1.000 2.000 axle-load.csv:2 D4 may run at 80 km/h, the lighter C2 at 60 km/h\n"},
	{name: "the same axle load with more mass per length, one direction",
		files: files{"axle-load.csv": "from_km,to_km,direction,C2,C4\n1,2,reverse,60,65\n"},
		want:  "axle-load-order reverse 1.000 2.000 axle-load.csv:2 C4 may run at 65 km/h, the lighter C2 at 60 km/h\n"},
	{name: "equal speeds", files: files{"axle-load.csv": "from_km,to_km,C2,D4\n1,2,60,60\n"}},
	{name: "the heavier one slower", files: files{"axle-load.csv": "from_km,to_km,A,C2,D4,E5\n1,2,90,80,60,40\n"}},
	// C4 has less axle load and more mass per length than D2: neither is lighter.
	{name: "categories without an order", files: files{"axle-load.csv": "from_km,to_km,C2,C4,D2\n1,2,90,60,80\n2,3,90,80,60\n"}},
	{name: "in two rows", files: files{"axle-load.csv": "from_km,to_km,C2,D4\n1,2,60,60\n2,3,80,80\n"}},
}

// SUBSET-026 3.11.4.3: a category that is not listed is not restricted.
var axleLoadMissing = []example{
	{name: "a heavier train is left out",
		files: files{"trains.toml": train("H", 80, "", "E4", 500, 100), "axle-load.csv": "from_km,to_km,direction,C2,D4\n1,2,nominal,80,60\n"},
		want:  "axle-load-missing nominal 1.000 2.000 axle-load.csv:2 no speed for E4 (H), which the row then does not restrict\n"},
	{name: "neither lighter nor heavier",
		files: files{"trains.toml": train("H", 80, "", "D2", 500, 100), "axle-load.csv": "from_km,to_km,C4\n1,2,80\n"},
		want:  "axle-load-missing both 1.000 2.000 axle-load.csv:2 no speed for D2 (H), which the row then does not restrict\n"},
	{name: "heavier than one and lighter than another",
		files: files{"trains.toml": train("H", 80, "", "C2", 500, 100), "axle-load.csv": "from_km,to_km,B1,E5\n1,2,80,60\n"},
		want:  "axle-load-missing both 1.000 2.000 axle-load.csv:2 no speed for C2 (H), which the row then does not restrict\n"},
	{name: "each category once, by its first train",
		files: files{"trains.toml": train("J", 80, "", "E5", 500, 100) + train("I", 80, "", "E4", 500, 100) + train("H", 80, "", "E4", 500, 100) + train("A", 80, "", "A", 500, 100), "axle-load.csv": "from_km,to_km,D4\n1,2,60\n"},
		want:  "axle-load-missing both 1.000 2.000 axle-load.csv:2 no speed for E4 (I), E5 (J), which the row then does not restrict\n"},
	{name: "lighter than all", files: files{"axle-load.csv": "from_km,to_km,D2,D4\n1,2,80,60\n"}},
	{name: "listed", files: files{"axle-load.csv": "from_km,to_km,C2,D4\n1,2,80,60\n"}},
	{name: "no reference train of it", files: files{"axle-load.csv": "from_km,to_km,C2\n1,2,80\n"}},
	{name: "every cell is blank, whatever the trains",
		files: files{"axle-load.csv": "from_km,to_km,direction,C2,D4\n1,2,reverse,,\n2,3,,80,60\n"},
		want:  "axle-load-missing reverse 1.000 2.000 axle-load.csv:2 no speed for any category: the row restricts no train\n"},
	{name: "no row at all", files: files{"axle-load.csv": "from_km,to_km,D4\n"}},
}

var temporaryExpired = []example{
	{name: "the day after a bare date, which is inclusive",
		files: files{"temporary.csv": "id,from_km,to_km,direction,speed,valid_to\nTSR-1,1,2,reverse,40,2026-03-01\n"},
		want:  "temporary-expired reverse 1.000 2.000 temporary.csv:2 TSR-1, 40 km/h, was valid to 2026-03-01\n"},
	{name: "its last second", at: then.Add(-time.Second),
		files: files{"temporary.csv": "id,from_km,to_km,speed,valid_to\nTSR-1,1,2,40,2026-03-01\n"}},
	{name: "a date-time is exclusive",
		files: files{"temporary.csv": "id,from_km,to_km,speed,valid_to\nTSR-1,1,2,40,2026-03-02T00:00:00Z\n"},
		want:  "temporary-expired both 1.000 2.000 temporary.csv:2 TSR-1, 40 km/h, was valid to 2026-03-02T00:00:00Z\n"},
	{name: "a second later",
		files: files{"temporary.csv": "id,from_km,to_km,speed,valid_to\nTSR-1,1,2,40,2026-03-02T00:00:01Z\n"}},
	{name: "the day of the time zone",
		files: files{"dataset.toml": plain["dataset.toml"] + "time_zone = \"America/New_York\"\n", "temporary.csv": "id,from_km,to_km,speed,valid_to\nTSR-1,1,2,40,2026-03-01\n"}},
	{name: "without an end, and not yet in force",
		files: files{"temporary.csv": "id,from_km,to_km,speed,valid_from\nTSR-1,1,2,40,\nTSR-2,1,2,40,2030-01-01\n"}},
}

var temporaryNoEffect = []example{
	{name: "as fast as the line",
		files: files{"temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 100 km/h, is nowhere below the line speed, at most 100 km/h here for any train\n"},
	{name: "another direction is faster",
		files: files{"speed.csv": header + "0,10,nominal,100,,,,,,,,\n0,10,reverse,120,,,,,,,,\n", "temporary.csv": "id,from_km,to_km,direction,speed\nTSR-1,1,2,nominal,110\nTSR-2,1,2,reverse,110\nTSR-3,1,2,both,110\n"},
		want:  "temporary-without-effect nominal 1.000 2.000 temporary.csv:2 TSR-1, 110 km/h, is nowhere below the line speed, at most 100 km/h here for any train\n"},
	{name: "a line speed that only touches it",
		files: files{"speed.csv": "from_km,to_km,basic\n0,1,120\n1,2,90\n2,10,120\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,90\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 90 km/h, is nowhere below the line speed, at most 90 km/h here for any train\n"},
	{name: "a category that only limits does not make the line faster",
		files: files{"speed.csv": header + "0,10,,100,,,,,,,160,\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,120\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 120 km/h, is nowhere below the line speed, at most 100 km/h here for any train\n"},
	{name: "the row that it ends in holds the train as long, in one direction of travel",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,1,90,yes\n1,2,90,yes\n2,10,120,yes\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 100 km/h, is nowhere below the line speed, at most 90 km/h here for any train\n"},
	{name: "it holds no train behind the stretch itself",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,2,90,no\n2,10,120,yes\n", "temporary.csv": "id,from_km,to_km,speed,train_length_delay\nTSR-1,1,2,100,no\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 100 km/h, is nowhere below the line speed, at most 90 km/h here for any train\n"},
	{name: "it holds the length of a train behind the stretch, where the row lets go for the front",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,2,90,no\n2,10,120,yes\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
	{name: "the same against the distance",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,1,120,yes\n1,10,90,no\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
	{name: "against the distance, the row that it begins in lets go, and the one that it ends in does not",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,1,120,yes\n1,1.5,90,no\n1.5,10,90,yes\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
	{name: "against the distance, the row that it begins in holds the train as long",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,1,120,yes\n1,1.5,90,yes\n1.5,10,90,no\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 100 km/h, is nowhere below the line speed, at most 90 km/h here for any train\n"},
	{name: "the faster stretch is further off than a train is long",
		files: files{"speed.csv": "from_km,to_km,basic,train_length_delay\n0,3,90,no\n3,10,120,yes\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"},
		want:  "temporary-without-effect both 1.000 2.000 temporary.csv:2 TSR-1, 100 km/h, is nowhere below the line speed, at most 90 km/h here for any train\n"},
	{name: "5 km/h below", files: files{"temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,95\n"}},
	{name: "below on a metre", files: files{"speed.csv": "from_km,to_km,basic\n0,1.999,100\n1.999,10,105\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
	{name: "below a category", files: files{"speed.csv": header + "0,10,,100,,,,120,,,,\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
	{name: "below a category that replaces", files: files{"speed.csv": header + "0,10,,100,,,,,120,replaces,,\n", "temporary.csv": "id,from_km,to_km,speed\nTSR-1,1,2,100\n"}},
}
