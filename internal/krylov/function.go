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

// HeatTotal is f(x) = (1 - exp(-t x))/x, the integral of Heat over the time from 0 to
// t; it is the same function as Supply.
func HeatTotal(t, shift float64) Function { return Supply(t, shift) }

// SupplyTotal is f(x) = (t - (1 - exp(-t x))/x)/x, the integral of Supply.
func SupplyTotal(t, shift float64) Function {
	return func(z float64) float64 {
		if z <= 0 {
			return t * shift
		}
		s := t / shift * (1 - z) / z // t x
		var phi float64              // (s - 1 + exp(-s))/s²
		if s < 0.05 {
			phi = 1.0/2 - s*(1.0/6-s*(1.0/24-s*(1.0/120-s*(1.0/720-s*(1.0/5040-s/40320)))))
		} else {
			phi = (s + math.Expm1(-s)) / s / s
		}
		return t * t * phi / z
	}
}
