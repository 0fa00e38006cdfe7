// Package income turns the risk in a household's earnings into what a solver can
// reckon with: a Markov chain for the persistent part, quadrature nodes for the
// transitory part, job loss, and survival by age.
//
// While working, earnings at age t are, in form log and in form level,
//
//	Y_t = P_t · exp(z_t − κ_t) · exp(ε_t − σ_ε²/2),      Y_t = P_t + z_t + ε_t,
//
// with P_t the age profile, ε_t ~ N(0, σ_ε²) independent over time, and z_t the
// persistent part, z_{t+1} = ρ·z_t + η_{t+1}, η ~ N(0, σ_η²), on the nodes of a
// chain. κ_t = ln Σ_j π_t(j)·exp(z_j), π_t the chain's distribution at age t, makes
// mean earnings equal the profile at every age whatever the risk. Where the
// profile states the median, κ_t and σ_ε²/2 are left out. With probability p a
// year's earnings are lost: the household has a benefit instead, b·P_t·exp(z_t−κ_t)
// in form log and b·P_t in form level, without transitory shock.
//
// [Rouwenhorst] keeps the process's conditional mean and variance, its variance
// and autocorrelation exactly for any persistence; [Tauchen] is the classic that
// older results were computed with. [Chain.Moments] and [Remarks] say how far a
// chain is from its process.
//
// What the user gets wrong is reported all at once, as *[FieldError] values that
// [Faults] takes apart.
//
// Accuracy: chain rows sum to 1 within 1e-12 and far cells keep their digits.
// Rouwenhorst's moments are exact to rounding up to persistence 0.999 and beyond.
// Nine Tauchen nodes over three deviations overstate the standard deviation by
// 10 % at ρ = 0.90 and 28 % at ρ = 0.99. Seven trapezoid nodes hold the transitory
// standard deviation within 0.1 %; five lose 7 % of it, two quadruple it.
//
// Units: z and ε are log points in form log and money in form level; money is in
// the scenario's currency unit a year. Shapes: chains are row-major, row = this
// year, column = next year; tables by age are [t][node], t counted from the first
// age.
package income
