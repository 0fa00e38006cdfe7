package output

import "cistern/output/distribution"

// summaryVariable is what a summary tells of a column, or of what is made from
// several. A variable whose columns are not there is left out.
type summaryVariable struct {
	name string // in the table
	key  string // of the variable among others, and of the column it may miss

	column   func(*SummaryRows) []float64  // its values
	flags    func(*SummaryRows) []bool     // or 0 and 1, in place of column
	from     func(*SummaryRows, []float64) // or values made of other columns
	given    func(*SummaryRows) int        // rows in which what they are made of is there; nil: as required
	required bool                          // the columns must be there
	gaps     bool                          // NaN says that a row has no value

	mean    string           // statistic of the mean; "": neither mean nor sd
	repeats [2]string        // variable and statistic under which the mean stands once more
	wants   distribution.Set // beyond mean, sd and shares; 0: the mean alone
	shares  func(*SummaryOptions) []summaryShare
	also    *summaryImage // a variable that need not be looked at: its percentiles follow; the shares are its, too
}

// summaryImage is a variable that rises with another: percentiles and the ends of
// their intervals are the images of the other's.
type summaryImage struct {
	name string
	of   func(float64) float64
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

// wealthClasses is the number of classes of assets that the propensity is told
// apart by: fifths.
const wealthClasses = 5

// summaryVariables are the variables of a summary in the order of its table. A new
// one is a line here and a column of SummaryRows.
var summaryVariables = []summaryVariable{
	{name: "income", key: "income", column: func(r *SummaryRows) []float64 { return r.Income }, required: true, mean: "mean", wants: everything, shares: nonpositive},
	{name: "consumption", key: "consumption", column: func(r *SummaryRows) []float64 { return r.Consumption }, required: true, mean: "mean", wants: everything, shares: nonpositive},
	{name: "propensity", key: "propensity", from: propensity, given: func(r *SummaryRows) int { return len(r.Propensity) }, mean: "mean", repeats: [2]string{"consumption", "mean_propensity"}, wants: distribution.Percentiles},
	{name: "assets", key: "assets", column: func(r *SummaryRows) []float64 { return r.Assets }, required: true, mean: "mean", wants: everything | distribution.Classes, shares: nonpositive},
	{name: "assets", key: "at_limit", flags: func(r *SummaryRows) []bool { return r.AtLimit }, mean: "share_at_limit"},
	{name: "precautionary_assets", key: "twin_assets", from: precaution, given: func(r *SummaryRows) int { return len(r.TwinAssets) }, mean: "mean"},
	{name: "wealth_to_income", key: "wealth_to_income", from: wealthToIncome, required: true, gaps: true, wants: distribution.Percentiles,
		shares: incomeMonths, also: &summaryImage{"runway_income_months", func(ratio float64) float64 { return max(0, 12*ratio) }}},
	{name: "runway_months", key: "runway_months", from: runway, required: true, gaps: true, wants: distribution.Percentiles, shares: months},
	{name: "consumption_change", key: "last_consumption", from: change, given: func(r *SummaryRows) int { return len(r.LastConsumption) }, gaps: true,
		mean: "mean", wants: distribution.Percentiles, shares: falls},
	{name: "consumption_change_job_loss", key: "job_lost", from: changeAtJobLoss, given: func(r *SummaryRows) int { return min(len(r.JobLost), len(r.LastConsumption)) }, gaps: true,
		mean: "mean", wants: distribution.Percentiles, shares: falls},
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

// months are the shares whose runway is shorter than each of so many months.
func months(o *SummaryOptions) (shares []summaryShare) {
	for _, m := range o.Runway {
		shares = append(shares, summaryShare{"share_below", m, distribution.Threshold{Value: m, Strict: true}})
	}
	return shares
}

// incomeMonths are the same of assets over monthly net income, of what is counted
// in years of income.
func incomeMonths(o *SummaryOptions) (shares []summaryShare) {
	for _, m := range o.Runway {
		shares = append(shares, summaryShare{"share_below", m, distribution.Threshold{Value: m / 12, Strict: true}})
	}
	return shares
}

// falls are the shares whose consumption falls by more than each of so many percent.
func falls(o *SummaryOptions) (shares []summaryShare) {
	for _, p := range o.Falls {
		shares = append(shares, summaryShare{"share_below", -p / 100, distribution.Threshold{Value: -p / 100, Strict: true}})
	}
	return shares
}

// source is the number of rows of the column that decides whether the variable is
// there.
func (v *summaryVariable) source(r *SummaryRows) int {
	switch {
	case v.flags != nil:
		return len(v.flags(r))
	case v.given != nil:
		return v.given(r)
	case v.from != nil:
		return r.N
	}
	return len(v.column(r))
}

// made reports whether values are made, not read off a column.
func (v *summaryVariable) made() bool { return v.flags != nil || v.from != nil }

// make puts the values of all rows into to.
func (v *summaryVariable) make(r *SummaryRows, to []float64) {
	if v.flags == nil {
		v.from(r, to)
		return
	}
	for k, is := range v.flags(r)[:len(to)] {
		var one float64
		if is {
			one = 1
		}
		to[k] = one
	}
}
