package output

import "cistern/output/distribution"

// summaryVariable is what a summary tells of a column, or of two. A variable whose
// columns are not there is left out.
type summaryVariable struct {
	name string // in the table
	key  string // of the variable among others, and of the column it may miss

	column   func(*SummaryRows) []float64 // its values
	flags    func(*SummaryRows) []bool    // or 0 and 1, in place of column
	less     func(*SummaryRows) []float64 // what is taken off the values; nil: nothing
	required bool                         // the columns must be there
	gaps     bool                         // NaN says that a row has no value

	mean   string           // statistic of the mean
	wants  distribution.Set // beyond mean, sd and shares; 0: the mean alone
	shares func(*SummaryOptions) []summaryShare
}

// summaryShare is a share of rows up to a threshold.
type summaryShare struct {
	statistic string
	level     float64 // in the table; NaN: none
	at        distribution.Threshold
}

// summaryRatio is the ratio of the means of two variables.
type summaryRatio struct{ name, statistic, of, by string }

// everything describes the distribution of money.
const everything = distribution.Percentiles | distribution.Gini | distribution.Concentration | distribution.Shortfall | distribution.Tail

// summaryVariables are the variables of a summary in the order of its table. A new
// one is a line here and a column of SummaryRows.
var summaryVariables = []summaryVariable{
	{name: "income", key: "income", column: func(r *SummaryRows) []float64 { return r.Income }, required: true, mean: "mean", wants: everything, shares: nonpositive},
	{name: "consumption", key: "consumption", column: func(r *SummaryRows) []float64 { return r.Consumption }, required: true, mean: "mean", wants: everything, shares: nonpositive},
	{name: "consumption", key: "propensity", column: func(r *SummaryRows) []float64 { return r.Propensity }, mean: "mean_propensity"},
	{name: "assets", key: "assets", column: func(r *SummaryRows) []float64 { return r.Assets }, required: true, mean: "mean", wants: everything, shares: nonpositive},
	{name: "assets", key: "at_limit", flags: func(r *SummaryRows) []bool { return r.AtLimit }, mean: "share_at_limit"},
	{name: "precautionary_assets", key: "twin_assets", column: func(r *SummaryRows) []float64 { return r.Assets }, less: func(r *SummaryRows) []float64 { return r.TwinAssets }, mean: "mean"},
}

// summaryRatios follow the variables in the table.
var summaryRatios = []summaryRatio{
	{"precautionary_assets", "share_of_mean_assets", "twin_assets", "assets"},
	{"wealth_to_income", "ratio_of_means", "assets", "income"},
}

// nonpositive is the share at or below zero.
func nonpositive(*SummaryOptions) []summaryShare {
	return []summaryShare{{statistic: "share_nonpositive", level: noLevel}}
}

// source is the column that decides whether the variable is there.
func (v *summaryVariable) source(r *SummaryRows) int {
	switch {
	case v.flags != nil:
		return len(v.flags(r))
	case v.less != nil:
		return len(v.less(r))
	}
	return len(v.column(r))
}

// made reports whether values are made, not read off a column.
func (v *summaryVariable) made() bool { return v.flags != nil || v.less != nil }

// make puts the values of all rows into to.
func (v *summaryVariable) make(r *SummaryRows, to []float64) {
	if v.flags != nil {
		for k, is := range v.flags(r)[:len(to)] {
			var one float64
			if is {
				one = 1
			}
			to[k] = one
		}
		return
	}
	less := v.less(r)[:len(to)]
	for k, x := range v.column(r)[:len(to)] {
		to[k] = x - less[k]
	}
}
