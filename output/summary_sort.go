package output

import (
	"math"
	"slices"

	"cistern/output/stats"
)

// key maps a float to an integer of the same order; fromKey undoes it.
// Negative zero sorts just below zero.
func key(x float64) uint64 {
	b := math.Float64bits(x)
	return b ^ (uint64(int64(b)>>63) | 1<<63)
}

// fromKey returns the float of a key, zero for negative zero.
func fromKey(k uint64) float64 {
	x := math.Float64frombits(k ^ (uint64(^int64(k)>>63) | 1<<63))
	if x == 0 {
		return 0
	}
	return x
}

// sorter sorts values together with the jackknife group of their row. Its
// slices are reused.
type sorter struct {
	keys, spareKeys []uint64
	tags, spareTags []uint8
}

// load takes the values of a variable in some cells.
func (so *sorter) load(index [][]piece, cells []int, variable int) {
	so.keys, so.tags = so.keys[:0], so.tags[:0]
	n := 0
	for _, c := range cells {
		for _, p := range index[c] {
			n += p.to - p.from
		}
	}
	so.keys, so.tags = slices.Grow(so.keys, n), slices.Grow(so.tags, n)
	for _, c := range cells {
		for _, p := range index[c] {
			for _, x := range p.b.values[variable][p.from:p.to] {
				so.keys = append(so.keys, key(x))
			}
			so.tags = append(so.tags, p.b.tags[p.from:p.to]...)
		}
	}
}

const digitBits = 11

// sort is a stable radix sort from the last digit to the first, six digits of
// eleven bits; digits that all keys share cost nothing.
func (so *sorter) sort() {
	const digits = (64 + digitBits - 1) / digitBits
	var counts [digits][1 << digitBits]uint32
	for _, k := range so.keys {
		for d := range digits {
			counts[d][k>>(d*digitBits)&(1<<digitBits-1)]++
		}
	}
	n := len(so.keys)
	so.spareKeys = slices.Grow(so.spareKeys[:0], n)[:n]
	so.spareTags = slices.Grow(so.spareTags[:0], n)[:n]
	for d := range digits {
		shift := d * digitBits
		count := &counts[d]
		if n == 0 || int(count[so.keys[0]>>shift&(1<<digitBits-1)]) == n {
			continue
		}
		var at uint32
		for i, c := range count {
			count[i] = at
			at += c
		}
		tags := so.tags[:n]
		for i, k := range so.keys {
			to := &count[k>>shift&(1<<digitBits-1)]
			so.spareKeys[*to] = k
			so.spareTags[*to] = tags[i]
			*to++
		}
		so.keys, so.spareKeys = so.spareKeys, so.keys
		so.tags, so.spareTags = so.spareTags, so.tags
	}
}

// designEffect returns by how much the pooling of a household's years inflates
// the variance of the share of rows up to the p-quantile: its jackknife
// variance over that of independent rows, at least 1.
func (so *sorter) designEffect(p float64) float64 {
	n := len(so.keys)
	if n == 0 {
		return 1
	}
	j, _ := stats.Type1.Position(float64(n), p)
	edge := so.keys[int(j)-1]
	var below, rows, without [groupsJackknife]float64
	var count float64
	for i, k := range so.keys {
		rows[so.tags[i]]++
		if k <= edge {
			below[so.tags[i]]++
			count++
		}
	}
	share := count / float64(n)
	for g := range rows {
		without[g] = (count - below[g]) / (float64(n) - rows[g])
	}
	se, groups := stats.Jackknife(share, without[:], rows[:])
	if groups < 2 || share == 1 {
		return 1
	}
	return max(1, se*se*float64(n)/(share*(1-share)))
}

// gini returns the Gini coefficient of the sorted values with the small-sample
// factor n/(n−1), and its delete-a-group jackknife error, exactly and in one
// sweep. With T = Σ rank·x and S = Σ x, G = (2T − (n+1)·S)/((n−1)·S). Deleting
// a group j lowers the rank of row i by c_j(i), the number of rows of j up to
// i, and
//
//	Σ_(i∉j) c_j(i)·x_i = Σ_(k∈j) (x_k + x_(k+1) + … + x_n) − Σ_(k∈j) c_j(k)·x_k.
//
// It is NaN unless the mean is positive and there are two rows.
func (so *sorter) gini() (value, se float64, groups int) {
	var total, weighted float64
	for i, k := range so.keys {
		x := fromKey(k)
		total += x
		weighted += float64(float64(i+1) * x)
	}
	n := float64(len(so.keys))
	var rows, sum, ranked, drop, without [groupsJackknife]float64
	ahead := total
	for i, k := range so.keys {
		x, g := fromKey(k), so.tags[i]
		rows[g]++
		sum[g] += x
		ranked[g] += float64(float64(i+1) * x)
		drop[g] += ahead - float64(rows[g]*x)
		ahead -= x
	}
	value = giniOf(n, total, weighted)
	for g := range rows {
		without[g] = giniOf(n-rows[g], total-sum[g], weighted-ranked[g]-drop[g])
	}
	se, groups = stats.Jackknife(value, without[:], rows[:])
	return value, se, groups
}

func giniOf(n, sum, weighted float64) float64 {
	if n < 2 || !(sum > 0) {
		return math.NaN()
	}
	return (2*weighted - (n+1)*sum) / ((n - 1) * sum)
}
