package mobility

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"cistern/output"
)

// person is a household of a test panel: alive at the first age, perhaps at the
// second.
type person struct {
	group    int
	from, to float64
	dies     bool // between the ages
}

// blocks lays people out as a panel does, in blocks of 1000 households: by group,
// then age, in no order within.
func blocks(people []person, groups int) []*Rows {
	var list []*Rows
	for first := 0; first < len(people); first += 1000 {
		block := people[first:min(first+1000, len(people))]
		r := &Rows{First: int64(first)}
		for g := range groups {
			for _, age := range []int{40, 41, 60} {
				from := r.N
				for i := range block {
					i := (i*7 + age) % len(block) // 7 and 1000 have no common divisor
					p := block[i]
					if p.group != g || age == 60 && p.dies {
						continue
					}
					r.Household = append(r.Household, int64(first+i))
					r.Assets = append(r.Assets, map[int]float64{40: p.from, 41: math.Pi, 60: p.to}[age])
					r.N++
				}
				r.Spans = append(r.Spans, output.Span{Age: int32(age), Group: g, From: from, To: r.N})
			}
		}
		list = append(list, r)
	}
	return list
}

func options(people []person, groups, quantiles int) Options {
	o := Options{FromAge: 40, ToAge: 60, Quantiles: quantiles, Households: int64(len(people)), Workers: 1}
	for g := range groups {
		o.Groups = append(o.Groups, []string{"dockers", "clerks", "pilots"}[g])
	}
	return o
}

func study(t testing.TB, o Options, list []*Rows) *Study {
	t.Helper()
	s, err := NewStudy(o)
	if err != nil {
		t.Fatal(err)
	}
	for more := true; more; {
		commits := make([]func() error, len(list))
		for i := range list {
			i = len(list) - 1 - i // blocks are finished in any order
			if commits[i], err = s.Add(i%o.Workers, list[i]); err != nil {
				t.Fatal(err)
			}
		}
		for _, commit := range commits {
			if commit != nil {
				if err := commit(); err != nil {
					t.Fatal(err)
				}
			}
		}
		if more, err = s.EndPass(); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.10g, want %.10g (± %.2g)", what, got, want, tolerance)
	}
}

// Two classes by hand: of ten poor households three become rich, so three of the
// rich become poor; P = (0.7, 0.3; 0.3, 0.7), M = (2 − 1.4)/1 = 0.6. Whoever dies in
// between does not count.
func TestTwoClassesByHand(t *testing.T) {
	var people []person
	for i := range 10 {
		poor, rich := person{from: float64(i), to: float64(i)}, person{from: 100 + float64(i), to: 100 + float64(i)}
		if i < 3 {
			poor.to, rich.to = rich.to, poor.to
		}
		people = append(people, rich, person{from: 1e6, dies: true}, poor, person{from: -1e6, dies: true})
	}
	m := study(t, options(people, 1, 2), blocks(people, 1)).Matrices()[0]
	for i := range 2 {
		for j := range 2 {
			want := 0.3
			if i == j {
				want = 0.7
			}
			near(t, "probability", m.Probability[i][j].Value, want, 1e-15)
		}
	}
	near(t, "Shorrocks", m.Shorrocks.Value, 0.6, 1e-15)
	if m.Households != 20 || m.From[0] != 10 || m.From[1] != 10 {
		t.Errorf("%d households, %v at the first age", m.Households, m.From)
	}
}

// Nobody moves: M = 0. Everybody's class turns round: P is the mirror of the
// diagonal and M = k/(k−1) for even k.
func TestNoAndFullMobility(t *testing.T) {
	var still, turned []person
	for i := range 4000 {
		x := math.Exp(float64((i*37)%4000) / 500)
		still = append(still, person{from: x, to: 3*x - 2})
		turned = append(turned, person{from: x, to: -x})
	}
	m := study(t, options(still, 1, 5), blocks(still, 1)).Matrices()[1]
	near(t, "immobile", m.Shorrocks.Value, 0, 0)
	near(t, "its error", m.Shorrocks.StandardError, 0, 0)
	near(t, "bound of a probability of 1 (Clopper–Pearson: 0.025^(1/800))", m.Probability[4][4].Lower, math.Pow(0.025, 1.0/800), 1e-12)
	m = study(t, options(turned, 1, 4), blocks(turned, 1)).Matrices()[1]
	near(t, "turned round", m.Shorrocks.Value, 4.0/3, 0)
	near(t, "poorest to richest", m.Probability[0][3].Value, 1, 0)
}

// Equal assets are in one class, the lower; a class may then be empty, and what it
// would say is missing (derived: half of all have nothing, so the second limit of
// five is 0 too).
func TestTies(t *testing.T) {
	var people []person
	for i := range 1000 {
		people = append(people, person{from: math.Max(0, float64(i-500)), to: float64(i)})
	}
	m := study(t, options(people, 1, 5), blocks(people, 1)).Matrices()[0]
	if !reflect.DeepEqual(m.From, []int64{501, 0, 99, 200, 200}) { // households 0 to 500 have 0
		t.Errorf("classes at the first age hold %v", m.From)
	}
	near(t, "share of those with nothing", m.Probability[0][0].Value, 200.0/501, 1e-15)
	if !math.IsNaN(m.Probability[1][1].Value) || !math.IsNaN(m.Shorrocks.Value) {
		t.Errorf("an empty class has probability %v, and the index is %v", m.Probability[1][1].Value, m.Shorrocks.Value)
	}
}

// chain draws households that are poor or rich and change state with probability
// 0.1 a step, three steps, assets spread within a state.
func chain(n int, seed uint64) []person {
	g := rand.New(rand.NewPCG(seed, 1))
	people := make([]person, n)
	for i := range people {
		state := g.IntN(2)
		people[i].from = float64(state) + 0.9*g.Float64()
		for range 3 {
			if g.Float64() < 0.1 {
				state = 1 - state
			}
		}
		people[i].to = float64(state) + 0.9*g.Float64()
	}
	return people
}

// Derived: of a two-state chain with P = (0.9, 0.1; 0.1, 0.9) the third power has
// (1 + 0.8³)/2 = 0.756 on the diagonal, and M = 2 − 2·0.756 = 0.488.
func TestTwoStateChain(t *testing.T) {
	people := chain(200_000, 5)
	m := study(t, options(people, 1, 2), blocks(people, 1)).Matrices()[1]
	near(t, "stays poor", m.Probability[0][0].Value, 0.756, 0.005) // 4 standard deviations of draws, √(0.756·0.244/10⁵)
	near(t, "becomes poor", m.Probability[1][0].Value, 0.244, 0.005)
	near(t, "Shorrocks", m.Shorrocks.Value, 0.488, 0.01)
}

// Where both assets are normal with correlation ρ the chance to stay below the
// median is 1/2 + arcsin(ρ)/π (Sheppard 1899), so M = 1 − 2·arcsin(ρ)/π; without
// dependence M = 1 for any k. The variance of M for two classes without dependence
// is 1/n (derived: the hypergeometric law of how many stay, n/16, times (4/n)²).
// Errors must match the spread over samples, and intervals cover.
func TestErrorsMatchTheSpread(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	const n, runs = 2000, 400
	for _, tt := range []struct {
		rho       float64
		quantiles int
		mean      float64 // of M; NaN: not known
		nothing   float64 // share that has nothing at the first age
	}{{0, 2, 1, 0}, {0, 5, 1, 0}, {0.8, 2, 1 - 2*math.Asin(0.8)/math.Pi, 0}, {-0.5, 2, 1 + 2*math.Asin(0.5)/math.Pi, 0},
		{0.9, 5, math.NaN(), 0}, {0.9, 5, math.NaN(), 0.3}, {0.9, 4, math.NaN(), 0.4}} {
		covered, total, squares, errors := 0.0, 0.0, 0.0, 0.0
		var stay, stays, stayErrors, inside float64 // of the poorest class
		low, shift := 0.5+math.Asin(tt.rho)/math.Pi, math.Inf(-1)
		if tt.nothing > 0 {
			shift = math.Sqrt2 * math.Erfinv(2*tt.nothing-1)
		}
		for seed := range uint64(runs) {
			g := rand.New(rand.NewPCG(seed, 2))
			people := make([]person, n)
			for i := range people {
				x := g.NormFloat64()
				people[i] = person{from: max(x, shift), to: math.Exp(tt.rho*x + math.Sqrt(1-tt.rho*tt.rho)*g.NormFloat64())}
			}
			m := study(t, options(people, 1, tt.quantiles), blocks(people, 1)).Matrices()[1]
			x, p := m.Shorrocks, m.Probability[0][0]
			total, squares, errors = total+x.Value, squares+x.Value*x.Value, errors+x.StandardError*x.StandardError
			stay, stays, stayErrors = stay+p.Value, stays+p.Value*p.Value, stayErrors+p.StandardError*p.StandardError
			if x.Lower <= tt.mean && tt.mean <= x.Upper {
				covered++
			}
			if p.Lower <= low && low <= p.Upper {
				inside++
			}
		}
		mean := total / runs
		variance := squares/runs - mean*mean
		name := func(what string) string {
			return fmt.Sprintf("ρ = %g, %d classes, %g with nothing: %s", tt.rho, tt.quantiles, tt.nothing, what)
		}
		near(t, name("errors of M against the spread"), errors/runs/variance, 1, 4*math.Sqrt(2.0/runs))
		stay /= runs
		near(t, name("errors of a probability against the spread"), stayErrors/runs/(stays/runs-stay*stay), 1, 4*math.Sqrt(2.0/runs))
		if tt.rho == 0 && tt.quantiles == 2 {
			near(t, name("mean square of the errors of M"), errors/runs*n, 1, 0.03)
		}
		if !math.IsNaN(tt.mean) {
			near(t, name("mean M"), mean, tt.mean, 4*math.Sqrt(variance/runs)+2.0/n)
			near(t, name("coverage of M"), covered/runs, 0.95, 4*math.Sqrt(0.05*0.95/runs))
		}
		if tt.quantiles == 2 {
			near(t, name("coverage of a probability"), inside/runs, 0.95, 4*math.Sqrt(0.05*0.95/runs))
		}
	}
}

// crowd draws households of three groups whose assets go together.
func crowd(n int) []person {
	g := rand.New(rand.NewPCG(11, 3))
	people := make([]person, n)
	for i := range people {
		x := g.NormFloat64()
		people[i] = person{group: i % 3, from: math.Exp(x), to: math.Exp(0.8*x+0.6*g.NormFloat64()) * float64(1+i%3), dies: g.Float64() < 0.1}
		if g.Float64() < 0.2 {
			people[i].from = 0
		}
	}
	return people
}

// Whether everybody is held or counted in another pass makes no difference, nor do
// workers.
func TestPassesAndWorkers(t *testing.T) {
	people := crowd(20000)
	list := blocks(people, 3)
	o := options(people, 3, 5)
	whole := study(t, o, list)
	if whole.Passes() != 1 {
		t.Errorf("%d passes though everybody is held", whole.Passes())
	}
	o.Workers = 3
	if !reflect.DeepEqual(study(t, o, list).Matrices(), whole.Matrices()) {
		t.Error("three workers give other bits than one")
	}
	o.Held = 8000
	part := study(t, o, list)
	if part.Passes() != 2 {
		t.Errorf("%d passes where not everybody is held, want 2", part.Passes())
	}
	o.Workers = 1
	if !reflect.DeepEqual(study(t, o, list).Matrices(), part.Matrices()) {
		t.Error("with a part held, three workers give other bits than one")
	}
	if !reflect.DeepEqual(part.Matrices(), whole.Matrices()) {
		t.Error("in two passes other bits come out than in one")
	}
	if m := whole.Matrices(); m[0].Households < 5000 || m[3].Households != m[0].Households+m[1].Households+m[2].Households {
		t.Errorf("%d households of %d are alive at both ages", m[0].Households, m[3].Households)
	}
}

// Everything agrees with a computation by ranks: naive, by sorting.
func TestAgainstRanks(t *testing.T) {
	people := crowd(3000)
	got := study(t, options(people, 3, 4), blocks(people, 3)).Matrices()
	for target := range 4 {
		var own []person
		for _, p := range people {
			if !p.dies && (target == 3 || p.group == target) {
				own = append(own, p)
			}
		}
		rank := func(of func(person) float64, x float64) int { // quarters by how many lie below: all differ or are 0
			below := 0
			for _, p := range own {
				if of(p) < x {
					below++
				}
			}
			n := len(own) - 1 // type 7: limits at 1 + (n−1)·p, from the lower end
			for q := 1; q < 4; q++ {
				if below <= n*q/4 {
					return q - 1
				}
			}
			return 3
		}
		var counts [4][4]int64
		for _, p := range own {
			counts[rank(func(p person) float64 { return p.from }, p.from)][rank(func(p person) float64 { return p.to }, p.to)]++
		}
		for a := range counts {
			sum := int64(0)
			for _, n := range counts[a] {
				sum += n
			}
			for b, n := range counts[a] {
				near(t, "probability", got[target].Probability[a][b].Value, float64(n)/float64(sum), 1e-15)
			}
		}
	}
}

func TestTable(t *testing.T) {
	people := crowd(3000)
	for i := range people {
		if people[i].group == 1 {
			people[i].dies = true
		}
	}
	list := blocks(people, 3)
	table := Table([]*Study{study(t, options(people, 3, 5), list), study(t, options(people, 3, 2), list)})
	if err := table.Validate(); err != nil {
		t.Fatal(err)
	}
	if want := 3*26 + 3*5; table.Len() != want { // nobody of the clerks is alive at both ages
		t.Errorf("%d rows, want %d", table.Len(), want)
	}
	from, to, q := table.Column("from_quantile"), table.Column("to_quantile"), table.Column("quantiles")
	if from.Ints[7] != 2 || to.Ints[7] != 3 || q.Ints[7] != 5 || table.Column("group").Strings[7] != "dockers" || table.Column("statistic").Strings[7] != "probability" {
		t.Error("row 7 is not from class 2 to class 3 of the dockers")
	}
	last := table.Len() - 1
	if !from.IsMissing(last) || !to.IsMissing(last) || q.Ints[last] != 2 || table.Column("group").Strings[last] != output.Everyone || table.Column("statistic").Strings[last] != "shorrocks" {
		t.Error("the last row is not the index of all in two classes")
	}
}

func TestFaults(t *testing.T) {
	good := options(crowd(10), 3, 5)
	for _, tt := range []struct {
		change func(*Options)
		want   string
	}{
		{func(o *Options) { o.ToAge = 40 }, "from age 40 to 40"},
		{func(o *Options) { o.FromAge = -1 }, "from age -1"},
		{func(o *Options) { o.Quantiles = 1 }, "1 quantiles, want 2 to 100"},
		{func(o *Options) { o.Quantiles = 101 }, "101 quantiles"},
		{func(o *Options) { o.Groups = nil }, "0 groups"},
		{func(o *Options) { o.Households = 0 }, "0 households"},
		{func(o *Options) { o.Workers = 0 }, "0 workers"},
	} {
		o := good
		tt.change(&o)
		if _, err := NewStudy(o); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("error %v, want one about %q", err, tt.want)
		}
	}
	people := crowd(10)
	people[4].to, people[4].dies = math.Inf(1), false
	s, err := NewStudy(options(people, 3, 2))
	if err != nil {
		t.Fatal(err)
	}
	commit, err := s.Add(0, blocks(people, 3)[0])
	if err == nil {
		err = commit()
	}
	if err == nil || !strings.Contains(err.Error(), "not finite") {
		t.Errorf("infinite assets give %v", err)
	}
}

// Without a jackknife group the limits let pass what makes classes of equal size of
// the households left, at both ages; but a limit at which many are tied stays
// (derived).
func TestReplicationsHaveTheirOwnLimits(t *testing.T) {
	people := crowd(6000)
	for i := range people {
		people[i].group = 0
		if i%8 == 0 {
			people[i].from = 0 // three in ten have nothing
		}
	}
	list := blocks(people, 1)
	fresh, err := NewStudy(options(people, 1, 4))
	if err != nil {
		t.Fatal(err)
	}
	for _, rows := range list {
		commit, err := fresh.Add(0, rows)
		if err == nil {
			err = commit()
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if _, err := fresh.limits.EndPass(); err != nil {
		t.Fatal(err)
	}
	fresh.beginCounting()
	fresh.count(0, fresh.held)
	r := newReplications(4, fresh.total(1))
	for g := range Parts {
		poor, total := 0.0, 0.0 // of those left, with nothing at the first age
		for _, p := range fresh.held {
			if int(p.part) != g {
				total++
				if p.assets[0] == 0 {
					poor++
				}
			}
		}
		n, below, across := r.without[g], 0.0, 0.0
		for class := range 3 {
			below += sum(r.row(n, class))
			for from := range 4 {
				across += n[from*4+class]
			}
			near(t, "households below a limit at the second age", across, total*float64(class+1)/4, 1e-6)
			if class > 0 {
				near(t, "households below a limit at the first age", below, total*float64(class+1)/4, 1e-6)
			}
		}
		near(t, "households with nothing", sum(r.row(n, 0)), math.Max(poor, total/4), 1e-6)
	}
}
