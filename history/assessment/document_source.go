package assessment

// SourceFile is a file that differs: row by row and line by line.
type SourceFile struct {
	Base   string    `json:"base"`  // path, empty: the file is new
	Hunks  []Hunk    `json:"hunks"` // empty where only Note says what differs
	Note   string    `json:"note"`  // for example that only line ends differ
	Rows   []RowDiff `json:"rows"`
	Target string    `json:"target"`
}

// RowDiff is a difference of rows: applying those of a file to the base's rows
// gives the target's.
type RowDiff struct {
	BaseLines []int      `json:"base_lines"`
	Cells     []CellDiff `json:"cells"`
	// Effect: changes, hidden (by temporary restrictions today), track, or none.
	Effect      string `json:"effect" jsonschema:"enum=changes,enum=hidden,enum=track,enum=none"`
	Kind        string `json:"kind" jsonschema:"enum=added,enum=removed,enum=altered,enum=moved,enum=split,enum=merged"`
	Reason      string `json:"reason"` // why no change comes of it
	Table       string `json:"table"`  // of a TOML file: the array of tables, or empty
	TargetLines []int  `json:"target_lines"`
}

// CellDiff is a cell that differs. Of an added or removed row all cells that
// are not blank are listed.
type CellDiff struct {
	After      string `json:"after"`
	BaseLine   int    `json:"base_line"` // 0: an added row
	Before     string `json:"before"`
	Column     string `json:"column"`
	TargetLine int    `json:"target_line"` // 0: a removed row
}

// Hunk is a run of lines around differences.
type Hunk struct {
	BaseLine   int    `json:"base_line"` // number of its first line, from 1
	Lines      []Line `json:"lines"`
	TargetLine int    `json:"target_line"`
}

// Line is a line of a hunk: Op is "=" for one that both have, "-" and "+" for
// one that only the base or the target has.
type Line struct {
	Op   string `json:"op" jsonschema:"enum==,enum=-,enum=+"`
	Text string `json:"text"`
}
