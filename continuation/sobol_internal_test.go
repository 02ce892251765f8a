package continuation

import (
	"slices"
	"testing"
)

// Points of the unscrambled sequence in 21 dimensions, times 1024, as SciPy 1.10 gives
// them (scipy.stats.qmc.Sobol, which has the direction numbers of Joe & Kuo).
func TestSobol(t *testing.T) {
	s := newSobol(sobolDimensions)
	u := make([]float64, sobolDimensions)
	for k, want := range map[uint32][]float64{
		3:    {256, 768, 768, 768, 256, 256, 768, 256, 256, 256, 256, 256, 768, 768, 256, 768, 256, 768, 256, 768, 768},
		7:    {128, 640, 384, 128, 128, 384, 640, 640, 640, 896, 640, 128, 640, 384, 128, 128, 128, 128, 640, 896, 896},
		20:   {480, 96, 864, 288, 160, 864, 928, 224, 608, 544, 992, 32, 800, 32, 224, 928, 672, 480, 160, 160, 608},
		1023: {1, 771, 627, 149, 191, 449, 143, 633, 353, 871, 695, 37, 133, 681, 371, 475, 321, 897, 599, 327, 887},
	} {
		s.point(k, u)
		for i := range u {
			u[i] *= 1024
		}
		if !slices.Equal(u, want) {
			t.Errorf("point %d: %v, want %v", k, u, want)
		}
	}
}

// Every start lies in the cube, the first in the middle, in any dimension.
func TestSpread(t *testing.T) {
	for _, n := range []int{1, 2, sobolDimensions, sobolDimensions + 1, 200} {
		s := newSpread(n)
		u := make([]float64, n)
		for i := range 300 {
			s.start(i, u)
			if slices.Min(u) < 0 || slices.Max(u) >= 1 {
				t.Fatalf("start %d in %d dimensions: %v", i, n, u)
			}
			if i == 0 && (slices.Min(u) != 0.5 || slices.Max(u) != 0.5) {
				t.Errorf("the first start in %d dimensions is %v", n, u)
			}
		}
	}
}
