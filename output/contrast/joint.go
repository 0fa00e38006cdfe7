package contrast

import (
	"math"

	"cistern/output/stats"
)

// The variables whose percentiles are compared: as usual and under the event.
var compared = [...]struct {
	name         string
	usual, event int
}{{"assets", assetsUsual, assetsEvent}, {"consumption", consumptionUsual, consumptionEvent}, {"runway_months", runwayUsual, runwayEvent}}

// joint counts how the households of one target lie about a percentile of either
// world: sums of squared weights of those at or below the one, the other and both.
type joint struct{ rows, usual, event, both float64 }

func (j *joint) fold(o joint) {
	j.rows += o.rows
	j.usual += o.usual
	j.event += o.event
	j.both += o.both
}

// correlation returns that of the two indicators less p, to be at or below
// percentile p.
func (j *joint) correlation(p float64) float64 {
	about := func(a, b, both float64) float64 { return both - p*(a+b) + p*p*j.rows }
	if j.usual == j.both && j.event == j.both {
		return 1 // the same households: no rounding
	}
	k := about(j.usual, j.event, j.both) / math.Sqrt(about(j.usual, j.usual, j.usual)*about(j.event, j.event, j.event))
	return math.Max(-1, math.Min(1, k))
}

// gap returns the difference of two percentiles of the same households.
func gap(usual, event stats.Estimate, correlation float64) stats.Estimate {
	e := stats.Estimate{Value: event.Value - usual.Value, StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
	a, b := usual.StandardError, event.StandardError
	d := a - b
	e.StandardError = math.Sqrt(d*d + 2*(1-correlation)*a*b)
	if !math.IsNaN(e.StandardError) {
		e.Lower, e.Upper = e.Value-normal*e.StandardError, e.Value+normal*e.StandardError
	}
	return e
}
