package output

import (
	"math"

	"cistern/output/stats"
)

// Transfer is the outcome of an experiment in which households receive money that
// they did not expect, or have to pay a bill: sums over receipts, told apart by
// band of ages, group and class of wealth at receipt.
type Transfer struct {
	Amount  float64 // money; negative: a bill
	Bands   []Band  // of ages at receipt
	Groups  []string
	Classes int            // equal parts of the distribution of wealth
	Years   int            // looked at after that of receipt
	Cells   []TransferSums // [band][group][class], flat
}

// TransferSums are sums over receipts by jackknife group, household id modulo 64.
// w is the weight of a receipt; a prime marks the life with the transfer.
type TransferSums struct {
	Weight     [groupsJackknife]float64   // Σ w of those who received, or paid
	Unable     [groupsJackknife]float64   // Σ w of those who could not pay: in no other sum
	Income     [groupsJackknife]float64   // Σ w·net income in the year of receipt, money
	Propensity [groupsJackknife]float64   // Σ w·marginal propensity to consume then, without the transfer
	Consumed   [][groupsJackknife]float64 // [years since] Σ w·(c′ − c), money
	Kept       [][groupsJackknife]float64 // [years since] Σ w·(a′ − a) at the end of the year, money
	Receipts   int64                      // those behind Weight
}

// TransferResponse is what becomes of a transfer, in shares of it. The dead consume
// and hold nothing.
type TransferResponse struct {
	Receipts   int64 // households, each once for every age at which it receives
	Unable     stats.Estimate
	Propensity stats.Estimate   // mean marginal propensity to consume in the year of receipt, without the transfer
	OfIncome   stats.Estimate   // the amount over mean net income in the year of receipt; NaN unless that is positive
	Consumed   []stats.Estimate // [years since] in the year
	Cumulated  []stats.Estimate // [years since] from receipt to the year
	Held       []stats.Estimate // [years since] more assets at the end of the year
}

// Response returns what households in a band, group and class do, with errors from
// the jackknife over households; −1 stands for all.
func (t *Transfer) Response(band, group, class int) TransferResponse {
	s := t.pool(band, group, class)
	r := TransferResponse{Receipts: s.Receipts, Propensity: s.mean(&s.Propensity, 1), Unable: s.unable()}
	r.OfIncome = jackknifed(&s.Weight, func(without int) float64 {
		if mean := left(&s.Income, without) / left(&s.Weight, without); mean > 0 {
			return t.Amount / mean
		}
		return math.NaN()
	})
	var total [groupsJackknife]float64
	for y := range s.Consumed {
		for g := range total {
			total[g] += s.Consumed[y][g]
		}
		r.Consumed = append(r.Consumed, s.mean(&s.Consumed[y], t.Amount))
		r.Cumulated = append(r.Cumulated, s.mean(&total, t.Amount))
		r.Held = append(r.Held, s.mean(&s.Kept[y], t.Amount))
	}
	return r
}

// pool adds the sums of a band, group and class; −1 stands for all.
func (t *Transfer) pool(band, group, class int) *TransferSums {
	s := &TransferSums{Consumed: make([][groupsJackknife]float64, t.Years+1), Kept: make([][groupsJackknife]float64, t.Years+1)}
	for i := range t.Cells {
		c := &t.Cells[i]
		of := func(index, want int) bool { return want < 0 || index == want }
		if !of(i%t.Classes, class) || !of(i/t.Classes%len(t.Groups), group) || !of(i/t.Classes/len(t.Groups), band) {
			continue
		}
		s.Receipts += c.Receipts
		for g := range c.Weight {
			s.Weight[g] += c.Weight[g]
			s.Unable[g] += c.Unable[g]
			s.Income[g] += c.Income[g]
			s.Propensity[g] += c.Propensity[g]
			for y := range s.Consumed {
				s.Consumed[y][g] += c.Consumed[y][g]
				s.Kept[y][g] += c.Kept[y][g]
			}
		}
	}
	return s
}

// mean is a sum over receipts, per receipt, in units of unit.
func (s *TransferSums) mean(sum *[groupsJackknife]float64, unit float64) stats.Estimate {
	return jackknifed(&s.Weight, func(without int) float64 { return left(sum, without) / left(&s.Weight, without) / unit })
}

// unable is the share of households that cannot pay, with the interval of Korn and
// Graubard ([stats.ProportionInterval]).
func (s *TransferSums) unable() stats.Estimate {
	var asked [groupsJackknife]float64
	for g := range asked {
		asked[g] = s.Weight[g] + s.Unable[g]
	}
	e := jackknifed(&asked, func(without int) float64 { return left(&s.Unable, without) / left(&asked, without) })
	n := float64(s.Receipts)
	if p := e.Value; e.StandardError > 0 {
		n = p * (1 - p) / (e.StandardError * e.StandardError)
	}
	e.Lower, e.Upper = stats.ProportionInterval(e.Value, max(1, n), confidence)
	return e
}

// jackknifed returns a statistic with its error: of is called with the jackknife
// group that is left out, −1 for none. sizes are those of the groups.
func jackknifed(sizes *[groupsJackknife]float64, of func(without int) float64) stats.Estimate {
	full := of(-1)
	var without [groupsJackknife]float64
	for g := range without {
		if sizes[g] > 0 {
			without[g] = of(g)
		}
	}
	se, n := stats.Jackknife(full, without[:], sizes[:])
	return stats.JackknifeInterval(full, se, n, confidence)
}

// left is the sum over the jackknife groups but one.
func left(sums *[groupsJackknife]float64, without int) (total float64) {
	for g, x := range sums {
		if g != without {
			total += x
		}
	}
	return total
}
