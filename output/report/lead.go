package report

import (
	"fmt"
	"math"

	"cistern/output"
)

// briefly writes x for running text: with fewer digits than a table has, the last of
// them no finer than twice the error.
func briefly(x, se float64) string { return rounded(x, 4*se) }

// share writes a fraction for running text, as per cent without the sign.
func share(x, se float64) string {
	if !(se > 0) {
		return decimals(100*x, 1)
	}
	return rounded(100*x, math.Max(400*se, 0.2))
}

// Subtitle says in a line what the results come from.
func Subtitle(r *Run) string {
	s := readSummary(r.Summary)
	if r.Households <= 0 || len(s.ages) == 0 {
		return ""
	}
	return fmt.Sprintf("%s simulated households, ages %d to %d; money in %s", decimals(float64(r.Households), 0), s.ages[0], s.ages[len(s.ages)-1], r.Currency)
}

// Lead returns the answer in words: what the results say first.
func Lead(r *Run) []string {
	s := readSummary(r.Summary)
	all := output.Everyone
	age := peak(s, all)
	if age == everyone {
		return nil
	}
	mean, _ := s.at(all, age, "assets", "mean", nan)
	text := fmt.Sprintf("Mean wealth is highest at age %d, at %s %s (95 %% interval %s to %s)", age, briefly(mean.Value, mean.StandardError), r.Currency,
		briefly(mean.Lower, mean.StandardError), briefly(mean.Upper, mean.StandardError))
	if median, ok := s.at(all, age, "assets", "percentile", 50); ok {
		text += fmt.Sprintf("; the household in the middle holds %s", briefly(median.Value, median.StandardError))
	}
	words := []string{text + "."}
	if gap, ok := s.at(all, age, "precautionary_assets", "mean", nan); ok {
		part, _ := s.at(all, age, "precautionary_assets", "share_of_mean_assets", nan)
		words = append(words, fmt.Sprintf("Of that mean, %s %% is held because income is risky: %s %s (95 %% interval %s to %s) that the same households would not hold if every income came at its mean.",
			share(part.Value, part.StandardError), briefly(gap.Value, gap.StandardError), r.Currency, briefly(gap.Lower, gap.StandardError), briefly(gap.Upper, gap.StandardError)))
	}
	if words = append(words, fragile(s)...); finite(mean.StandardError) {
		words = append(words, "The intervals say how far these figures would move with other draws of luck. Whether the model is right they do not say.")
	}
	return words
}

// fragile says how many households are close to the edge.
func fragile(s *summary) []string {
	all := output.Everyone
	var words []string
	if e, ok := s.at(all, everyone, "runway_months", "share_below", 3); ok {
		words = append(words, fmt.Sprintf("Of households of all ages, %s %% could live for less than three months on what they have (95 %% interval %s to %s).",
			share(e.Value, e.StandardError), share(e.Lower, e.StandardError), share(e.Upper, e.StandardError)))
	}
	text := ""
	if e, ok := s.at(all, everyone, "assets", "share_at_limit", nan); ok {
		text = fmt.Sprintf("At the borrowing limit are %s %% of households of all ages (95 %% interval %s to %s)",
			share(e.Value, e.StandardError), share(e.Lower, e.StandardError), share(e.Upper, e.StandardError))
	}
	worst, at := 0.0, everyone
	for _, a := range s.ages {
		if a >= s.ages[0]+35 {
			break
		}
		if e, ok := s.at(all, a, "assets", "share_at_limit", nan); ok && e.Value > worst {
			worst, at = e.Value, a
		}
	}
	if at != everyone {
		e, _ := s.at(all, at, "assets", "share_at_limit", nan)
		most := fmt.Sprintf("mong the young it binds most often at age %d, for %s %%", at, share(e.Value, e.StandardError))
		if text == "" {
			text = "The borrowing limit: a" + most
		} else {
			text += "; a" + most
		}
	}
	if text != "" {
		words = append(words, text+".")
	}
	return words
}
