package impact

import (
	"math/big"

	"speedtrail/schema/unit"
)

// digits is the precision, in bits, of the computation that decides a rounding.
const digits = 256

// exactTenths makes the sum of Compute again with long numbers. They are the
// same on every machine, and a time that close to the middle between two tenths
// is rounded up.
func (r *Run) exactTenths() int64 {
	f := r.profile
	n := len(f)
	num := func(x int64) *big.Float { return new(big.Float).SetPrec(digits).SetInt64(x) }
	op := func() *big.Float { return new(big.Float).SetPrec(digits) }
	least := func(x, y *big.Float) *big.Float {
		if x.Cmp(y) < 0 {
			return x
		}
		return y
	}
	a, b := num(int64(r.motion.Acceleration)), num(int64(r.motion.Braking))
	speed := func(v unit.Speed) *big.Float { return op().Quo(num(int64(v)*2500), num(9)) }
	square := func(x *big.Float) *big.Float { return op().Mul(x, x) }
	length := func(i int) *big.Float { return num(int64(f[i].To - f[i].From)) }
	// Edges are kept as squares; a root is taken only where a time needs it.
	edges := make([]*big.Float, n+1)
	edges[0], edges[n] = num(0), num(0)
	if r.motion.Rolling {
		edges[0], edges[n] = square(speed(f[0].Speed)), square(speed(f[n-1].Speed))
	}
	for i := 1; i < n; i++ {
		edges[i] = square(speed(min(f[i-1].Speed, f[i].Speed)))
	}
	gain := func(rate *big.Float, i int) *big.Float { return op().Mul(op().Mul(num(2), rate), length(i)) }
	for i := range n {
		edges[i+1] = least(edges[i+1], op().Add(edges[i], gain(a, i)))
	}
	for i := n - 1; i >= 0; i-- {
		edges[i] = least(edges[i], op().Add(edges[i+1], gain(b, i)))
	}
	total := num(0)
	for i := range n {
		in, out := op().Sqrt(edges[i]), op().Sqrt(edges[i+1])
		top := op().Add(op().Mul(gain(a, i), b), op().Add(op().Mul(b, edges[i]), op().Mul(a, edges[i+1])))
		top = least(op().Quo(top, op().Add(a, b)), square(speed(f[i].Speed)))
		peak := op().Sqrt(top)
		up := op().Quo(op().Sub(top, edges[i]), op().Mul(num(2), a))
		down := op().Quo(op().Sub(top, edges[i+1]), op().Mul(num(2), b))
		hold := op().Quo(op().Sub(length(i), op().Add(up, down)), peak)
		total.Add(total, op().Quo(op().Sub(peak, in), a))
		total.Add(total, op().Quo(op().Sub(peak, out), b))
		total.Add(total, hold)
	}
	// Half a tenth more, and a hair for a time that is exactly in the middle.
	total.Add(op().Mul(total, num(10)), big.NewFloat(0.5))
	total.Add(total, op().SetMantExp(num(1), -150))
	tenths, _ := total.Int64()
	return tenths
}
