// Package transfer measures what households do with money that they did not expect:
// how much of a one-off transfer they consume in the year it arrives and in each
// year after it.
//
// At age t a household with cash-on-hand m_t receives an amount x, or, where x is
// negative, has to pay a bill: m′_t = m_t + x. From there on it lives a second life
// beside its first, with the same income, the same death and the same rule, since
// nothing further is expected,
//
//	c′ = c(m′),   a′ = m′ − c′,   m′_{u+1} = R·a′_u + y_{u+1}.
//
// The response s years on is (c′_{t+s} − c_{t+s})/x, a paired difference: both
// lives meet the same luck. What is not consumed is kept, a′ − a, and, at death,
// left. The dead consume nothing, so that means over all who received say where the
// transfer went.
//
// As x goes to 0, the response of the first year becomes the marginal propensity to
// consume of the rule, c_m(m_t), and that of a later year
// c_m(m_{t+s})·Π_{u<s} R·(1 − c_m(m_{t+u})). Under a rule linear in m this holds for
// any x; with exponential utility and no limit c_m = 1/A_t, A the annuity factors,
// and the response is x/A_t in every year that the household lives to see.
//
// Every household receives the transfer at each of the given ages at which it is
// alive, each time in a life of its own. An age drawn for each household would cost
// less, but households would die before their turn, and every age would have but
// its share of households behind it; so all ages rest on everybody, and the errors
// of sums over ages come from deleting whole households.
//
// A bill that would leave no consumption that utility allows, even with all that
// may be borrowed, cannot be paid: such households are counted, and left out of
// everything else.
package transfer
