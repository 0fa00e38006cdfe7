// Package distribution describes the distribution of many variables over many
// rows, exactly, in bounded memory: means, quantiles, inequality, tails, and the
// error of each.
//
// A row belongs to a cell (an age and a group, say) and to a unit (a household);
// it has a value of every variable and perhaps a weight. A Target is a set of cells
// described as one, each cell with a weight of its own: a population of all ages
// weighs the ages by how many were born. With w the product of a row's weight and
// its cell's, everything refers to the distribution function
//
//	F(x) = Σ w·1{x_i ≤ x} / Σ w.
//
// Weights are sampling weights: only their ratios matter, and the errors below
// measure what they cost.
//
// Quantiles. Without weights a quantile is of type 7 of Hyndman and Fan (1996);
// with weights it is the least x with F(x) ≥ p. Its interval lies between order
// statistics (Hahn and Meeker 1991) of n/deff rows, the ranks stretched to n,
// where deff ≥ 1 is by how much the weights, and the likeness of a unit's rows,
// inflate the variance of F at the quantile (Woodruff 1952, Journal of the American
// Statistical Association 47, 635–646).
//
// Partial sums. With x_p the least x with F(x) ≥ p, N = Σ w and
// D_p = Σ w·max(0, x_p − x),
//
//	Lorenz ordinate     L(p) = (p·N·x_p − D_p) / Σ w·x,
//	share of the top p  1 − L(1−p),
//	S80/S20             (1 − L(0.8)) / L(0.2),
//	expected shortfall  ES(p) = x_p − D_p/(p·N),
//
// the last the mean of the lowest share p (Acerbi and Tasche 2002, Journal of
// Banking & Finance 26, 1487–1503). Hill's (1975, Annals of Statistics 3, 1163–1174)
// index of the upper tail of share p is
// 1/α = Σ w·max(0, log x − log u) / Σ w·1{x > u}; u is the value above which k = p·n
// rows lie, rounded, without weights, and x_(1−p) with weights.
//
// Errors. All but quantiles have delete-a-group jackknife errors, the rows of a
// unit in one of 64 groups. p·x_p − E max(0, x_p − x) is stationary in x_p
// (Rockafellar and Uryasev 2000, Journal of Risk 2, 21–41), so the replications
// keep the threshold of the full sample: what that leaves out is of second order.
// The tail index is not stationary in its threshold: there each replication moves
// it, by its share of rows above less the full sample's over the density of log x
// between two quantiles beside it. Means within classes of another variable are
// conditional on the limits of the classes.
//
// Exactness. Values that fit the memory budget are held and sorted. Otherwise the
// same rows are asked for again, twice as a rule: a first pass counts values by
// sign, exponent and six bits of the mantissa; each later pass looks only into the
// bins that hold a wanted order statistic, and counts their rows by further bits or
// collects them (radix selection). The pass that collects the last of them also
// forms the partial sums of all rows but those as near to a threshold as the ones
// collected, which wait until it is known. Values that many rows share are counted
// by themselves, so that they hold up nothing.
//
// All counting, and the partial sums too, is in whole numbers; sums of floats for
// means and deviations are formed within a block of rows and folded in the order of
// blocks: the result has the same bits for any number of workers, and, Gini
// coefficients and design effects aside, for any number of passes. A partial sum is
// exact to 2^−62 of the largest value for every row.
//
// Settled and not to change: the types of this page, what a weight means, the
// definitions above. Internal: how many passes are made.
package distribution
