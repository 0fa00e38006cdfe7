package configs

import (
	"fmt"
	"math"
	"slices"

	"cistern/policy"
	"cistern/sim"
)

// describe is the format: it reads the scenario's keys in order and returns the
// scenario, half-made where there are faults. in is nil where there are no files
// to read, as when the schema is made.
func describe(s *section, in *files) *Scenario {
	sc := new(Scenario)
	s.integer(number{key: "cistern", meaning: "the format, 1", in: within(1, 1), def: 1, required: true})
	sc.Title = s.text("title", "what the scenario is about, in a line", "", false, 200)
	sc.Currency = s.text("currency", "the unit of money, a label", "crown", false, 40)
	sc.Seed = uint64(s.integer(number{key: "seed", meaning: "seed of all random numbers; two scenarios with one seed meet the same luck", in: within(0, math.MaxInt64), def: 1}))
	sc.Households = s.integer(number{key: "households", meaning: "households to simulate", in: within(1, sim.Unit*1_000_000), def: 20000})
	readPopulation(s.section("population", "the population that households of all ages make at a moment", false), sc)
	blocks := readCommon(s)
	groups := readGroups(s)
	if s.n != nil {
		readHouseholds(s, sc, blocks, groups, in)
	}
	start := readStart(s)
	readSolver(s.section("solver", "accuracy of the solution", false), sc)
	readPanel(s.section("panel", "what is written of the panel", false), sc)
	readSummary(s.section("summary", "what the summary holds", false), sc)
	readExperiments(s, sc)
	s.done()
	for i := range sc.Groups {
		sc.Groups[i].Start = start
		checkStart(s, &sc.Groups[i])
	}
	return sc
}

// checkStart refuses start assets with which the lowest income of the first year
// would leave nothing to consume.
func checkStart(s *section, g *Group) {
	if g.Household.Utility == nil {
		return // not built: at fault already
	}
	lowest, begins := g.Start.Constant, "begins with"
	if g.Start.Median > 0 {
		lowest = 0
		if begins = "may begin with"; g.Start.ZeroShare == 0 {
			begins = "may begin with hardly more than"
		}
	}
	least := g.Household.LeastStart()
	if lowest > least || g.Start.Median > 0 && g.Start.ZeroShare == 0 && least <= 0 {
		return
	}
	s.at("start.assets", "a household of group %s %s %s, want more than %s: the lowest income of its first year would leave no consumption that its utility allows"+
		" (or give it an income, such as income.job_loss.benefit_rate, or a saving.borrowing_limit)", g.Name, begins, format(lowest), format(least))
}

// commonBlocks are the blocks that groups may override.
var commonBlocks = []string{"life", "preferences", "income", "saving", "public"}

// readCommon takes the blocks that describe a household. They are read for every
// group from its own settings and these.
func readCommon(s *section) map[string]*node {
	blocks := map[string]*node{}
	for _, key := range commonBlocks {
		blocks[key] = s.child(key, false)
	}
	if s.doc != nil {
		readHousehold(&section{w: s.w, doc: s.doc}, nil)
		s.doc.required = slices.DeleteFunc(s.doc.required, func(k string) bool { return slices.Contains(commonBlocks, k) })
	}
	return blocks
}

// maxOutcomes bounds the income outcomes that a scenario may tabulate, over all
// groups: a thousand times what an accurate solution takes.
const maxOutcomes = 20_000_000

// readHouseholds reads and builds the household of every group.
func readHouseholds(s *section, sc *Scenario, blocks map[string]*node, groups []groupNode, in *files) {
	var list *tree
	outcomes := 0
	for _, g := range groups {
		out := s.out
		if g.out != nil {
			if list == nil {
				list = s.out.branch("groups")
			}
			out = g.out
			list.items = append(list.items, out)
		}
		n := &node{kind: mapping, source: s.n.source, line: s.n.line, column: s.n.column}
		for _, key := range commonBlocks {
			if v := merge(blocks[key], g.n.get(key)); v != nil {
				n.set(&node{text: key}, v)
			}
		}
		h := &section{w: s.w, n: n, out: out}
		d := readHousehold(h, in)
		if outcomes += d.outcomes(); outcomes > maxOutcomes {
			h.at("income.transitory.nodes", "makes, with the persistent points, working years and groups, more than %d income outcomes to tabulate, which no computer needs; lower one of them", maxOutcomes)
			continue
		}
		group := d.build(h, in)
		group.Name, group.Share = g.name, g.share
		sc.Groups = append(sc.Groups, group)
	}
	if len(sc.Groups) == 0 {
		return
	}
	sc.FirstAge = sc.Groups[0].Household.FirstAge
	sc.LastAge = sc.FirstAge + sc.Groups[0].Household.Years() - 1
	for i, g := range sc.Groups {
		if h := g.Household; len(h.Survival) > 0 && (h.FirstAge != sc.FirstAge || h.FirstAge+h.Years()-1 != sc.LastAge) {
			s.fault(groups[i].n.get("life"), "life", "runs from %d to %d in group %s, want the ages of the first group, %d to %d",
				h.FirstAge, h.FirstAge+h.Years()-1, g.Name, sc.FirstAge, sc.LastAge)
		}
	}
}

// groupNode is an entry of groups.
type groupNode struct {
	name  string
	share float64
	n     *node
	out   *tree
}

// readGroups reads the list of groups; without one everybody is one group.
func readGroups(s *section) []groupNode {
	v := s.child("groups", false)
	if s.doc != nil {
		inside := s.doc.section("groups", "parts of the population with settings of their own; shares sum to 1", false)
		s.doc.properties["groups"].(map[string]any)["$items"] = true
		g := &section{w: s.w, doc: inside}
		readGroupHead(g)
		readHousehold(g, nil)
		inside.required = []string{"name", "share"}
		for _, b := range commonBlocks {
			relax(inside.properties[b].(map[string]any)["$inside"].(*schema))
		}
	}
	if v == nil {
		return []groupNode{{name: "households", share: 1}}
	}
	if v.kind != list || len(v.values) == 0 || len(v.values) > 100 {
		s.fault(v, "groups", "is %s, want a list of 1 to 100 groups, each with a name and a share", v.show())
		return nil
	}
	var groups []groupNode
	sum := 0.0
	for i, e := range v.values {
		key := fmt.Sprintf("groups[%d]", i)
		if e.kind != mapping {
			s.fault(e, key, "is %s, want a block of keys", e.show())
			continue
		}
		g := &section{w: s.w, path: key, n: e, out: new(tree)}
		name, share := readGroupHead(g)
		g.known = append(g.known, commonBlocks...)
		g.done()
		if slices.ContainsFunc(groups, func(x groupNode) bool { return x.name == name }) || name == "all" {
			s.fault(e.get("name"), key+".name", "is %s, want a name that no other group has and that is not all", name)
		}
		sum += share
		groups = append(groups, groupNode{name, share, e, g.out})
	}
	if len(groups) == len(v.values) && !(math.Abs(sum-1) < 1e-9) {
		s.fault(v, "groups", "has shares that sum to %s, want 1", format(sum))
	}
	return groups
}

func readGroupHead(g *section) (name string, share float64) {
	name = g.text("name", "name of the group", "", true, 64)
	if g.n != nil && name == "" {
		g.fault(g.n.get("name"), "name", "is empty")
	}
	return name, g.number(number{key: "share", meaning: "share of households, from 0 to 1", in: aboveTo(0, 1), required: true})
}

// relax makes every key of a group's block optional: what a group does not say it
// takes from the scenario.
func relax(d *schema) {
	d.required = nil
	for _, p := range d.properties {
		if inside, ok := p.(map[string]any)["$inside"].(*schema); ok {
			relax(inside)
		}
	}
}

func readStart(s *section) sim.Start {
	start := s.section("start", "what households begin with", false)
	var st sim.Start
	constant := number{key: "constant", meaning: "the same assets for everybody, money", in: anyNumber(), required: true}
	start.oneForm("assets", "assets at the end of the year before the first: lognormal with a share at zero, or constant", 1, false,
		form{mark: "median", wants: "{median, log_sd, zero_share}", read: func(a *section) {
			st.Median = a.number(number{key: "median", meaning: "median of those above zero, money", in: above(0), required: true})
			st.LogSD = a.number(number{key: "log_sd", meaning: "standard deviation of log assets", in: within(0, 10), def: 1})
			st.ZeroShare = a.number(number{key: "zero_share", meaning: "share of households that begin with nothing", in: within(0, 1), def: 0})
		}},
		form{mark: "constant", wants: "{constant}", read: func(a *section) {
			if a.n == nil {
				constant.required = false
			}
			st.Constant = a.number(constant)
		}})
	start.done()
	return st
}

func readSolver(s *section, sc *Scenario) {
	o := policy.DefaultOptions()
	o.AssetPoints = int(s.integer(number{key: "asset_points", meaning: "nodes of the asset grid", in: within(10, 100_000), def: float64(o.AssetPoints)}))
	auto := func(key, meaning string, in span, wants string) float64 {
		x := number{in: in}
		at := s.oneForm(key, meaning, 0, false, form{word: "auto", wants: "auto"}, form{num: &x, wants: wants})
		if at == 1 {
			return x.def
		}
		return math.NaN()
	}
	o.HighestAssets = auto("highest_assets", "top of the asset grid above the limit, money; auto: 50 times the highest mean income", above(0), "an amount above 0")
	o.LowestAssets = auto("lowest_assets", "bottom of the asset grid without a borrowing limit, money; auto: -20 times that income",
		span{low: math.Inf(-1), high: 0, highOpen: true}, "an amount below 0")
	o.AssetScale = auto("asset_scale", "money; the grid is even near the limit and by equal ratios well above this; auto: 0.1 times that income", above(0), "an amount above 0")
	if s.choice("interpolation", "of the rule between its nodes", "cubic", "cubic", "linear") == "linear" {
		o.Interpolation = policy.Linear
	}
	o.KinkThreshold = s.number(number{key: "kink_threshold", meaning: "a kink gets a node of its own above this slope jump times probability", in: within(1e-6, 1), def: o.KinkThreshold})
	sc.Solver = o
	s.done()
}

func readPanel(s *section, sc *Scenario) {
	sc.Panel.Write = s.boolean("write", "write the panel's rows", true)
	sc.Panel.Precision = s.choice("precision", "of money and states in the panel", "double", "double", "single")
	sc.Panel.Block = int(s.integer(number{key: "block", meaning: "households a part file, a multiple of 4096", in: within(sim.Unit, 100*65536), def: 65536}))
	if sc.Panel.Block%sim.Unit != 0 {
		s.fault(s.n.get("block"), "block", "is %d, want a multiple of %d", sc.Panel.Block, sim.Unit)
	}
	s.done()
}

// readPopulation reads how many were born when: the ages of the whole population
// weigh (1 + growth)^−age, beside those who survive to them.
func readPopulation(s *section, sc *Scenario) {
	sc.Growth = s.number(number{key: "growth", meaning: "growth of births, a year; in the summary's rows for all ages the young count (1 + growth) times for every year they are younger", in: within(-0.1, 0.1), def: 0})
	s.done()
}

func readSummary(s *section, sc *Scenario) {
	o := &sc.Summary
	o.Percentiles = s.levels("percentiles", "in percent, strictly between 0 and 100", between(0, 100), 1, 5, 10, 25, 50, 75, 90, 95, 99)
	o.By = s.words("by", "what the summary tells apart", []string{"age", "group"}, "age", "group")
	o.Lorenz = s.levels("lorenz", "Lorenz ordinates: what share of the total the poorest so many percent have", between(0, 100), 10, 20, 30, 40, 50, 60, 70, 80, 90)
	o.TopShares = s.levels("top_shares", "what share of the total the richest so many percent have", between(0, 100), 10, 1, 0.1)
	o.Shortfall = s.levels("shortfall", "expected shortfall: the mean of the worst so many percent", aboveTo(0, 100), 1, 5)
	o.Tail = s.number(number{key: "tail", meaning: "share of the upper tail whose Pareto index is estimated, in percent", in: aboveTo(0, 50), def: 5})
	o.RunwayMonths = s.levels("runway_months", "share of households whose assets pay for consumption, or stand in for net income, for fewer than so many months", above(0), 1, 3, 6)
	o.ConsumptionFalls = s.levels("consumption_falls", "share of households whose consumption falls by more than so many percent from one year to the next", above(0), 5, 10, 20)
	o.Mobility = s.mobility(sc)
	s.done()
}

// levels reads a list of distinct levels in percent.
func (s *section) levels(key, meaning string, in span, def ...float64) []float64 {
	levels := s.numbers(number{key: key, meaning: meaning, in: in}, def, 100)
	for i, p := range levels {
		if slices.Contains(levels[:i], p) {
			s.fault(s.n.get(key), key, "has %s twice", format(p))
		}
	}
	return levels
}
