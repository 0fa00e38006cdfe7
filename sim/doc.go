// Package sim draws household panels from solved rules.
//
// A household enters year t with last year's assets, receives income, has
// cash-on-hand m_t = R·a_{t−1} + y_t, consumes what its type's rule says and keeps
// a_t = m_t − c_t; it dies at the end of the year with probability 1 − s_t. Its
// certain twin lives through the same years with the same start and death, but
// with every income at its mean.
//
// Randomness: every household has a stream of its own, the PCG generator (O'Neill
// 2014, XSL RR 128/64) with a state hashed from the population's seed and the
// household's id. At birth it draws [BirthDraws] numbers and every year
// [YearDraws], whether the features they serve are on or not, so that a
// household's luck depends on nothing but seed and id: not on the number of
// workers, not on which other households are simulated, and not on the scenario,
// so that two scenarios with one seed meet the same luck. Normal shocks are the
// inverse distribution function at a uniform number, to about 5e-11.
//
// Households are simulated in blocks of [Unit], within a block type by type and
// age by age, since a year's rule then stays in the processor's cache.
package sim
