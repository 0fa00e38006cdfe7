package income

import "math"

// Rouwenhorst discretises by the method of
//
//	K. G. Rouwenhorst, "Asset pricing implications of equilibrium business cycle
//	models", in T. F. Cooley (ed.), Frontiers of Business Cycle Research,
//	Princeton (1995) 294–330,
//
// with the parameters of
//
//	K. A. Kopecky and R. M. H. Suen, "Finite state Markov-chain approximations to
//	highly persistent processes", Review of Economic Dynamics 13 (2010) 701–714.
//	doi:10.1016/j.red.2010.02.002
//
// n nodes lie evenly on ±σ_z·√(n−1), p = (1+ρ)/2, Θ_2 = [p 1−p; 1−p p] and
//
//	Θ_n = p·[Θ 0; 0 0] + (1−p)·[0 Θ; 0 0] + (1−p)·[0 0; Θ 0] + p·[0 0; 0 Θ],
//
// Θ being Θ_{n−1}, interior rows halved. For every n ≥ 2 and every node the
// conditional mean ρ·z and the conditional variance σ² are exact, the stationary
// law is Binomial(n−1, ½), and the kurtosis is 3 − 2/(n−1).
type Rouwenhorst struct {
	Points int // nodes, 2 to 1000
}

// Name returns "rouwenhorst".
func (Rouwenhorst) Name() string { return "rouwenhorst" }

// Discretise implements Discretiser. The cost is O(Points³).
func (r Rouwenhorst) Discretise(p AR1) (*Chain, error) {
	if err := validate(p, r.Points, 1); err != nil {
		return nil, err
	}
	if p.InnovationSD == 0 {
		return Degenerate(), nil
	}
	n := r.Points
	c := &Chain{Nodes: evenly(n, p.StationarySD()*math.Sqrt(float64(n-1)))}
	if err := c.distinct(p); err != nil {
		return nil, err
	}
	stay, leave := (1+p.Autocorrelation)/2, (1-p.Autocorrelation)/2 // each with its own digits
	m := []float64{stay, leave, leave, stay}
	for k := 3; k <= n; k++ {
		m = widen(m, k, stay, leave)
	}
	c.Transition = m
	return c, nil
}

// widen builds the k×k matrix from the (k−1)×(k−1) one.
func widen(m []float64, k int, stay, leave float64) []float64 {
	w := make([]float64, k*k)
	for i := range k - 1 {
		for j := range k - 1 {
			x := m[i*(k-1)+j]
			w[i*k+j] += stay * x
			w[i*k+j+1] += leave * x
			w[(i+1)*k+j] += leave * x
			w[(i+1)*k+j+1] += stay * x
		}
	}
	for i := k; i < k*(k-1); i++ {
		w[i] /= 2
	}
	return w
}

// evenly returns n points on [−half, half], symmetric to the bit.
func evenly(n int, half float64) []float64 {
	z := make([]float64, n)
	for i := range n / 2 {
		z[n-1-i] = half * float64(n-1-2*i) / float64(n-1)
		z[i] = -z[n-1-i]
	}
	return z
}
