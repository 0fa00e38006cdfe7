package policy

import "math"

// felicity is how values reckon with utility: relative to a reference consumption, so
// that strong curvature and large amounts of money stay within the range of numbers.
// A factor and a constant common to all terms of a mean do not change the consumption
// that is worth as much as the mean.
type felicity struct {
	u     Utility
	kind  marginalKind
	gamma float64
	shift float64 // subsistence
	alpha float64
	power *powerTable // x^−γ; nil where the table is not accurate enough
}

func newFelicity(u Utility) felicity {
	switch f := u.(type) {
	case CRRA:
		return powerFelicity(u, f.gamma, 0)
	case StoneGeary:
		return powerFelicity(u, f.gamma, f.subsistence)
	case CARA:
		return felicity{u: u, kind: exponentialKind, alpha: f.alpha}
	}
	return felicity{u: u, kind: anyKind}
}

func powerFelicity(u Utility, gamma, shift float64) felicity {
	f := felicity{u: u, kind: powerKind, gamma: gamma, shift: shift}
	if gamma <= 10 {
		f.power = newPowerTable(-gamma)
	}
	return f
}

// neutral is the reference with which utility is as it is defined.
func (f *felicity) neutral() float64 {
	if f.kind == exponentialKind {
		return 0
	}
	return 1 + f.shift
}

// reference returns c, or the neutral reference where there is no utility of c.
func (f *felicity) reference(c float64) float64 {
	if math.IsNaN(c) || math.IsInf(c, 0) || f.kind == powerKind && c <= f.shift {
		return f.neutral()
	}
	return c
}

// at returns utility of c and its derivative: of u(c)/(ref − c̲)^(1−γ) under power
// utility, γ ≠ 1, of u(c)·exp(α·ref) under exponential utility, of u(c) otherwise.
func (f *felicity) at(c, ref float64) (value, marginal float64) {
	switch {
	case f.kind == exponentialKind:
		marginal = math.Exp(-f.alpha * (c - ref))
		return -marginal / f.alpha, marginal
	case f.kind != powerKind || f.gamma == 1 || !(c > f.shift):
		return f.u.Value(c), f.u.Marginal(c)
	}
	x := (c - f.shift) / (ref - f.shift)
	if f.power != nil {
		marginal = f.power.at(x)
	} else {
		marginal = math.Pow(x, -f.gamma)
	}
	return marginal * x / (1 - f.gamma), marginal / (ref - f.shift)
}

// inverse returns the consumption of that utility. guess is where to look for families
// that are not built in.
func (f *felicity) inverse(value, ref, guess float64) float64 {
	switch {
	case f.kind == exponentialKind:
		return ref - math.Log(-f.alpha*value)/f.alpha
	case f.kind == powerKind && f.gamma == 1:
		return f.shift + math.Exp(value)
	case f.kind == powerKind:
		return f.shift + (ref-f.shift)*math.Pow((1-f.gamma)*value, 1/(1-f.gamma))
	}
	if q, ok := f.u.(Quadratic); ok {
		return q.bliss - math.Sqrt(-2*value)
	}
	return search(f.u, value, guess)
}

// search brackets and halves: a family of somebody else's may bend as it likes.
func search(u Utility, value, guess float64) float64 {
	low, high, floor := guess, guess, u.Infimum()
	for step := math.Max(1e-3, math.Abs(guess)/2); u.Value(high) < value && !math.IsInf(high, 1); step *= 2 {
		high += step
	}
	for step := math.Max(1e-3, math.Abs(guess)/2); u.Value(low) > value && !math.IsInf(low, -1); step *= 2 {
		if low -= step; low <= floor {
			low = floor
			break
		}
	}
	for range 200 {
		mid := low + (high-low)/2
		if mid == low || mid == high {
			break
		}
		if u.Value(mid) < value {
			low = mid
		} else {
			high = mid
		}
	}
	return high
}
