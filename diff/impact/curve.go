package impact

import (
	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// CantDeficiency gives the cant deficiency on a curve, in hundredths of a
// millimetre, rounded to the nearest: I = 11.8 V²/R - D (EN 13803, standard
// gauge with 1500 mm between wheel contact circles; V in km/h, radius R in
// metres, cant D in millimetres). Below zero it is a cant excess.
func CantDeficiency(v unit.Speed, radiusM, cantMM int) int64 {
	n, r := 1180*int64(v)*int64(v), int64(radiusM)
	return (2*n+r)/(2*r) - 100*int64(cantMM)
}

// CantDeficiencyAbove tells, without rounding, whether the cant deficiency at a
// speed is above a limit in millimetres: 118 V² > 10 R (D + I).
func CantDeficiencyAbove(v unit.Speed, radiusM, cantMM, limitMM int) bool {
	return 118*int64(v)*int64(v) > 10*int64(radiusM)*int64(cantMM+limitMM)
}

// CantExcessAbove tells, without rounding, whether the cant excess at a speed is
// above a limit in millimetres: 10 R (D - E) > 118 V².
func CantExcessAbove(v unit.Speed, radiusM, cantMM, limitMM int) bool {
	return 10*int64(radiusM)*int64(cantMM-limitMM) > 118*int64(v)*int64(v)
}

// SpeedForCantDeficiency gives the highest speed, a multiple of 5 km/h, at which
// the cant deficiency does not exceed a limit in millimetres; 0 where there is
// none.
func SpeedForCantDeficiency(radiusM, cantMM, limitMM int) unit.Speed {
	v := unit.Speed(0)
	for v < unit.MaxSpeed && !CantDeficiencyAbove(v+unit.SpeedStep, radiusM, cantMM, limitMM) {
		v += unit.SpeedStep
	}
	return v
}

// Extremes gives the highest and the lowest speed of a profile on a stretch.
func Extremes(f step.Func, from, to unit.Distance) (highest, lowest unit.Speed) {
	cur := f.CursorAt(from)
	highest, lowest = cur.Piece().Speed, cur.Piece().Speed
	for from < to {
		cur.Advance(from)
		p := cur.Piece()
		highest, lowest = max(highest, p.Speed), min(lowest, p.Speed)
		from = p.To
	}
	return highest, lowest
}
