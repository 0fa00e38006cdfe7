package income

import (
	"math"
	"slices"
)

// Stationary returns the distribution that a year leaves unchanged, by the
// elimination of
//
//	W. K. Grassmann, M. I. Taksar and D. P. Heyman, "Regenerative analysis and
//	steady state distributions for Markov chains", Operations Research 33 (1985)
//	1107–1116. doi:10.1287/opre.33.5.1107
//
// which subtracts nothing and so keeps its digits at any persistence. Nodes that
// the chain leaves for good have probability 0. It panics if the chain falls into
// parts that never meet, for then there is no single such distribution. The cost
// is O(n³).
func (c *Chain) Stationary() []float64 {
	class, single := c.recurrent(math.SmallestNonzeroFloat64)
	if !single {
		panic("income: the chain falls into parts that never meet")
	}
	p := make([]float64, c.Len())
	for k, q := range eliminate(c.restrict(class)) {
		p[class[k]] = q
	}
	return p
}

// recurrent returns, ascending, the nodes of a class that the chain never leaves,
// and whether every node leads to it. Moves less likely than least do not count.
func (c *Chain) recurrent(least float64) (class []int, single bool) {
	from := 0
	for { // each turn goes deeper into the order of classes: at most n turns
		there, back := c.reach(from, false, least), c.reach(from, true, least)
		class, from = class[:0], -1
		for j := range there {
			if there[j] {
				class = append(class, j)
			}
			if there[j] && !back[j] {
				from = j // no way back: the class lies further on
			}
		}
		if from < 0 {
			return class, !slices.Contains(back, false)
		}
	}
}

// reach marks the nodes that can be reached from a node, itself included, or,
// backwards, those from which it can be reached, by moves not less likely than
// least.
func (c *Chain) reach(from int, backwards bool, least float64) []bool {
	n := c.Len()
	seen := make([]bool, n)
	seen[from] = true
	for queue := []int{from}; len(queue) > 0; queue = queue[1:] {
		i := queue[0]
		for j := range n {
			p := c.Transition[i*n+j]
			if backwards {
				p = c.Transition[j*n+i]
			}
			if p >= least && !seen[j] {
				seen[j] = true
				queue = append(queue, j)
			}
		}
	}
	return seen
}

// restrict returns the transition matrix among the nodes of a class.
func (c *Chain) restrict(class []int) (a []float64, n int) {
	for _, i := range class {
		for _, j := range class {
			a = append(a, c.Row(i)[j])
		}
	}
	return a, len(class)
}

// eliminate returns the stationary distribution of an irreducible n×n matrix,
// which it overwrites. After the step that removes node k, rows and columns below
// k describe the chain watched only while it is below k.
func eliminate(a []float64, n int) []float64 {
	for k := n - 1; k > 0; k-- {
		out := 0.0
		for j := range k {
			out += a[k*n+j]
		}
		for i := range k {
			a[i*n+k] /= out
			for j := range k {
				a[i*n+j] += a[i*n+k] * a[k*n+j]
			}
		}
	}
	p := make([]float64, n)
	p[0] = 1
	for k := 1; k < n; k++ {
		for i := range k {
			p[k] += p[i] * a[i*n+k]
		}
		if p[k] > 1e100 { // node 0 hardly ever visited: keep clear of overflow
			rescale(p[:k+1], p[k])
		}
	}
	rescale(p, total(p))
	return p
}

// rescale divides every entry of p by whole.
func rescale(p []float64, whole float64) {
	for k := range p {
		p[k] /= whole
	}
}
