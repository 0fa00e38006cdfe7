// Package calibration infers what cannot be observed from what can: the simulated
// method of moments (McFadden 1989, Econometrica 57, 995–1026; Pakes and Pollard
// 1989, Econometrica 57, 1027–1057; Duffie and Singleton 1993, Econometrica 61,
// 929–952).
//
// Let d be m moments of data with covariance matrix Ω, and μ(θ) the same moments
// of a simulated panel at k parameters θ. The gap is g(θ) = d − μ(θ). With a
// positive definite weighting matrix W the estimate minimises
//
//	Q(θ) = g(θ)′ W g(θ).
//
// Let G = ∂μ/∂θ′ at the estimate [m × k], and S the number of simulated panels of
// the size of the data, so that simulation adds 1/S of the data's variance:
//
//	Λ      = (G′WG)⁻¹ G′W                                      [k × m]
//	Var θ̂  = (1 + 1/S) Λ Ω Λ′,
//	M      = I − GΛ,  Var g(θ̂) = (1 + 1/S) M Ω M′,
//	J      = g′ (Var g)⁺ g ~ χ²(m − k),
//
// with ⁺ the generalised inverse of rank m − k; with W = Ω⁻¹ this is Hansen's
// (1982, Econometrica 50) J = g′Ω⁻¹g/(1 + 1/S), and with any other W the form of
// Newey (1985, Journal of Econometrics 29). Λ is also the sensitivity of the
// estimates to the moments of Andrews, Gentzkow and Shapiro (2017, Quarterly
// Journal of Economics 132, 1553–1592): dθ̂ = Λ·dd.
package calibration
