package render

import "testing"

// What a spreadsheet could take for a formula stands behind an apostrophe, also in what
// would be a cell of its own where semicolons divide cells.
func TestHarmless(t *testing.T) {
	for _, c := range [][2]string{
		{"", ""},
		{"BW1", "BW1"},
		{"routes/r1/speed.csv:3 basic 60; train 80", "routes/r1/speed.csv:3 basic 60; train 80"},
		{"-1.5", "-1.5"},
		{"-1.5#2", "-1.5#2"},
		{"-1.5x", "'-1.5x"},
		{"=1+1", "'=1+1"},
		{"+1", "'+1"},
		{"@SUM(A1)", "'@SUM(A1)"},
		{"\t=1", "'\t=1"},
		{"\uff1d1+1", "'\uff1d1+1"},
		{"Tidy up;=1+1", "Tidy up;'=1+1"},
		{`Tidy up;"=1+1";x`, `Tidy up;'"=1+1";x`},
		{";;-1;@x", ";;-1;'@x"},
		{"routes/r1;=1+1/speed.csv:3 basic 60", "routes/r1;'=1+1/speed.csv:3 basic 60"},
		{"a=b; =c", "a=b; =c"}, // a blank in front makes it a text
	} {
		if got := harmless(c[0]); got != c[1] {
			t.Errorf("%q became %q, want %q", c[0], got, c[1])
		}
	}
}
