package dense

import "math"

// subMul is c - a·b, rounded once where the processor can. Where it cannot, math.FMA
// would be emulated at fifty times the cost, so there it rounds twice.
func subMul(c, a, b float64) float64 {
	if hasFMA {
		return math.FMA(-a, b, c)
	}
	return c - float64(a*b)
}
