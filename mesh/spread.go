package mesh

// Spread describes how a set of numbers is distributed.
type Spread struct {
	Min    float64 `json:"min"`
	P1     float64 `json:"p1"` // one in a hundred lies below
	P25    float64 `json:"p25"`
	Median float64 `json:"median"`
	P75    float64 `json:"p75"`
	P99    float64 `json:"p99"`
	Max    float64 `json:"max"`
	Mean   float64 `json:"mean"`
}

// spread measures x, which must not be empty and is put in another order. A quantile q of n
// numbers is the one of rank round(q(n-1)), counted from 0. O(n).
func spread(x []float64) *Spread {
	s := &Spread{}
	for _, v := range x {
		s.Mean += v / float64(len(x))
	}
	from := 0
	for _, q := range []struct {
		at float64
		to *float64
	}{{0, &s.Min}, {0.01, &s.P1}, {0.25, &s.P25}, {0.5, &s.Median}, {0.75, &s.P75}, {0.99, &s.P99}, {1, &s.Max}} {
		k := int(q.at*float64(len(x)-1) + 0.5)
		selectNumber(x[from:], k-from) // everything before from is smaller
		*q.to, from = x[k], k
	}
	return s
}

// selectNumber puts the k-th smallest at place k (Hoare's Find, 1961), with a random
// pivot from a fixed sequence: no file is made against it, and results repeat.
func selectNumber(x []float64, k int) {
	state := uint64(len(x))
	for len(x) > 1 {
		state = state*6364136223846793005 + 1442695040888963407
		pivot := x[int(state>>33)%len(x)]
		i, j := 0, len(x)-1
		for i <= j {
			for x[i] < pivot {
				i++
			}
			for x[j] > pivot {
				j--
			}
			if i <= j {
				x[i], x[j] = x[j], x[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			x = x[:j+1]
		case k >= i:
			x, k = x[i:], k-i
		default:
			return
		}
	}
}
