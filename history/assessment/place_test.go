package assessment_test

import (
	"fmt"
	"strings"
	"testing"

	"speedtrail/history/assessment"
)

// A finding that joins changes says only of those trains that they see its largest
// step which do, and whether each of them sees a change all along it.
func TestFindingNamesTrains(t *testing.T) {
	static := func(v int) string {
		return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,4,60,no\n4,6,%d,no\n6,20,60,no\n", v)
	}
	two := func(axle string, top int) string {
		return trainText("T", 80, "", "C2", 200, 200) + trainText("U", 80, "", axle, 200, top)
	}
	const axle = "from_km,to_km,C2,E5,train_length_delay\n"
	for _, x := range []struct {
		name         string
		base, target texts
		want         string
	}{
		{"alike", texts{"trains.toml": two("C2", 200), "speed.csv": static(80)}, texts{"speed.csv": static(100)}, "raised by up to 20 km/h, 80 to 100 (T, U): no change request is in play"},
		{"one is slower", texts{"trains.toml": two("C2", 90), "speed.csv": static(80)}, texts{"speed.csv": static(100)}, "raised by up to 20 km/h, 80 to 100 (T; other speeds for U): no change request is in play"},
		{"one sees a part", texts{"trains.toml": two("E5", 200), "speed.csv": static(80), "axle-load.csv": axle + "5,6,,50,no\n"}, texts{"speed.csv": static(100)},
			"raised by up to 20 km/h, 80 to 100 (T, U; not each of them throughout): no change request is in play"},
		{"with a gap", texts{"trains.toml": two("E5", 200), "speed.csv": static(80), "axle-load.csv": axle + "5,5.5,,50,no\n"}, texts{"speed.csv": static(100)},
			"raised by up to 20 km/h, 80 to 100 (T, U; not each of them throughout): no change request is in play"},
		{"one behind the other", texts{"trains.toml": two("E5", 200), "axle-load.csv": axle + "4,5,60,,no\n5,6,,50,no\n"}, texts{"axle-load.csv": axle + "5,6,,60,no\n"},
			"raised by up to 40 km/h, 60 to 100 (T; other speeds for U; not each of them throughout): no change request is in play"},
	} {
		t.Run(x.name, func(t *testing.T) {
			var got []string
			for _, f := range compute(t, over(oneWay, x.base), x.target, nil).Findings {
				if f.ID == assessment.Outside {
					got = append(got, f.Text)
				}
			}
			if strings.Join(got, "\n") != x.want {
				t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), x.want)
			}
		})
	}
}
