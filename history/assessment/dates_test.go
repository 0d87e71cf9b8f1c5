package assessment_test

import (
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// Other dates are told whenever they were; that all of it is past by the time of the
// target is said beside them, as where a restriction that has expired is taken out.
func TestDatesOfThePast(t *testing.T) {
	const head = "id,from_km,to_km,speed,valid_from,valid_to\n"
	for _, x := range []struct {
		name, until, past string
	}{
		{"over long ago", "2026-01-31", "; none of it after 2026-02-01T00:00:00Z, before the time of the target"},
		{"over at that time", at.Format("2006-01-02T15:04:05Z07:00"), "; none of it after " + at.Format("2006-01-02T15:04:05Z07:00") + ", before the time of the target"},
		{"not over yet", "2026-05-01", ""},
		{"never over", "", ""},
	} {
		t.Run(x.name, func(t *testing.T) {
			c := compute(t, texts{"temporary.csv": head + "OLD,12,13,40,," + x.until + "\nNEXT,12,13,40,2030-06-01,\n"},
				texts{"temporary.csv": head + "NEXT,12,13,40,2030-06-01,\n"}, nil)
			var list []string
			for _, f := range c.Findings {
				if f.ID == assessment.DatesChanged {
					list = append(list, f.Text)
				}
			}
			if len(list) != 1 || strings.Contains(list[0], "none of it") != (x.past != "") || !strings.HasSuffix(list[0], x.past) {
				t.Errorf("%q, want an end of %q", list, x.past)
			}
		})
	}
}
