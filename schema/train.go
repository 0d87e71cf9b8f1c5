package schema

import (
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// Train is a reference train of trains.toml. It has exactly one cant
// deficiency category and any number of others (SUBSET-026 3.11.3.3.2).
type Train struct {
	Pos        source.Position // of the [[train]]
	MaxPos     source.Position // of max_speed_kmh
	ID, Name   string
	Cant       codes.CantDeficiency
	Categories codes.CategorySet
	AxleLoad   codes.AxleLoad
	Length     unit.Distance // 1 m to 4,095 m (SUBSET-026 L_TRAIN)
	Max        unit.Speed    // SUBSET-026 V_MAXTRAIN
	// Acceleration and braking for running times, in thousandths of m/s²; 0
	// where they are not given.
	Acceleration, Braking int
}

// Same tells whether two definitions describe the same train, wherever they
// stand in the file.
func (t Train) Same(u Train) bool {
	t.Pos, t.MaxPos, u.Pos, u.MaxPos = source.Position{}, source.Position{}, source.Position{}, source.Position{}
	return t == u
}
