package main

import (
	"cistern/output"
	"cistern/output/mobility"
	"cistern/sim"
)

// A reduction turns the blocks of a panel into figures, in as many passes over them
// as it takes.
type reduction struct {
	add     func(worker int, b *sim.Block, spans []output.Span) (commit func() error, err error)
	endPass func() (more bool, err error)
	done    bool
}

// newReductions prepares what the panel is reduced to: the summary and the moves
// between quantiles.
func (r *run) newReductions() error {
	if err := r.newSummary(); err != nil {
		return err
	}
	r.reductions = []*reduction{{add: r.addToSummary, endPass: r.summary.EndPass}}
	for _, m := range r.sc.Summary.Mobility {
		s, err := mobility.NewStudy(mobility.Options{FromAge: m.FromAge, ToAge: m.ToAge, Quantiles: m.Quantiles, Groups: r.groupNames(),
			Households: r.sc.Households, Workers: r.g.workers})
		if err != nil {
			return err
		}
		r.mobility = append(r.mobility, s)
		r.reductions = append(r.reductions, &reduction{endPass: s.EndPass,
			add: func(worker int, b *sim.Block, spans []output.Span) (func() error, error) {
				return s.Add(worker, &mobility.Rows{First: b.First, N: b.N, Spans: spans, Household: b.Household, Assets: b.Assets})
			}})
	}
	return nil
}

// reduce hands a block to all that are not done.
func (r *run) reduce(worker int, b *sim.Block, spans []output.Span) (commit func() error, err error) {
	var commits []func() error
	for _, d := range r.reductions {
		if d.done {
			continue
		}
		c, err := d.add(worker, b, spans)
		if err != nil {
			return nil, err
		}
		if c != nil {
			commits = append(commits, c)
		}
	}
	if commits == nil {
		return nil, nil
	}
	return func() error {
		for _, c := range commits {
			if err := c(); err != nil {
				return err
			}
		}
		return nil
	}, nil
}

// endPass ends a pass over the blocks and reports whether another is needed.
func (r *run) endPass() (more bool, err error) {
	for _, d := range r.reductions {
		if d.done {
			continue
		}
		again, err := d.endPass()
		if err != nil {
			return false, err
		}
		d.done = !again
		more = more || again
	}
	return more, nil
}

// addToSummary hands a block to the summary.
func (r *run) addToSummary(worker int, b *sim.Block, spans []output.Span) (func() error, error) {
	return r.summary.Add(worker, &output.SummaryRows{First: b.First, N: b.N, Spans: spans, Household: b.Household,
		Income: b.Income, Consumption: b.Consumption, Assets: b.Assets, Propensity: b.Propensity, AtLimit: b.AtLimit, TwinAssets: b.TwinAssets,
		LastConsumption: b.LastConsumption, JobLost: b.JobLost})
}
