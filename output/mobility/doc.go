// Package mobility describes how households move between quantiles of wealth over
// their lives.
//
// Among the households alive at two ages, let i be the quantile class of a
// household's assets at the first and j at the second, of k classes. Limits are
// those of type 7 of Hyndman and Fan (1996) among the same households, and equal
// assets are in one class, the lower. The mobility matrix holds
//
//	P_ij = share of those in class i at the first age who are in class j at the second,
//
// and the index of Shorrocks (1978, Econometrica 46, 1013–1024, eq. 4) sums it up,
//
//	M = (k − trace P)/(k − 1),
//
// 0 where nobody moves, 1 where the second class does not depend on the first.
//
// Limits are exact whatever the number of households: package distribution finds
// them in memory or in several passes over the same rows; then households are
// counted between them, in another pass where they are too many to hold.
//
// Errors come from the delete-a-group jackknife over households, and every
// replication has its own limits: were they kept, errors would come out too large,
// by √2 for two classes without dependence, as they would count the luck of how
// many households lie below a limit. Without a group, the limit of rank a/k has to
// let pass as many households as bring the number below it to a/k again; their
// classes at the other age are taken to be distributed as those of the households
// within a quarter of a class of the limit. (Households that are counted anew
// between the limits of every replication would add the noise of the few that
// change class: with 2,000 of them a fifth to the error.)
package mobility
