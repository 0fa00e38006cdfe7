package report

import "cistern/output"

// Section is a part of the page: words, charts and tables, in that order.
type Section struct {
	ID     string // letters, digits and hyphens
	Title  string
	Words  []string
	Choice string // what a reader chooses among its tables, such as "Age"; empty: nothing
	Charts []Chart
	Tables []Table
}

// Table is a table to be read: text cells, the first row of Head above them.
type Table struct {
	ID      string
	Title   string
	Note    string // how to read it
	Head    []string
	Rows    [][]string
	Numbers []bool // [column] aligned to the right
	Group   string // shown where this group is chosen; empty: always
	Option  string // the choice of its section that it answers; empty: shown always
}

// Run is what a page says about one run. Nil tables and empty lists are left out.
type Run struct {
	Name       string // to tell runs apart side by side
	Title      string // of the scenario
	Currency   string
	Households int64
	AboveGrid  int64 // household-years above the top of the rule's grid
	Summary    *output.Table
	Accuracy   *output.Table
	Policy     *output.Table
	Mobility   *output.Table
	Transfer   *output.Table

	Decomposition *output.Table
	Assumptions   []Assumption
	Provenance    [][2]string
	Warnings      []string
	Caution       string
	Extra         []Section // of experiments, after the sections on the distribution
}

// Assumption is one key of the scenario with its value.
type Assumption struct{ Key, Value, Meaning string }

// Sections returns the sections about a run, in their order.
func Sections(r *Run) []Section {
	s := readSummary(r.Summary)
	var list []Section
	for _, make := range []func(*Run, *summary) Section{wealth, precaution, takenApart, flows, rules, concentration, percentiles, runway, falls, propensity, transferred, mobility} {
		if section := make(r, s); len(section.Charts)+len(section.Tables) > 0 {
			list = append(list, section)
		}
	}
	list = append(list, r.Extra...)
	for _, section := range []Section{accuracy(r, s), assumptions(r), provenance(r)} {
		if len(section.Words)+len(section.Tables) > 0 {
			list = append(list, section)
		}
	}
	return list
}

// add appends a chart without its empty views, unless nothing is left.
func (s *Section) add(c Chart) {
	kept := c.Views[:0]
	for _, v := range c.Views {
		if !v.empty() {
			kept = append(kept, v)
		}
	}
	if c.Views = kept; len(kept) > 0 {
		s.Charts = append(s.Charts, c)
	}
}
