package policy

import (
	"errors"
	"fmt"
	"math"
)

// Interpolation says how consumption is read between the nodes of a rule.
type Interpolation int

const (
	// Cubic: Hermite polynomials with the slopes that differentiating the Euler
	// equation gives at every node, and nodes at the kinks of later limits. Its
	// error falls with the fourth power of the distance between nodes.
	Cubic Interpolation = iota
	// Linear: straight lines between the nodes of a fixed grid, as in Carroll
	// (2006). Its error falls with the second power.
	Linear
)

// String returns the name used in scenario files.
func (i Interpolation) String() string {
	if i == Linear {
		return "linear"
	}
	return "cubic"
}

// Options sets the accuracy of a solution. Begin from DefaultOptions.
type Options struct {
	AssetPoints   int           // nodes of the grid of end-of-year assets, ≥ 10
	HighestAssets float64       // top of the grid above the limit, money; NaN: 50 times the highest mean income
	LowestAssets  float64       // bottom of the grid without a limit, money; NaN: −20 times that income
	AssetScale    float64       // money; nodes lie evenly near the limit and by equal ratios well above this amount; NaN: 0.1 times that income
	Interpolation Interpolation // between the nodes
	KinkThreshold float64       // a kink of next year's rule gets a node of its own while its slope jump times its probability exceeds this, ≥ 0

	EntitlementPoints int                   // nodes of an accrued entitlement in a working year, ≥ 2
	EntitlementNodes  [MaxPillars][]float64 // the nodes in every year, ascending, at least 2; nil: placed year by year over what can be reached

	// OnAge, if set, is called on the caller's goroutine after each age is solved.
	OnAge func(age int)
}

// DefaultOptions returns 200 asset points, cubic interpolation, automatic bounds.
func DefaultOptions() Options {
	auto := math.NaN()
	return Options{AssetPoints: 200, HighestAssets: auto, LowestAssets: auto, AssetScale: auto,
		Interpolation: Cubic, KinkThreshold: 1e-3, EntitlementPoints: 12}
}

// Validate reports every fault at once, each as a *FieldError.
func (o Options) Validate() error {
	var errs []error
	bad := func(field string, value any, want string) {
		errs = append(errs, &FieldError{field, value, want})
	}
	if o.AssetPoints < 10 || o.AssetPoints > 1_000_000 {
		bad("AssetPoints", o.AssetPoints, "from 10 to 1000000")
	}
	if o.HighestAssets <= 0 || math.IsInf(o.HighestAssets, 0) {
		bad("HighestAssets", o.HighestAssets, "positive and finite, or auto")
	}
	if o.LowestAssets >= 0 || math.IsInf(o.LowestAssets, 0) {
		bad("LowestAssets", o.LowestAssets, "negative and finite, or auto")
	}
	if o.AssetScale <= 0 || math.IsInf(o.AssetScale, 0) {
		bad("AssetScale", o.AssetScale, "positive and finite, or auto")
	}
	if o.Interpolation != Cubic && o.Interpolation != Linear {
		bad("Interpolation", fmt.Sprint(int(o.Interpolation)), "cubic or linear")
	}
	if !(o.KinkThreshold >= 0) || math.IsInf(o.KinkThreshold, 1) {
		bad("KinkThreshold", o.KinkThreshold, "at least 0 and finite")
	}
	if o.EntitlementPoints < 2 || o.EntitlementPoints > 1000 {
		bad("EntitlementPoints", o.EntitlementPoints, "from 2 to 1000")
	}
	for p, x := range o.EntitlementNodes {
		if x == nil {
			continue
		}
		sound := len(x) >= 2
		for i, e := range x {
			sound = sound && finite(e) && (i == 0 || e > x[i-1])
		}
		if !sound {
			bad(fmt.Sprintf("EntitlementNodes[%d]", p), x, "at least 2 finite numbers, ascending")
		}
	}
	return errors.Join(errs...)
}

// resolve fills the automatic values for a household whose highest mean income
// is peak.
func (o Options) resolve(peak float64) Options {
	if math.IsNaN(o.HighestAssets) {
		o.HighestAssets = 50 * peak
	}
	if math.IsNaN(o.LowestAssets) {
		o.LowestAssets = -20 * peak
	}
	if math.IsNaN(o.AssetScale) {
		o.AssetScale = 0.1 * peak
	}
	return o
}
