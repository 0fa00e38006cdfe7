// Package decomposition takes mean wealth apart into what is held because income is
// risky, because life is of uncertain length, and because borrowing is limited.
//
// One cause after the other is removed, in a stated order, from the problem that
// households solve, and the same households live again on the same luck:
//
//   - income risk: every income comes at its mean of that age and group (the certain
//     twin, policy.Household.Twin);
//   - longevity risk: a household knows from the start at what age it will die, and
//     it is the age at which it dies. Everybody lives as long as before, so that ages
//     are compared among the same households; that differs from a population in which
//     all live to their life expectancy, where nobody would be left to compare at
//     high ages. Nor does anybody insure: who knows to die late saves more, who knows
//     to die early less, and the part can be negative. What is left at a known death is
//     left on purpose. The problem is solved for every length of life, and those who
//     live that long live by it;
//   - the borrowing limit: debt is limited only by what can be repaid for certain
//     (natural limit), or, where utility allows any consumption, not at all.
//
// With A_0 mean assets with all causes and A_k after the k-th is removed, the part
// of cause k is A_{k−1} − A_k; the parts and A_n sum to A_0. A part depends on its
// place in the order, since causes work on each other: a household without income
// risk needs no buffer for the years in which it cannot borrow. All are paired
// differences, from the same households in the same years.
//
// The equivalent premium of income risk, a share of consumption, stands beside: see
// policy.EquivalentPremium.
package decomposition
