package stats

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// without returns the means of x outside each group, and the sizes.
func without(x []float64, groups int) (rest, sizes []float64) {
	var total float64
	sums := make([]float64, groups)
	sizes = make([]float64, groups)
	for i, v := range x {
		total += v
		sums[i%groups] += v
		sizes[i%groups]++
	}
	for g := range sums {
		rest = append(rest, (total-sums[g])/(float64(len(x))-sizes[g]))
	}
	return rest, sizes
}

// TestJackknifeMean: derived: with one row a group the error of a mean is s/√n;
// with unequal groups it is sqrt( Σ (x̄_g − x̄)²·m_g/(n−m_g) / G ).
func TestJackknifeMean(t *testing.T) {
	x := []float64{3, 1, 4, 1, 5, 9, 2, 6, 5, 3, 5}
	n := len(x)
	rest, sizes := without(x, n)
	se, groups := Jackknife(Mean(x), rest, sizes)
	near(t, "error, one row a group", se, SD(x)/math.Sqrt(float64(n)), 1e-14, "derived: s/√n")
	if groups != n {
		t.Errorf("%d groups, want %d", groups, n)
	}
	rest, sizes = without(x, 4) // sizes 3, 3, 3, 2
	se, _ = Jackknife(Mean(x), rest, sizes)
	var sum float64
	for g := range 4 {
		var part []float64
		for i := g; i < n; i += 4 {
			part = append(part, x[i])
		}
		d, m := Mean(part)-Mean(x), float64(len(part))
		sum += d * d * m / (float64(n) - m)
	}
	near(t, "error, unequal groups", se, math.Sqrt(sum/4), 1e-14, "derived: Busing et al. (1999) for a mean")
	// derived: empty groups change nothing.
	again, groups := Jackknife(Mean(x), append(rest, math.NaN()), append(sizes, 0))
	near(t, "error with an empty group", again, se, 0, "derived")
	if groups != 4 {
		t.Errorf("%d groups, want 4", groups)
	}
	if se, _ := Jackknife(1, []float64{math.NaN(), 1}, []float64{5, 0}); !math.IsNaN(se) {
		t.Errorf("one group has error %v, want NaN", se)
	}
}

// TestJackknifeEqualGroups: derived: (G−1)/G·Σ(θ_g − θ̄)² when groups are equal,
// for a statistic that is not linear.
func TestJackknifeEqualGroups(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	rest, sizes := make([]float64, 8), make([]float64, 8)
	for g := range rest {
		rest[g], sizes[g] = r.NormFloat64(), 5
	}
	var sum float64
	for _, v := range rest {
		sum += (v - Mean(rest)) * (v - Mean(rest))
	}
	se, _ := Jackknife(0.3, rest, sizes)
	near(t, "error", se, math.Sqrt(sum*7/8), 1e-13, "derived")
}

// TestJackknifeIntervalCovers draws small samples many times: the interval
// covers the true mean 95 % of the time, within 1.5 percentage points.
func TestJackknifeIntervalCovers(t *testing.T) {
	const samples = 8000
	r := rand.New(rand.NewPCG(5, 6))
	for _, groups := range []int{8, 32} {
		hits := 0
		x := make([]float64, 64)
		for range samples {
			for i := range x {
				x[i] = r.NormFloat64()
			}
			rest, sizes := without(x, groups)
			se, n := Jackknife(Mean(x), rest, sizes)
			if e := JackknifeInterval(Mean(x), se, n, 0.95); e.Lower <= 0 && 0 <= e.Upper {
				hits++
			}
		}
		near(t, fmt.Sprintf("coverage, %d groups", groups), float64(hits)/samples, 0.95, 0.015, "derived")
	}
}

// TestJackknifePaired: differences of correlated samples on the same households
// have a smaller error than the two samples taken apart. derived: variances
// 2(1−ρ) and 2 with correlation ρ.
func TestJackknifePaired(t *testing.T) {
	const n, groups, rho = 6400, 64, 0.96
	r := rand.New(rand.NewPCG(7, 8))
	a, b, d := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range a {
		a[i] = r.NormFloat64()
		b[i] = rho*a[i] + math.Sqrt(1-rho*rho)*r.NormFloat64()
		d[i] = a[i] - b[i]
	}
	errorOf := func(x []float64) float64 {
		rest, sizes := without(x, groups)
		se, _ := Jackknife(Mean(x), rest, sizes)
		return se
	}
	// 64 groups know an error to 9 %, so the ratio to some 13 %; 40 % is allowed.
	near(t, "paired over unpaired", errorOf(d)/math.Hypot(errorOf(a), errorOf(b)), math.Sqrt(1-rho), 0.4*math.Sqrt(1-rho), "derived")
}

// TestStudentQuantile: published: Fisher and Yates (1963), Table III, and the
// closed forms for one and two degrees of freedom.
func TestStudentQuantile(t *testing.T) {
	for range 2 { // computed, then remembered
		near(t, "1 degree", StudentQuantile(0.975, 1), math.Tan(math.Pi*0.475), 1e-9, "derived: Cauchy")
		near(t, "2 degrees", StudentQuantile(0.975, 2), 0.95*math.Sqrt(2/(1-0.95*0.95)), 1e-9, "derived: closed form")
		near(t, "10 degrees", StudentQuantile(0.975, 10), 2.228, 5e-4, "published: Fisher and Yates (1963), Table III")
		near(t, "60 degrees", StudentQuantile(0.975, 60), 2.000, 5e-4, "published: Fisher and Yates (1963), Table III")
	}
}
