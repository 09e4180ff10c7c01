package sparse

import "math/bits"

// minimumDegree orders a small piece of a graph by exact minimum degree, its neighbours outside the piece
// counted, as they will be eliminated later and fill as well. Sets of neighbours are bits, so that an elimination is a
// union of words: O(m²·(m+boundary)/64) for m vertices in the worst case.
type minimumDegree struct {
	rows   []uint64
	degree []int32
	order  []int32
	outer  []int32 // neighbours outside the piece
}

// sort permutes verts, the vertices of piece id. index is scratch with an entry for each vertex of the
// graph; entries of the piece are overwritten, entries outside it must be -1 and are again afterwards.
func (md *minimumDegree) sort(g *graph, verts []int32, part []int32, id int32, index []int32) {
	m := len(verts)
	if m <= 2 {
		return
	}
	for k, v := range verts {
		index[v] = int32(k)
	}
	// Separators are shared with other pieces that are being ordered at the same time, so
	// vertices outside are found in a list, not marked.
	md.outer = md.outer[:0]
	for _, v := range verts {
		for _, w := range g.neighbours(v) {
			if part[w] != id {
				md.outer = append(md.outer, w)
			}
		}
	}
	sortUnique(&md.outer)
	words := (m + len(md.outer) + 63) / 64
	md.rows = append(md.rows[:0], make([]uint64, m*words)...)
	md.degree = append(md.degree[:0], make([]int32, m)...)
	rows := md.rows
	for k, v := range verts {
		row := rows[k*words : k*words+words]
		for _, w := range g.neighbours(v) {
			j := 0
			if part[w] == id {
				j = int(index[w])
			} else {
				j = m + search(md.outer, w)
			}
			row[j>>6] |= 1 << (j & 63)
		}
		for _, x := range row {
			md.degree[k] += int32(bits.OnesCount64(x))
		}
	}
	inner := make([]int32, 0, 256)
	md.order = md.order[:0]
	const gone = 1 << 30
	for range m {
		pivot, least := 0, int32(gone)
		for k, d := range md.degree {
			if d < least {
				pivot, least = k, d
			}
		}
		md.order = append(md.order, verts[pivot])
		md.degree[pivot] = gone
		row := rows[pivot*words : pivot*words+words]
		inner = inner[:0]
		for x, word := range row {
			for ; word != 0; word &= word - 1 {
				j := x<<6 + bits.TrailingZeros64(word)
				if j >= m {
					break
				}
				inner = append(inner, int32(j))
			}
			if x<<6+63 >= m {
				break
			}
		}
		for _, u := range inner {
			other := rows[int(u)*words : int(u)*words+words]
			d := 0
			for x, word := range row {
				other[x] |= word
			}
			other[pivot>>6] &^= 1 << (pivot & 63)
			other[u>>6] &^= 1 << (u & 63)
			for _, word := range other {
				d += bits.OnesCount64(word)
			}
			md.degree[u] = int32(d)
		}
	}
	copy(verts, md.order)
}
