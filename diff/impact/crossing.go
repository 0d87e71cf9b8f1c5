package impact

import (
	"math/big"

	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Approach gives the stretch between the strike-in point of a crossing and the
// crossing, in a direction of travel. It is false where the crossing has no
// strike-in, or where it lies beyond the end of the route.
func Approach(p *schema.PlaceRow, d codes.Direction, length unit.Distance) (from, to unit.Distance, ok bool) {
	if p.Kind != schema.Crossing || p.StrikeIn == 0 || !p.Directions.Has(d) {
		return 0, 0, false
	}
	from, to = p.Start-p.StrikeIn, p.Start
	if d == codes.Reverse {
		from, to = p.End, p.End+p.StrikeIn
	}
	return from, to, from >= 0 && to <= length
}

// ApproachTenths gives the time in tenths of a second, rounded down, that a
// train at the speed of the profile takes from one running distance to another:
// the sum of the lengths of the steps over their speeds, exactly. Rounded down
// it is below a warning time in tenths just if the exact time is.
func ApproachTenths(f step.Func, from, to unit.Distance) int64 {
	sum := new(big.Rat)
	for cur := f.CursorAt(from); from < to; {
		cur.Advance(from)
		p := cur.Piece()
		end := min(to, p.To)
		// 1 km/h = 2500/9 mm/s, so that a step takes 9 L / (250 V) tenths.
		sum.Add(sum, big.NewRat(9*int64(end-from), 250*int64(p.Speed)))
		from = end
	}
	return new(big.Int).Quo(sum.Num(), sum.Denom()).Int64()
}
