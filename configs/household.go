package configs

import (
	"math"
	"strconv"

	"cistern/income"
	"cistern/policy"
)

// draft is a household as read, before it is put together.
type draft struct {
	in *files // where tables are

	firstAge, lastAge int
	survival          int // form: 0 table, 1 gompertz, 2 certain
	table             tableRef
	sex               string
	year              int
	gompertz          income.Gompertz

	family      string
	gamma       float64
	alpha       float64
	bliss       float64
	subsistence float64
	discount    number
	halfWidth   float64
	spread      int
	bequest     policy.Bequest

	form       string
	profile    int // form: 0 polynomial, 1 table, 2 constant
	polynomial []float64
	from       float64
	earnings   tableRef
	constant   float64
	meaning    string
	process    income.AR1
	initial    float64 // NaN: stationary
	method     string
	points     int
	span       float64
	transitory income.Transitory
	jobLoss    income.JobLoss

	ret     float64
	limit   policy.Limit
	pension policy.Pension
}

// tableRef is a file named by a key.
type tableRef struct {
	name string
	at   *node
	key  string
}

// readHousehold reads the blocks of one household in s. in is nil where only the
// format is wanted.
func readHousehold(s *section, in *files) *draft {
	d := &draft{in: in}
	d.readLife(s.section("life", "ages and mortality", true))
	d.readPreferences(s.section("preferences", "what households want", true))
	d.readIncome(s.section("income", "earnings while working", true))
	d.readSaving(s.section("saving", "return and borrowing", true))
	d.readPublic(s.section("public", "public rules", false))
	return d
}

func (d *draft) readLife(s *section) {
	d.firstAge = int(s.integer(number{key: "first_age", meaning: "age at which households begin, years", in: within(0, 119), def: 25, required: true}))
	d.lastAge = int(s.integer(number{key: "last_age", meaning: "last possible age, years", in: within(1, 120), def: 100, required: true}))
	if s.n != nil && d.lastAge <= d.firstAge {
		s.fault(s.n.get("last_age"), "last_age", "is %d, want above first_age, %d", d.lastAge, d.firstAge)
		d.lastAge = d.firstAge + 1
	}
	d.survival = s.oneForm("survival", "yearly survival: a table of death probabilities, gompertz, or certain", 2, false,
		form{mark: "table", wants: "{table, sex, year}", read: func(t *section) {
			d.table = t.file(d.in, "table", "CSV with columns age, sex, year, q; a name that begins with builtin: is a table that ships with the program")
			d.sex = t.text("sex", "rows with this sex", "", true, 40)
			d.year = int(t.integer(number{key: "year", meaning: "rows of this year", in: within(0, 9999), required: true}))
		}},
		form{mark: "gompertz", wants: "{gompertz: {modal_age, dispersion}}", read: func(t *section) {
			g := t.section("gompertz", "hazard (1/dispersion)·exp((age − modal_age)/dispersion)", true)
			d.gompertz.ModalAge = g.number(number{key: "modal_age", meaning: "age at which most deaths happen, years", in: within(1, 200), required: true})
			d.gompertz.Dispersion = g.number(number{key: "dispersion", meaning: "spread of ages at death, years", in: within(0.5, 100), required: true})
			g.done()
		}},
		form{word: "certain", wants: "certain"})
	s.done()
}

func (d *draft) readPreferences(s *section) {
	u := s.section("utility", "utility family and its parameters", true)
	d.family = u.choice("family", "crra, cara (exponential), quadratic or stone_geary", "", "crra", "cara", "quadratic", "stone_geary")
	d.readUtility(u)
	u.done()
	d.discount = number{in: aboveTo(0, 1.2), def: 0.96}
	at := s.oneForm("discount_factor", "beta a year; or equally likely factors spread evenly over mean ± half_width", 0, true,
		form{num: &d.discount, wants: "a number above 0 and at most 1.2"},
		form{mark: "mean", wants: "{mean, half_width, points}", read: func(m *section) {
			d.discount.def = m.number(number{key: "mean", meaning: "middle of the factors", in: aboveTo(0, 1.2), required: true})
			d.halfWidth = m.number(number{key: "half_width", meaning: "half the width of the range they spread over", in: within(0, 0.5), def: 0})
			d.spread = int(m.integer(number{key: "points", meaning: "number of factors", in: within(1, 50), def: 5}))
			if m.n != nil && (d.discount.def-d.halfWidth <= 0 || d.discount.def+d.halfWidth > 1.2) {
				m.fault(m.n.get("half_width"), "half_width", "is %s, want every factor above 0 and at most 1.2", format(d.halfWidth))
			}
		}})
	if at != 1 {
		d.spread = 1
	}
	b := s.section("bequest", "utility of the estate, weight times u(estate + shift)", false)
	d.bequest.Weight = b.number(number{key: "weight", meaning: "0: no motive", in: atLeast(0)})
	d.bequest.Shift = b.number(number{key: "shift", meaning: "money", in: atLeast(0)})
	b.done()
	s.done()
}

// readUtility reads the parameters of the family; those of other families are not
// allowed beside them.
func (d *draft) readUtility(u *section) {
	schemaOnly := u.n == nil && u.doc != nil
	read := func(use bool, f number) float64 {
		if schemaOnly {
			f.required = false
			u.doc.put(f.key, false, map[string]any{"type": "number", "description": f.meaning, "exclusiveMinimum": f.in.low})
			return 0
		}
		if !use {
			return 0
		}
		return u.number(f)
	}
	risk := number{key: "relative_risk_aversion", meaning: "crra and stone_geary: gamma", in: aboveTo(0, 100), required: true}
	d.gamma = read(d.family == "crra" || d.family == "stone_geary", risk)
	d.subsistence = read(d.family == "stone_geary", number{key: "subsistence", meaning: "stone_geary: consumption that cannot be given up, money a year", in: atLeast(0), required: true})
	d.alpha = read(d.family == "cara", number{key: "absolute_risk_aversion", meaning: "cara: per unit of money", in: above(0), required: true})
	d.bliss = read(d.family == "quadratic", number{key: "bliss_point", meaning: "quadratic: consumption at which nothing is missing, money a year", in: above(0), required: true})
}

func (d *draft) readIncome(s *section) {
	d.form = s.choice("form", "log: Y = P·exp(z)·exp(e); level: Y = P + z + e", "log", "log", "level")
	d.profile = s.oneForm("profile", "earnings by age, P: polynomial in age, table, or constant", -1, true,
		form{mark: "polynomial", wants: "{polynomial, from}", read: func(p *section) {
			d.polynomial = p.numbers(number{key: "polynomial", meaning: "coefficients of powers 0, 1, … of (age − from), of ln P (form level: of P)", in: anyNumber(), required: true}, nil, 12)
			d.from = p.number(number{key: "from", meaning: "age at which the polynomial is its first coefficient, years", in: within(-200, 200), def: 0})
		}},
		form{mark: "table", wants: "{table}", read: func(p *section) {
			d.earnings = p.file(d.in, "table", "CSV with columns age, earnings")
		}},
		form{mark: "constant", wants: "{constant}", read: func(p *section) {
			d.constant = p.number(number{key: "constant", meaning: "the same at every age, money a year", in: anyNumber(), required: true})
		}})
	d.meaning = s.choice("profile_is", "what the profile of form log states", "mean", "mean", "median")
	d.readPersistent(s.section("persistent", "the persistent part z: z' = autocorrelation·z + innovation", false))
	t := s.section("transitory", "the transitory part e, normal, independent over years", false)
	d.transitory.SD = t.number(number{key: "sd", meaning: "standard deviation; log points, or money in form level", in: atLeast(0), def: 0})
	d.transitory.Nodes = int(t.integer(number{key: "nodes", meaning: "quadrature nodes in the solver", in: within(1, 301), def: 15}))
	if t.choice("quadrature", "trapezoid on ±4 standard deviations, or gauss_hermite", "trapezoid", "trapezoid", "gauss_hermite") == "gauss_hermite" {
		d.transitory.Rule = income.GaussHermite
	}
	t.done()
	j := s.section("job_loss", "a year without earnings", false)
	d.jobLoss.Probability = j.number(number{key: "probability", meaning: "a year", in: within(0, 1), def: 0})
	d.jobLoss.BenefitRate = j.number(number{key: "benefit_rate", meaning: "benefit as a share of what the profile and the persistent part would pay", in: within(0, 10), def: 0})
	j.done()
	s.done()
}

func (d *draft) readPersistent(s *section) {
	d.process.Autocorrelation = s.number(number{key: "autocorrelation", meaning: "rho, a year", in: between(-1, 1), def: 0.95})
	d.process.InnovationSD = s.number(number{key: "innovation_sd", meaning: "log points, or money in form level", in: atLeast(0), def: 0})
	x := number{in: atLeast(0)}
	d.initial = math.NaN()
	if s.oneForm("initial_sd", "standard deviation of z at the first age, put on the grid, or the stationary distribution", 0, false,
		form{word: "stationary", wants: "stationary"}, form{num: &x, wants: "a number at least 0"}) == 1 {
		d.initial = x.def
	}
	d.method = s.choice("method", "of discretising", "rouwenhorst", "rouwenhorst", "tauchen")
	d.points = int(s.integer(number{key: "points", meaning: "nodes", in: within(2, 255), def: 7}))
	d.span = s.number(number{key: "span", meaning: "tauchen: half-width of the grid in stationary standard deviations", in: aboveTo(0, 20), def: 3})
	s.done()
}

func (d *draft) readSaving(s *section) {
	d.ret = s.number(number{key: "return", meaning: "r, a year, after tax", in: span{low: -0.9, high: 1}, required: true})
	x := number{in: atLeast(0)}
	switch s.oneForm("borrowing_limit", "an amount at least 0, natural (what the lowest income can repay), or none (cara and quadratic)", 0, false,
		form{num: &x, wants: "an amount at least 0"}, form{word: "natural", wants: "natural"}, form{word: "none", wants: "none"}) {
	case 0:
		d.limit = policy.Limit{Kind: policy.LimitAmount, Amount: x.def}
	case 1:
		d.limit = policy.Limit{Kind: policy.LimitNatural}
	case 2:
		d.limit = policy.Limit{Kind: policy.LimitNone}
	}
	s.done()
}

func (d *draft) readPublic(s *section) {
	p := s.section("pension", "the public pension", false)
	d.pension.ClaimAge = int(p.integer(number{key: "claim_age", meaning: "first age at which it is paid and nobody works; above last_age: never", in: within(1, 200), def: 65}))
	f := p.section("final_earnings", "a share of the final earnings that the persistent part supports", false)
	d.pension.FinalEarningsRate = f.number(number{key: "rate", meaning: "share", in: within(0, 10), def: 0})
	f.done()
	d.pension.Flat = p.number(number{key: "flat", meaning: "an amount for everybody, money a year", in: atLeast(0), def: 0})
	p.done()
	s.done()
}

// file reads the name of a table. In the resolved scenario the table is a copy
// beside it.
func (s *section) file(in *files, key, meaning string) tableRef {
	ref := tableRef{name: s.text(key, meaning, "", true, 500), key: join(s.path, key)}
	if s.n != nil {
		ref.at = s.n.get(key)
	}
	if in != nil && s.out != nil && ref.name != "" {
		s.out.values[len(s.out.values)-1] = strconv.Quote(in.copyName(ref.name))
	}
	return ref
}
