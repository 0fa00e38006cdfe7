// Package pension holds the public rules between what a household earns and what
// it can spend: contributions, taxes, the entitlements it accrues, the pensions
// that come of them, and guarantees. All of it is pure functions; solver and
// simulation call them.
//
// [Rules] are what an analyst writes down. [Rules.For] makes them the [Law] of one
// birth cohort: every parameter looked up for the calendar year in which the
// cohort reaches an age. A Law answers, for year t counted from the first age,
//
//	e_t = g_t·e_{t−1} + k_t·min(y_t, cap_t)                 [Law.Next]
//	P_t = Σ_p unit_p(c)·F(g_c·e_p)·I_t/I_c + …               [Law.Pension], claimed in year c
//	n_t = y + P* − contributions − T(taxable)                [Law.Net]
//	n_t + assistance(n_t, assets)                            [Law.Resources]
//
// P* being P topped up to the minimum pension. Beside each value stand its slopes
// and, where it bends, its kinks. Every law is piecewise linear but for the power
// form of the tax, and continuous. Net income does not fall with
// earnings or pension, nor the next entitlement with earnings or entitlement.
//
// # Time and money
//
// Money is real, at the prices of any one year; wages grow by g_y in calendar
// year y in real terms, so average earnings are W_y = W_base·Π(1+g). A cohort born
// in year b reaches age a in calendar year b+a. Amounts in rules are stated in the
// money and at the wage level of the base year and uprated from there by an
// [Index], which changes a real amount by (1 + ω·g_y)·(1 + ρ) in year y: ω = 1 is
// uprating with wages, ω = 0 with prices. An index that mixes wages and prices with
// weight ω, (1+π)(ω(1+g)+1−ω) in nominal terms, is 1 + ω·g in real ones, whatever
// inflation π is; an amount that nobody uprates loses ρ = 1/(1+π) − 1 a year. The
// same type says how entitlements are revalued and pensions indexed.
//
// A year's contributions are credited at its end: e_t is what stands after year t.
// Between years it is revalued or earns its return, so a pension first paid in year
// c rests on g_c·e_{c−1}. Nothing accrues any more once a pension is claimed.
//
// # Units
//
// Entitlements are in units of average earnings W_t of their own year, so that one
// grid serves every cohort: in a career-average scheme the accrued yearly pension
// as a multiple of W; points, each a year at average earnings; in notional and
// funded accounts the balance as a multiple of W. All else is money a year; rates
// are fractions a year. Index t counts years from the first age; arrays by year are
// [t], arrays by claim [c] with c the year of the first pension.
//
// At most two pillars may accrue an entitlement ([MaxPillars]): each is a dimension
// of the household's problem. Final-earnings and flat pensions need none and may be
// added to them.
//
// What a user gets wrong is reported all at once, as *[FieldError] values; fields
// carry the names of the Go types, and keys of scenario files are the same words.
//
// At a kink the slope from below differs from that from above; [Side] says which is
// meant. Within rounding of a kink either may be returned.
package pension
