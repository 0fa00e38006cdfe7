// Package stats describes distributions of money over households: quantiles,
// inequality, tails, and how sure each figure is.
//
// Everything works on a sample x_1 ≤ … ≤ x_n sorted ascending; slices named
// sorted must be so, and only their finite values make sense. Nothing is
// modified. A statistic that does not exist for the sample is NaN.
//
// Quantiles. The nine definitions of
//
//	R. J. Hyndman and Y. Fan, "Sample quantiles in statistical packages",
//	The American Statistician 50 (1996) 361–365.
//	doi:10.1080/00031305.1996.10473566
//
// are Q(p) = (1−g)·x_j + g·x_(j+1), with j and g from n and p; see [Type].
// [Type7] is the default of this program: Q interpolates linearly between
// the points ((k−1)/(n−1), x_k), so Q(0) and Q(1) are the extremes.
//
// Weights. A weight can mean two things and the functions say which.
// A frequency weight w stands for w equal rows: [FrequencyQuantile] gives what
// the long form of the data would give. A sampling weight is the inverse of
// the chance to be in the sample: only relative sizes matter, n is still the
// number of rows, and [WeightedQuantile] inverts the weighted distribution
// function. For means, Lorenz curves and the plug-in Gini coefficient the two
// agree; for standard errors, unbiased forms and quantile types 3–9 they
// do not.
//
// Errors. [OrderInterval] holds for any continuous distribution of independent
// rows. Rows of one household in different years are not independent:
// [Jackknife] over groups of households serves there, and for ratios,
// differences and inequality measures.
package stats
