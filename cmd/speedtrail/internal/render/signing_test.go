package render

import (
	"strings"
	"testing"
)

// Who is about to sign sees which doubtful data nobody looked for: no finding is no
// proof there.
func TestBeforeSigningUnchecked(t *testing.T) {
	d := pageDocument("R1")
	for _, off := range []bool{false, true} {
		if off {
			d.Computed.Limits.Unchecked = []string{"cant-excess", "step-size"}
		}
		var b strings.Builder
		if err := BeforeSigning(&b, d, Record{}, Style{Width: 200}); err != nil {
			t.Fatal(err)
		}
		const want = "\nNot looked for, as dataset.toml sets no limit in either revision: cant-excess (cant_excess_mm), step-size (largest_step_kmh).\n"
		if strings.Contains(b.String(), want) != off {
			t.Errorf("limits off: %v, before signing:\n%s", off, b.String())
		}
	}
}
