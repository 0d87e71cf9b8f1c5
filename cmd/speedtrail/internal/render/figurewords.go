package render

import (
	"fmt"

	"speedtrail/history/assessment"
)

// motionWords says how running times were got.
func motionWords(c *assessment.Computed) string {
	ends := "start and end at rest"
	if c.Options.Rolling {
		ends = "start and end at the speed of the profile"
	}
	return "Fastest run over the whole route, " + ends + ", with the constant acceleration and braking of trains.toml, in closed form on the step profile " +
		"(v²/2a for each change of speed; the train brakes to be at the lower speed where its front meets it). Minutes and seconds; minus is faster." + otherLengths(c)
}

// otherLengths says of which routes the running times before and after are over track
// that differs: of a route that was split, the time of the part that left is no gain.
func otherLengths(c *assessment.Computed) string {
	timed := map[string]bool{}
	for _, r := range c.Figures.Runs {
		timed[r.Route] = true
	}
	var routes []string
	for _, r := range c.Routes {
		if timed[r.ID] && len(r.Track) > 0 {
			routes = append(routes, r.ID)
		}
	}
	if routes == nil {
		return ""
	}
	return " The track differs on " + fewNames(routes, mostRoutes) + ": times before and after are not over the same track there."
}

const crossingWords = "Time from the strike-in point to the crossing for the fastest train that the rows admit, of any category, without length: " +
	"the sum of length over speed of each step, exactly, rounded down to tenths of a second."

func crossingLine(x assessment.CrossingFigure) string {
	before := "no such approach before"
	if x.Before >= 0 {
		before = fmt.Sprintf("%d.%d s before", x.Before/10, x.Before%10)
		if x.StrikeInBefore != 0 && x.StrikeInBefore != x.StrikeIn {
			before += ", over " + metres(x.StrikeInBefore) + " m"
		}
	}
	s := fmt.Sprintf("%s, %d.%d s now, over %s m", before, x.After/10, x.After%10, metres(x.StrikeIn))
	if x.Permanent {
		s += ", when no temporary restriction is in force"
	}
	if x.WarningBefore != 0 && x.WarningBefore != x.Warning {
		s += fmt.Sprintf("; before, %d.%d s were needed", x.WarningBefore/10, x.WarningBefore%10)
	}
	switch {
	case x.Warning == 0:
		return s + "; the needed warning time is not given"
	case x.After < x.Warning:
		return s + fmt.Sprintf("; TOO SHORT, %d.%d s are needed", x.Warning/10, x.Warning%10)
	}
	return s + fmt.Sprintf("; %d.%d s are needed", x.Warning/10, x.Warning%10)
}

const curveWords = "Cant deficiency I = 11.8 V²/R \u2212 D (EN 13803; V in km/h, R in m, cant D in mm) at the highest effective speed in the curve, " +
	"against the train's category; cant excess at the lowest speed of the slowest reference train."

func curveLine(x assessment.CurveFigure) string {
	s := fmt.Sprintf("R %d m, D %d mm, ", x.Radius, x.Cant)
	if x.CantBefore >= 0 && (x.CantBefore != x.Cant || x.RadiusB != x.Radius) {
		s = fmt.Sprintf("R %d m, D %d mm (before R %d m, D %d mm), ", x.Radius, x.Cant, x.RadiusB, x.CantBefore)
	}
	if x.Before > 0 && x.CantBefore >= 0 {
		s += fmt.Sprintf("%d km/h with I %s mm before, ", x.Before, hundredths(x.DeficiencyB))
	}
	s += fmt.Sprintf("%d km/h with I %s mm now, category %d mm", x.After, hundredths(x.Deficiency), x.Category)
	if x.Over {
		s += ", ABOVE THE CATEGORY"
	}
	if x.Excess > 0 {
		s += fmt.Sprintf("; excess %s mm at %d km/h (%s)", hundredths(x.Excess), x.Lowest, x.Slowest)
	}
	return s
}

func shortLine(x assessment.ShortFigure) string {
	return fmt.Sprintf("%d km/h for %s m, the train reaches %d km/h before it must brake; %s m would be needed", x.Speed, metres(x.Length), x.Reached, metres((x.Needed+999)/1000*1000))
}

// hundredths writes hundredths of a millimetre as millimetres.
func hundredths(n int64) string {
	sign := ""
	if n < 0 {
		sign, n = "\u2212", -n
	}
	return fmt.Sprintf("%s%d.%02d", sign, n/100, n%100)
}

// curvesOfInterest leaves out the curves on which no speed changes and none is
// above the category: those that were only measured or canted anew.
func curvesOfInterest(list []assessment.CurveFigure) (out []assessment.CurveFigure) {
	for _, x := range list {
		if x.Before != x.After || x.Over {
			out = append(out, x)
		}
	}
	return out
}

// directionWords words a direction of travel or both.
func directionWords(d string) string {
	if d == "both" {
		return "both directions"
	}
	return d
}
