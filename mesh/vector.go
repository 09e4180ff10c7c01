package mesh

import "math"

func point3(x []float64, v int32) [3]float64 { return [3]float64(x[3*v : 3*v+3]) }

func minus3(a, b [3]float64) [3]float64 {
	return [3]float64{a[0] - b[0], a[1] - b[1], a[2] - b[2]}
}

func dot3(a, b [3]float64) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }

func cross3(a, b [3]float64) [3]float64 {
	return [3]float64{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
}

func length3(a [3]float64) float64 { return math.Sqrt(dot3(a, a)) }
