package continuation

import "math/bits"

// The first primitive polynomials and direction numbers of Joe & Kuo, Constructing
// Sobol' sequences with better two-dimensional projections, SIAM Journal on
// Scientific Computing 30 (2008) 2635-2654, for dimensions 2 to 21; the first needs
// none.
var sobolTable = [...]struct {
	inner uint32 // coefficients of the polynomial without the first and the last
	m     []uint32
}{
	{0, []uint32{1}},
	{1, []uint32{1, 3}},
	{1, []uint32{1, 3, 1}},
	{2, []uint32{1, 1, 1}},
	{1, []uint32{1, 1, 3, 3}},
	{4, []uint32{1, 3, 5, 13}},
	{2, []uint32{1, 1, 5, 5, 17}},
	{4, []uint32{1, 1, 5, 5, 5}},
	{7, []uint32{1, 1, 7, 11, 19}},
	{11, []uint32{1, 1, 5, 1, 1}},
	{13, []uint32{1, 1, 1, 3, 11}},
	{14, []uint32{1, 3, 5, 5, 31}},
	{1, []uint32{1, 3, 3, 9, 7, 49}},
	{13, []uint32{1, 1, 1, 15, 21, 21}},
	{16, []uint32{1, 3, 1, 13, 27, 49}},
	{19, []uint32{1, 1, 1, 15, 7, 5}},
	{22, []uint32{1, 3, 1, 15, 13, 25}},
	{25, []uint32{1, 1, 5, 5, 19, 61}},
	{1, []uint32{1, 3, 7, 11, 23, 15, 103}},
	{4, []uint32{1, 3, 7, 13, 13, 15, 69}},
}

const (
	sobolDimensions = len(sobolTable) + 1
	sobolBits       = 32
)

// A sobol is a low-discrepancy sequence of points in the unit cube (Sobol' 1967), in
// the order of the Gray code (Antonov & Saleev 1979). Points are had by their number,
// so that several goroutines can share it.
type sobol struct {
	directions [][sobolBits]uint32 // of each dimension
}

func newSobol(dimensions int) *sobol {
	s := &sobol{make([][sobolBits]uint32, dimensions)}
	for d := range s.directions {
		v := &s.directions[d]
		if d == 0 {
			for k := range v {
				v[k] = 1 << (sobolBits - 1 - k)
			}
			continue
		}
		row := sobolTable[d-1]
		degree := len(row.m)
		for k := range v {
			if k < degree {
				v[k] = row.m[k] << (sobolBits - 1 - k)
				continue
			}
			v[k] = v[k-degree] ^ v[k-degree]>>degree
			for l := 1; l < degree; l++ {
				if row.inner>>(degree-1-l)&1 == 1 {
					v[k] ^= v[k-l]
				}
			}
		}
	}
	return s
}

// point stores point number k in u. Number 0 is the corner 0, number 1 the centre.
func (s *sobol) point(k uint32, u []float64) {
	gray := k ^ k>>1
	for d := range s.directions {
		var x uint32
		for g := gray; g != 0; g &= g - 1 {
			x ^= s.directions[d][bits.TrailingZeros32(g)]
		}
		u[d] = float64(x) / (1 << sobolBits)
	}
}

// A spread gives starts in the unit cube of any dimension, the centre first. In more
// dimensions than the sequence serves, a start is a profile: linear between knots
// that the sequence sets. The many states of one model are mostly the values of a
// field at neighbouring places, and a noisy field is no start for Newton's method.
type spread struct {
	sequence *sobol
	knots    int
}

const profileKnots = 6

func newSpread(dimensions int) *spread {
	knots := dimensions
	if dimensions > sobolDimensions {
		knots = profileKnots
	}
	return &spread{newSobol(knots), knots}
}

// start stores start number i, from 0, in u.
func (s *spread) start(i int, u []float64) {
	number := uint32(i + 1)
	if len(u) == s.knots {
		s.sequence.point(number, u)
		return
	}
	at := make([]float64, s.knots)
	s.sequence.point(number, at)
	for k := range u {
		place := float64(k) / float64(len(u)-1) * float64(s.knots-1)
		left := min(int(place), s.knots-2)
		u[k] = at[left] + (place-float64(left))*(at[left+1]-at[left])
	}
}
