package output

import "cistern/output/stats"

// BandSummary describes the households of a group in a band of ages. A
// household counts once for every year it lives in the band, ages weighed by the
// growth of births; errors come from the jackknife over whole households, so that
// its years may be alike.
type BandSummary struct {
	Band       Band
	Group      string
	Households int64 // alive at the youngest age of the band
	Years      int64 // household-years

	MedianAssets  stats.Estimate // money
	MeanAssets    stats.Estimate // money
	Precautionary stats.Estimate // money: assets less those of the certain twin; zero value without twins
	Consumption   stats.Estimate // mean, money a year
	ShareAtLimit  stats.Estimate // fraction of household-years; zero value if not recorded
}

// Bands returns what the options' bands of ages hold, by group in the order of
// the options and last for all groups together, bands ascending. Bands in which
// nobody lives are left out. It panics before the last EndPass.
func (s *Summary) Bands() []BandSummary {
	s.mustBeDone()
	assets, consumption := s.variable("assets"), s.variable("consumption")
	gap, limit := s.variable("twin_assets"), s.variable("at_limit")
	var list []BandSummary
	for i := range s.targets {
		t := &s.targets[i]
		if t.band < 0 {
			continue
		}
		r := s.study.Target(i)
		if r.Rows() == 0 {
			continue
		}
		b := BandSummary{
			Band: s.o.Bands[t.band], Group: s.groupName(t), Households: s.households(t), Years: r.Rows(),
			MedianAssets: r.Median(assets), MeanAssets: r.Mean(assets), Consumption: r.Mean(consumption),
		}
		if gap >= 0 {
			b.Precautionary = r.Mean(gap)
		}
		if limit >= 0 {
			b.ShareAtLimit = r.Proportion(limit)
		}
		list = append(list, b)
	}
	return list
}

// BandTable returns the bands of one group ([Everyone] for all together) as a
// table to be read by people: ages, median and mean assets, the precautionary
// part of mean assets with its standard error, mean consumption and the share
// at the borrowing limit.
func (s *Summary) BandTable(group, currency string) *Table {
	t := NewTable("bands")
	ages := t.AddString("ages", "year", "band of ages, both ends included")
	median := t.AddFloat("assets_median", currency, "median assets at the end of the year")
	mean := t.AddFloat("assets_mean", currency, "mean assets at the end of the year")
	var gap, gapError, limit *Column
	if s.variable("twin_assets") >= 0 {
		gap = t.AddFloat("precautionary_mean", currency, "part of mean assets held because income is risky: assets less those of the certain twin")
		gapError = t.AddFloat("precautionary_error", currency, "Monte Carlo standard error of the precautionary part, paired")
	}
	spent := t.AddFloat("consumption_mean", currency+" a year", "mean consumption")
	if s.variable("at_limit") >= 0 {
		limit = t.AddFloat("share_at_limit", "fraction", "share of household-years in which the borrowing limit binds")
	}
	for _, b := range s.Bands() {
		if b.Group != group {
			continue
		}
		ages.AppendString(b.Band.String())
		appendKnown(median, b.MedianAssets.Value)
		appendKnown(mean, b.MeanAssets.Value)
		if gap != nil {
			appendKnown(gap, b.Precautionary.Value)
			appendKnown(gapError, b.Precautionary.StandardError)
		}
		appendKnown(spent, b.Consumption.Value)
		if limit != nil {
			appendKnown(limit, b.ShareAtLimit.Value)
		}
	}
	return t
}
