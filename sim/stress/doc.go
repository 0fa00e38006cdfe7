// Package stress brings an event that nobody foresaw over a population of all ages.
//
// Calendar years are counted from the event's year, 0. Households enter life spread
// evenly over calendar years ([Entries]), so that in every year all ages are there,
// thinned out by death. In year s of an event that began in year t₀ of a household's
// life, t = t₀ + s, those that are hit meet
//
//	y_t = (1 + level_s)/(1 + prices_s) · earnings with persistent part z_t + δ·ρ^s,
//	      or pension/(1 + prices_s),
//	R_t = (1 + return_s) · (1 + prices_{s−1})/(1 + prices_s) where prices_s > prices_{s−1},
//
// jobs are lost with another probability and against another benefit. prices_s is
// how far prices stand above what incomes follow. Prices do not fall back: where
// the gap narrows incomes have caught up. What was kept is worth less by every
// rise, unless wealth keeps its value.
//
// The shift δ of the persistent part is realised exactly: an AR(1) process moved by
// δ is δ·ρ^s higher s years on, whatever its shocks, so a household keeps its node
// and stands δ·ρ^s beside it. Its rule there is not interpolated between nodes: it is
// solved, from the last age down to t₀, on the chain with nodes z + δ·ρ^s, whose
// moves have the mean and the distribution about it that the AR(1) has from there.
// A pension follows the persistent part that it is founded on, its shift included.
//
// Households expect one of two things. Under [Usual] every year of the event
// surprises them: they follow the rule for usual times. Under [Foreseen] they learn
// in year 0 what the years of the event hold and how many there are, and follow the
// rule that is best for just these years with usual times after them: solved for
// each age at the event by one backward step a year, from the usual rule of the
// event's last year.
package stress
