package krylov

import "math"

// A Function is f of f(A) M⁻¹b, in the variable that B has: for an eigenvalue z of B
// it gives g(z) = f((1/z - 1)/γ)/z. It is called for z in [0, 1].
type Function func(z float64) float64

// Heat is f(x) = exp(-t x): what is left after time t of the initial load.
func Heat(t, shift float64) Function {
	tau := t / shift
	return func(z float64) float64 {
		if z <= 0 {
			return 0
		}
		return math.Exp(-tau*(1-z)/z) / z
	}
}

// Supply is f(x) = (1 - exp(-t x))/x: what a load that is given anew in each unit of
// time adds up to after time t.
func Supply(t, shift float64) Function {
	tau := t / shift
	return func(z float64) float64 {
		if z <= 0 {
			return shift
		}
		// (1 - exp(-τw))/(w z) with w = (1-z)/z; its limit for w → 0 is τ/z.
		w := (1 - z) / z
		if tau*w < 1e-300 {
			return t / z
		}
		return -math.Expm1(-tau*w) / (w * z) * shift
	}
}
