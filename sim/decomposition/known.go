package decomposition

import (
	"sync/atomic"

	"cistern/policy"
	"cistern/sim"
)

// slab is the number of households whose lengths of life are kept at a time, two
// bytes each: memory does not grow with the population.
const slab = 1 << 25

// liveKnowing lets households live who know how long they have: for every length of
// life the problems are solved and those who live that long, and nobody else, live by
// the rules. A few lengths are solved at a time, so that all workers have something to
// do, and forgotten.
func (r *run) liveKnowing(k int, stage string) error {
	years, done := r.p.Years(), int64(0)
	for first := int64(0); first < r.o.Households; first += slab {
		to := min(first+slab, r.o.Households)
		lives, many, err := r.lengths(first, to)
		if err != nil {
			return err
		}
		var batch []int
		for length := 1; length <= years; length++ {
			if many[length] > 0 {
				batch = append(batch, length)
			}
			if len(batch) == 0 || len(batch)*len(r.households) < r.o.Workers && length < years {
				continue
			}
			var problems []policy.Household
			for _, l := range batch {
				for _, h := range r.households {
					problems = append(problems, knowing(h, l))
				}
			}
			rules, err := r.solve(problems, "")
			if err != nil {
				return err
			}
			for i, l := range batch {
				o := sim.Options{From: first, To: to, Only: func(id int64) bool { return int(lives[id-first]) == l }}
				if err := r.simulate(r.following(rules[i*len(r.households):][:len(r.households)]), o, sumAssets, k); err != nil {
					return err
				}
				if done += many[l]; r.o.OnProgress != nil {
					r.o.OnProgress(stage, done, r.o.Households)
				}
			}
			batch = batch[:0]
		}
	}
	return nil
}

// knowing is a household that lives exactly the given number of years.
func knowing(h policy.Household, lives int) policy.Household {
	h.Survival = make([]float64, lives)
	for t := range lives - 1 {
		h.Survival[t] = 1
	}
	if h.Returns != nil {
		h.Returns = h.Returns[:lives]
	}
	if h.Pension.Worth != nil {
		h.Pension.Worth = h.Pension.Worth[:lives]
	}
	return h
}

// lengths returns how many years each of the households first … to−1 lives, and how
// many live how long.
func (r *run) lengths(first, to int64) (lives []uint16, many []int64, err error) {
	lives, many = make([]uint16, to-first), make([]int64, r.p.Years()+1)
	counts := make([]atomic.Int64, len(many))
	o := sim.Options{Workers: r.o.Workers, Columns: sim.Identity, From: first, To: to}
	_, err = sim.Simulate(r.ctx, r.following(r.rules), o, func(_ int, b *sim.Block) (func() error, error) {
		mine := lives[b.First-first:][:b.Households]
		for _, id := range b.Household {
			mine[id-b.First]++
		}
		for _, n := range mine {
			counts[n].Add(1)
		}
		return nil, nil
	})
	for n := range counts {
		many[n] = counts[n].Load()
	}
	return lives, many, err
}
