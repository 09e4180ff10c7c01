package kernel

import "math"

// orderByKey lists the given vertices by their key, least first, equal keys as they
// stood. Keys must be 0 or more (+Inf is fine): the bits of such numbers sort as they
// do. A radix sort, four passes of 16 bits: O(n).
func orderByKey(vertices []int32, key []float64) []int32 {
	const radix = 1 << 16
	from, to := append([]int32(nil), vertices...), make([]int32, len(vertices))
	var count [radix + 1]int32
	for shift := 0; shift < 64; shift += 16 {
		clear(count[:])
		for _, v := range from {
			count[math.Float64bits(key[v])>>shift%radix+1]++
		}
		for i := range radix {
			count[i+1] += count[i]
		}
		for _, v := range from {
			digit := math.Float64bits(key[v]) >> shift % radix
			to[count[digit]] = v
			count[digit]++
		}
		from, to = to, from
	}
	return from
}
