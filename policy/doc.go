// Package policy states a household's problem over its life and solves it.
//
// In year t a household holds cash-on-hand m_t = R·a_{t−1} + y_t, consumes c_t and
// keeps a_t = m_t − c_t ≥ −b_t. It lives to the next year with probability s_t and
// maximises the expected sum of β^t·u(c_t) over the years it lives, plus
// β·(1−s_t)·v(R·a_t) where it cares for its estate. Away from the limit
//
//	u′(c_t) = β·R·[ s_t·E u′(c_{t+1}) + (1−s_t)·v′(R·a_t) ].
//
// [Solve] finds the rule c_t(z, m), z the persistent part of income, by the
// endogenous-grid method (Carroll 2006, Economics Letters 91, 312–320) with the
// slopes of the rule from the differentiated equation and the kinks of later
// limits as nodes. [Rule] evaluates it, [Judge] measures how far it misses the
// equation, and the closed forms (CertainCRRA and its like) give the exact
// answer where there is one.
//
// Under [Laws] net income is what taxes leave of gross earnings Y, and an entitlement
// e accrues that the pension depends on,
//
//	y_t = y(t, e_{t−1}, Y_t),   e_t = f(t, e_{t−1}, Y_t)   while working,
//	y_t = p(t, e_c)                                        from the claim age on, c the last working year.
//
// The rule is then c_t(z, e_t, m), this year's credit included, kept at nodes of e
// for which [EntitlementGrid] says where they lie and how it is read between them.
//
// Units: money is real, in the scenario's currency unit; rates are per year as
// fractions. R = 1 + r is that of the year ahead where it differs from year to
// year. Index t counts years from the first age. Shapes are [t][node], node the
// persistent node; with an entitlement [t][node·K+k], k one of its K nodes.
//
// Accuracy: with cubic interpolation errors between nodes fall with the fourth
// power of their distance; with linear, with the second. More nodes alone are the
// dearest way to accuracy: kink nodes and exact slopes buy three decimal digits
// for a third more work.
package policy
