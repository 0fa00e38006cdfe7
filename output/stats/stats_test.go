package stats

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

func near(t *testing.T, what string, got, want, tolerance float64, source string) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s = %.12g, want %.12g within %g (%s)", what, got, want, tolerance, source)
	}
}

// TestHyndmanFan checks the nine types. Source: derived from the definitions of
// Hyndman and Fan (1996), equations for m and γ, to the digits shown.
func TestHyndmanFan(t *testing.T) {
	ten := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}
	powers := []float64{1, 2, 4, 8, 16, 32, 64}
	for _, tt := range []struct {
		x    []float64
		p    float64
		want [9]float64
	}{
		{ten, 0.10, [9]float64{1, 1.5, 1, 1, 1.5, 1.1, 1.9, 1.366667, 1.4}},
		{ten, 0.25, [9]float64{3, 3, 2, 2.5, 3, 2.75, 3.25, 2.916667, 2.9375}},
		{ten, 0.50, [9]float64{5, 5.5, 5, 5, 5.5, 5.5, 5.5, 5.5, 5.5}},
		{ten, 0.90, [9]float64{9, 9.5, 9, 9, 9.5, 9.9, 9.1, 9.633333, 9.6}},
		{powers, 0.25, [9]float64{2, 2, 2, 1.75, 2.5, 2, 3, 2.333333, 2.375}},
		{powers, 0.90, [9]float64{64, 64, 32, 41.6, 57.6, 64, 44.8, 61.866667, 60.8}},
	} {
		for i, want := range tt.want {
			near(t, fmt.Sprintf("type %d, n=%d, p=%v", i+1, len(tt.x), tt.p), Quantile(tt.x, tt.p, Type(i+1)), want, 5e-7, "derived: definitions")
		}
	}
	// derived: the extremes of every type are the extreme values.
	for typ := Type1; typ <= Type9; typ++ {
		near(t, "minimum", Quantile(ten, 0, typ), 1, 0, "derived")
		near(t, "maximum", Quantile(ten, 1, typ), 10, 0, "derived")
	}
	if !math.IsNaN(Quantile(nil, 0.5, Type7)) {
		t.Error("the median of nothing is a number")
	}
}

// TestWeightedAgainstLongForm: whole frequency weights give what the replicated
// rows give, for every type (derived: definition); equal sampling weights give
// the unweighted types.
func TestWeightedAgainstLongForm(t *testing.T) {
	x, w := []float64{1, 3, 4, 9}, []float64{2, 1, 3, 1}
	long := []float64{1, 1, 3, 4, 4, 4, 9}
	for typ := Type1; typ <= Type9; typ++ {
		for _, p := range []float64{0, 0.1, 2. / 7, 0.33, 0.5, 0.77, 0.95, 1} {
			near(t, fmt.Sprintf("frequency, type %d, p=%v", typ, p), FrequencyQuantile(x, w, p, typ), Quantile(long, p, typ), 1e-14, "derived")
			if typ == Type3 {
				continue
			}
			near(t, fmt.Sprintf("sampling, type %d, p=%v", typ, p), WeightedQuantile(long, []float64{5, 5, 5, 5, 5, 5, 5}, p, typ), Quantile(long, p, typ), 1e-14, "derived")
		}
	}
}

// TestOrderInterval: source: derived by summing binomial probabilities exactly,
// as in Hahn and Meeker (1991), section 5.2.
func TestOrderInterval(t *testing.T) {
	for _, tt := range []struct {
		n        int64
		p        float64
		lo, hi   int64
		coverage float64
	}{
		{100, 0.5, 40, 61, 0.9647997998},
		{100, 0.9, 84, 96, 0.9556901072},
		{1000, 0.9, 881, 919, 0.9549071811},
		{1000, 0.99, 983, 997, 0.9760947635},
		{10000, 0.99, 9880, 9920, 0.9557546828},
	} {
		lo, hi, coverage := OrderInterval(tt.n, tt.p, 0.95)
		if lo != tt.lo || hi != tt.hi {
			t.Errorf("n=%d, p=%v: ranks %d, %d, want %d, %d", tt.n, tt.p, lo, hi, tt.lo, tt.hi)
		}
		near(t, fmt.Sprintf("coverage n=%d p=%v", tt.n, tt.p), coverage, tt.coverage, 5e-10, "derived")
	}
	// derived: 2⁻⁵ > 0.025, so five rows bound no median; six do: 2·2⁻⁶ < 0.05.
	if lo, hi, _ := OrderInterval(5, 0.5, 0.95); lo != 0 || hi != 6 {
		t.Errorf("median of five: ranks %d, %d, want none (0, 6)", lo, hi)
	}
	if lo, hi, _ := OrderInterval(6, 0.5, 0.95); lo != 1 || hi != 6 {
		t.Errorf("median of six: ranks %d, %d, want 1, 6", lo, hi)
	}
}

// TestBinomialQuantile compares the search with its definition for all k of
// small n and at the edges of large n.
func TestBinomialQuantile(t *testing.T) {
	for _, n := range []int64{1, 2, 7, 40, 1000, 10_000_000} {
		for _, p := range []float64{0, 0.001, 0.3, 0.5, 0.999, 1} {
			for _, q := range []float64{0.001, 0.025, 0.5, 0.975, 0.999} {
				k := BinomialQuantile(n, p, q)
				if BinomialCDF(n, p, k) < q || k > 0 && BinomialCDF(n, p, k-1) >= q {
					t.Errorf("n=%d, p=%v, q=%v: %d is not the smallest", n, p, q, k)
				}
			}
		}
	}
}

// TestOrderIntervalCovers draws small samples many times: the interval covers
// the true quantile as often as it says, and at least 95 % of the time.
func TestOrderIntervalCovers(t *testing.T) {
	const samples = 20000
	r := rand.New(rand.NewPCG(1, 2))
	for _, tt := range []struct {
		n int64
		p float64
	}{{30, 0.5}, {200, 0.9}} {
		lo, hi, coverage := OrderInterval(tt.n, tt.p, 0.95)
		truth := math.Exp(mathext.NormalQuantile(tt.p))
		x := make([]float64, tt.n)
		hits := 0
		for range samples {
			for i := range x {
				x[i] = math.Exp(r.NormFloat64())
			}
			slices.Sort(x)
			if x[lo-1] <= truth && truth <= x[hi-1] {
				hits++
			}
		}
		// tolerance: four binomial standard errors of the hit rate
		near(t, fmt.Sprintf("coverage n=%d p=%v", tt.n, tt.p), float64(hits)/samples, coverage, 4*math.Sqrt(coverage*(1-coverage)/samples), "derived")
		if coverage < 0.95 {
			t.Errorf("n=%d, p=%v: coverage %v, want 0.95 or more", tt.n, tt.p, coverage)
		}
	}
}

// TestQuantileSE: source: derived from sqrt(p(1−p)/n)/f.
func TestQuantileSE(t *testing.T) {
	normal := distuv.UnitNormal
	near(t, "normal median, n=1000", QuantileSE(0.5, 1000, normal.Prob(0)), 0.0396332730, 5e-11, "derived")
	near(t, "normal p=.9, n=1000", QuantileSE(0.9, 1000, normal.Prob(normal.Quantile(0.9))), 0.0540565422, 5e-11, "derived")
	lognormal := distuv.LogNormal{Sigma: 1}
	q := lognormal.Quantile(0.9)
	near(t, "lognormal p=.9", q, 3.6022244793, 5e-10, "derived")
	near(t, "its error, n=10000", QuantileSE(0.9, 10000, lognormal.Prob(q)), 0.0615770721, 5e-11, "derived")
}

func TestProportionInterval(t *testing.T) {
	// derived: no hit among n leaves P = 0.025 at 1 − 0.025^(1/n), rule of Clopper and Pearson.
	lo, hi := ProportionInterval(0, 20, 0.95)
	near(t, "lower", lo, 0, 0, "derived")
	near(t, "upper", hi, 1-math.Pow(0.025, 1./20), 1e-12, "derived: closed form")
	lo, hi = ProportionInterval(1, 20, 0.95)
	near(t, "lower", lo, math.Pow(0.025, 1./20), 1e-12, "derived: closed form")
	near(t, "upper", hi, 1, 0, "derived")
	// derived: the ends are where the binomial tails are 2.5 %.
	lo, hi = ProportionInterval(0.3, 50, 0.95)
	near(t, "tail below", 1-BinomialCDF(50, lo, 14), 0.025, 1e-9, "derived: definition")
	near(t, "tail above", BinomialCDF(50, hi, 15), 0.025, 1e-9, "derived: definition")
}

func TestGini(t *testing.T) {
	for _, tt := range []struct {
		x               []float64
		plain, unbiased float64
	}{ // derived by hand: half the mean absolute difference over the mean
		{[]float64{1, 2, 3, 4, 10}, 0.4, 0.5},
		{[]float64{-2, 0, 1, 5}, 1.375, 1.375 * 4 / 3},
		{[]float64{7, 7, 7}, 0, 0},
		{[]float64{0, 0, 0, 1}, 0.75, 1},
	} {
		g, err := Gini(tt.x)
		near(t, fmt.Sprint("gini ", tt.x), g, tt.plain, 1e-15, "derived: by hand")
		u, err2 := GiniUnbiased(tt.x)
		near(t, fmt.Sprint("unbiased ", tt.x), u, tt.unbiased, 1e-15, "derived: by hand")
		if err != nil || err2 != nil {
			t.Error(err, err2)
		}
	}
	weighted, err := WeightedGini([]float64{1, 2, 3, 4, 10}, []float64{1, 1, 1, 1, 2})
	long, _ := Gini([]float64{1, 2, 3, 4, 10, 10})
	near(t, "weighted", weighted, 0.3888888889, 5e-11, "derived: by hand")
	near(t, "weighted and long form", weighted, long, 1e-15, "derived")
	if err != nil {
		t.Error(err)
	}
	for _, x := range [][]float64{{-1, 1}, {-3, 1}, {0, 0}, nil} {
		var mean *MeanError
		if g, err := Gini(x); !errors.As(err, &mean) || !math.IsNaN(g) {
			t.Errorf("gini of %v = %v, %v, want a refusal", x, g, err)
		}
	}
}

// TestInequalityClosedForms puts closed-form quantiles at the midpoints of n
// equal shares. derived: lognormal G = 2Φ(σ/√2) − 1, L(p) = Φ(z_p − σ); Pareto
// G = 1/(2α−1), share of the top p = p^(1−1/α). The grid cuts the tail, so
// tolerances follow the share above the last point.
func TestInequalityClosedForms(t *testing.T) {
	const n = 1_000_000
	x := make([]float64, n)
	for i := range x {
		x[i] = math.Exp(mathext.NormalQuantile((float64(i) + 0.5) / n))
	}
	check := func(what string, of func() (float64, error), want, tolerance float64) {
		t.Helper()
		got, err := of()
		if err != nil {
			t.Error(err)
		}
		near(t, what, got, want, tolerance, "derived: closed form")
	}
	check("lognormal gini", func() (float64, error) { return Gini(x) }, 0.5204998778, 5e-6)
	check("lognormal L(.5)", func() (float64, error) { return Lorenz(x, nil, 0.5) }, 0.1586552539, 5e-6)
	check("lognormal top 10 %", func() (float64, error) { return TopShare(x, nil, 0.1) }, 0.3891436916, 5e-6)
	check("lognormal top 1 %", func() (float64, error) { return TopShare(x, nil, 0.01) }, 0.0923622481, 1e-5)
	near(t, "lognormal shortfall", ExpectedShortfall(x, 0.05), 0.1347438252, 1e-6, "derived: closed form")
	for i := range x {
		x[i] = math.Pow(1-(float64(i)+0.5)/n, -1./3)
	}
	check("pareto gini", func() (float64, error) { return Gini(x) }, 0.2, 5e-5)
	check("pareto top 10 %", func() (float64, error) { return TopShare(x, nil, 0.1) }, 0.2154434690, 5e-5)
	check("pareto top 1 %", func() (float64, error) { return TopShare(x, nil, 0.01) }, 0.0464158883, 5e-5)
}

func TestHill(t *testing.T) {
	const n = 1000
	x, w := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], w[i] = math.Pow(1-(float64(i)+0.5)/n, -0.5), 3
	}
	for k, want := range map[int]float64{10: 1.97131883, 50: 1.99394732, 100: 1.99695271, 500: 1.99938715} {
		alpha, se := Hill(x, k)
		near(t, fmt.Sprint("alpha, k=", k), alpha, want, 5e-9, "derived: exact Pareto quantiles, α = 2")
		near(t, "error", se, alpha/math.Sqrt(float64(k)), 1e-14, "published: Hill (1975)")
		weighted, wse := WeightedHill(x, w, k)
		near(t, "equal weights", weighted, alpha, 1e-12, "derived")
		near(t, "error, equal weights", wse, se, 1e-12, "derived")
	}
	if alpha, _ := Hill([]float64{-1, 0, 5}, 1); !math.IsNaN(alpha) {
		t.Errorf("threshold 0 gives α = %v, want NaN", alpha)
	}
}

func TestExpectedShortfall(t *testing.T) {
	ten := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}
	near(t, "1..10, a=.25", ExpectedShortfall(ten, 0.25), 1.8, 1e-15, "derived: (1+2+3/2)/2.5")
	near(t, "1..10, a=1", ExpectedShortfall(ten, 1), 5.5, 1e-15, "derived")
	const n = 1_000_000
	x := make([]float64, n)
	for i := range x {
		x[i] = mathext.NormalQuantile((float64(i) + 0.5) / n)
	}
	near(t, "normal, 5 %", ExpectedShortfall(x, 0.05), -2.0627128075, 2e-6, "derived: −φ(z)/a")
}

func TestMoments(t *testing.T) {
	x := []float64{1e9 + 4, 1e9 + 7, 1e9 + 13, 1e9 + 16}
	near(t, "mean", Mean(x), 1e9+10, 0, "derived: by hand")
	near(t, "sd", SD(x), math.Sqrt(30), 1e-12, "derived: by hand, 90/3")
	if !math.IsNaN(SD(x[:1])) {
		t.Error("one value has a standard deviation")
	}
	y, w := []float64{1, 5}, []float64{3, 1}
	near(t, "weighted mean", WeightedMean(y, w), 2, 0, "derived: by hand")
	near(t, "weighted variance", WeightedVariance(y, w), 3, 0, "derived: by hand, (3·1 + 9)/4")
	// derived: with equal weights the linearised error is s/√n.
	near(t, "error, equal weights", WeightedMeanSE(x, []float64{2, 2, 2, 2}), SD(x)/2, 1e-12, "derived")
}
