package assessment

// Fleet is the account of a route and direction for every train that the
// standard can describe.
type Fleet struct {
	Changes   []FleetChange `json:"changes"`
	Direction string        `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	// LeftOut are lengths of trains, between the shortest and the longest, that see
	// changes which are not listed.
	LeftOut []int64 `json:"left_out_lengths_mm"`
	Longest int64   `json:"longest_mm"`
	// Permanent: without temporary restrictions; only what then differs from the
	// account with them.
	Permanent bool    `json:"permanent"`
	Reach     []Reach `json:"reach"` // outside, no train up to the longest sees a change
	Route     string  `json:"route"`
	Shortest  int64   `json:"shortest_mm"`
}

// Reach is a stretch on which some train of some length sees a change.
type Reach struct {
	From string `json:"from_km"`
	To   string `json:"to_km"`
}

// FleetChange is a change that products of category sets see.
type FleetChange struct {
	After   int         `json:"after_kmh"`
	Before  int         `json:"before_kmh"`
	From    string      `json:"from_km"`
	Length  int64       `json:"length_mm"`
	RunOut  bool        `json:"run_out"`
	To      string      `json:"to_km"`
	Lengths []int64     `json:"train_lengths_mm"`
	Members []FleetPart `json:"trains"`
}

// FleetPart is a product of category sets.
type FleetPart struct {
	Represented bool   `json:"represented"` // a reference train of its categories sees the change
	Who         string `json:"who"`
}

// Figures are aids for the reader of a change.
type Figures struct {
	Crossings []CrossingFigure `json:"crossings"`
	Curves    []CurveFigure    `json:"curves"`
	Runs      []RunFigure      `json:"runs"`
	Short     []ShortFigure    `json:"short_raises"`
}

// RunFigure is a running time over a whole route.
type RunFigure struct {
	After     int64     `json:"after_ds"` // tenths of a second
	Before    int64     `json:"before_ds"`
	Direction string    `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	Parts     []RunPart `json:"parts"` // where the difference comes from, if from several places; empty, too, where the tracks differ
	Route     string    `json:"route"`
	Train     string    `json:"train"`
}

// RunPart is a stretch and the time gained on it, negative where it is lost.
type RunPart struct {
	From string `json:"from_km"`
	Gain int64  `json:"gain_ds"`
	To   string `json:"to_km"`
}

// CrossingFigure is the approach of the fastest train to a level crossing.
type CrossingFigure struct {
	After     int64  `json:"after_ds"`  // tenths of a second, rounded down
	Before    int64  `json:"before_ds"` // by the base's own strike-in; -1 where it has no such approach
	Direction string `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	Km        string `json:"km"`
	Name      string `json:"name"`
	Permanent bool   `json:"permanent"` // without temporary restrictions
	Route     string `json:"route"`
	// StrikeInBefore and WarningBefore are those of the base's crossing, 0 where it has
	// none here or does not give them.
	StrikeInBefore int64 `json:"strike_in_before_mm"`
	StrikeIn       int64 `json:"strike_in_mm"`
	WarningBefore  int64 `json:"warning_before_ds"`
	Warning        int64 `json:"warning_ds"` // needed; 0 where it is not given
}

// CurveFigure is the cant deficiency on a curve for trains of equal speeds and
// category.
type CurveFigure struct {
	After       int    `json:"after_kmh"`      // highest effective speed in the curve
	Before      int    `json:"before_kmh"`     // 0 where the base's track differs here
	CantBefore  int    `json:"cant_before_mm"` // -1 where the base has no such curve
	Cant        int    `json:"cant_mm"`
	Category    int    `json:"category_mm"`
	DeficiencyB int64  `json:"deficiency_before_hundredths_mm"` // before, with the radius and cant of then; 0 where not known
	Deficiency  int64  `json:"deficiency_hundredths_mm"`        // after, hundredths of a millimetre
	Direction   string `json:"direction" jsonschema:"enum=nominal,enum=reverse,enum=both"`
	Excess      int64  `json:"excess_hundredths_mm"` // of the slowest train, below zero for a deficiency
	From        string `json:"from_km"`
	Lowest      int    `json:"lowest_kmh"` // of the slowest reference train
	Over        bool   `json:"over"`       // the deficiency is above the category
	RadiusB     int    `json:"radius_before_m"`
	Radius      int    `json:"radius_m"`
	Route       string `json:"route"`
	Row         string `json:"row"`
	Slowest     string `json:"slowest"`
	To          string `json:"to_km"`
	Trains      []int  `json:"trains"`
}

// ShortFigure is a raise that a train cannot use in full.
type ShortFigure struct {
	Direction string `json:"direction" jsonschema:"enum=nominal,enum=reverse"`
	From      string `json:"from_km"`
	Length    int64  `json:"length_mm"`
	Needed    int64  `json:"needed_mm"`
	Reached   int    `json:"reached_kmh"` // rounded down
	Route     string `json:"route"`
	Speed     int    `json:"speed_kmh"`
	To        string `json:"to_km"`
	Train     string `json:"train"`
}
