package policy

import "math"

// assetOffsets returns n distances from the borrowing limit,
//
//	g_i = scale · (exp(x_i) − 1),   x_i even on [0, ln(1 + top/scale)],
//
// so that nodes lie close together where the rule bends and by equal ratios far
// above it. Without a limit the grid is even on [0, top].
func assetOffsets(n int, top, scale float64, limited bool) []float64 {
	g := make([]float64, n)
	width := math.Log1p(top / scale)
	for i := range g {
		x := float64(i) / float64(n-1)
		if limited {
			g[i] = scale * math.Expm1(float64(i)*width/float64(n-1))
		} else {
			g[i] = top * x
		}
	}
	return g
}
