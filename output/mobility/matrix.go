package mobility

import (
	"math"

	"cistern/output/stats"
)

// confidence of every interval.
const confidence = 0.95

// Matrix is the mobility of one group, or of everybody.
type Matrix struct {
	Households  int64              // alive at both ages
	From        []int64            // [from] households in a class at the first age
	Probability [][]stats.Estimate // [from][to]; NaN from a class without households
	Shorrocks   stats.Estimate     // NaN where a class has no households
}

// Matrices returns the matrices of all groups in the order of the options, and last
// that of everybody. It panics before the last EndPass.
func (s *Study) Matrices() []Matrix {
	if s.phase != done {
		panic("mobility: study is not finished")
	}
	return s.matrix
}

// finish makes the matrices from the counts.
func (s *Study) finish() {
	s.phase = done
	for i := range s.targets() {
		s.matrix = append(s.matrix, newReplications(s.o.Quantiles, s.total(i)).matrix())
	}
	s.held, s.counts, s.places, s.edges = nil, nil, nil, nil
}

// replications are the counts of all households, and those without each jackknife
// group in turn, between limits that are those of the households left.
type replications struct {
	k       int
	full    []float64        // [from·k + to]
	without [Parts][]float64 // nil where a group has no households
	sizes   [Parts]float64   // households by group
}

func newReplications(k int, c *counts) *replications {
	r := &replications{k: k, full: make([]float64, k*k)}
	for g := range c.cells {
		for i, n := range c.cells[g] {
			r.full[i] += float64(n)
			r.sizes[g] += float64(n)
		}
	}
	for g := range r.without {
		if r.sizes[g] == 0 {
			continue
		}
		left := make([]float64, k*k)
		for i, n := range r.full {
			left[i] = n - float64(c.cells[g][i])
		}
		r.without[g] = r.relimit(c, left)
	}
	return r
}

// relimit moves the limits to where the quantiles of the households left are. How
// many households change class follows from how many lie below the old limit; in
// which class those are at the other age, from the households near the limit in
// the panel. A limit at which several are tied moves only if all of them would.
func (r *replications) relimit(c *counts, left []float64) []float64 {
	k := r.k
	moved := append([]float64(nil), left...)
	total := 0.0
	for _, n := range left {
		total += n
	}
	for age := range c.near {
		step, other := k, 1 // between classes at this age, and at the other
		if age == 1 {
			step, other = 1, k
		}
		below := 0.0
		for limit := range k - 1 {
			near := 0.0
			for j := range k {
				below += left[limit*step+j*other]
				near += float64(c.near[age][limit*k+j])
			}
			move := total*float64(limit+1)/float64(k) - below
			if move < 0 {
				move = min(0, move+float64(max(1, c.tied[age][limit])-1))
			}
			if near == 0 || move == 0 {
				continue
			}
			for j := range k {
				n := move * float64(c.near[age][limit*k+j]) / near
				moved[limit*step+j*other] += n
				moved[(limit+1)*step+j*other] -= n
			}
		}
	}
	return moved
}

// matrix is what the counts say.
func (r *replications) matrix() Matrix {
	var m Matrix
	for i := range r.k {
		from := int64(sum(r.row(r.full, i)))
		m.From = append(m.From, from)
		m.Households += from
		var row []stats.Estimate
		for j := range r.k {
			e := r.estimate(func(n []float64) float64 { return n[i*r.k+j] / sum(r.row(n, i)) })
			n := float64(from)
			if p := e.Value; e.StandardError > 0 {
				n = p * (1 - p) / (e.StandardError * e.StandardError)
			}
			e.Lower, e.Upper = stats.ProportionInterval(e.Value, max(1, n), confidence)
			row = append(row, e)
		}
		m.Probability = append(m.Probability, row)
	}
	m.Shorrocks = r.estimate(r.shorrocks)
	return m
}

func (r *replications) row(n []float64, i int) []float64 { return n[i*r.k : (i+1)*r.k] }

func sum(x []float64) (total float64) {
	for _, v := range x {
		total += v
	}
	return total
}

// shorrocks is the index (k − trace)/(k − 1) of counts.
func (r *replications) shorrocks(n []float64) float64 {
	trace := 0.0
	for i := range r.k {
		trace += n[i*r.k+i] / sum(r.row(n, i))
	}
	return (float64(r.k) - trace) / float64(r.k-1)
}

// estimate is a figure of all counts with its error.
func (r *replications) estimate(of func([]float64) float64) stats.Estimate {
	full := of(r.full)
	var without [Parts]float64
	for g, n := range r.without {
		if n != nil {
			without[g] = of(n)
		}
	}
	se, groups := stats.Jackknife(full, without[:], r.sizes[:])
	if math.IsNaN(full) {
		se = full
	}
	return stats.JackknifeInterval(full, se, groups, confidence)
}
