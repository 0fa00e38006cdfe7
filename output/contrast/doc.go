// Package contrast describes a population that lives through the same calendar
// years twice, as usual and under an event, with the same luck: the distribution of
// wealth and consumption, who runs dry, by how much consumption falls short and how
// long it takes to recover, each with its Monte Carlo error.
//
// Pairs. Every household is its own control. A difference of means or shares is the
// mean of differences, with a delete-a-group jackknife error over households (id
// mod 64). A difference of percentiles has the error of its linearisation (Bahadur
// 1966, Annals of Mathematical Statistics 37, 577–580): a percentile misses by the
// mean of (p − 1{x ≤ Q})/f(Q), so that
//
//	Var(Q_event − Q_usual) = s_e² + s_u² − 2·κ·s_e·s_u,
//
// s the errors of the two, which their order-statistic intervals give, and κ the
// correlation of being at or below the one percentile with being at or below the
// other, counted among the same households.
//
// Runway. A household's runway is its assets at the end of the year over a twelfth
// of the year's consumption, in months; who consumes nothing or less has none.
//
// Running dry. A household is dry in a year if what it could still spend, its
// assets less the lowest that its borrowing limit allows (without limit: its
// assets), is less than a stated number of months of its consumption. It is newly
// dry if it is dry under the event and would not be so as usual.
//
// Shortfall. By how much consumption falls below what it usually is, 0 where it does
// not; the expected shortfall is its mean among the worst q per cent (Acerbi and
// Tasche 2002, Journal of Banking & Finance 26, 1487–1503).
//
// Recovery. A figure is back in the first year from which on to the last year it
// stays within x per cent of what it usually is; its interval runs from the year in
// which it is back by the favourable end of the 95 % interval of every year's
// difference to the one by the unfavourable end. A household's assets are outside
// while they differ from the usual ones by more than x per cent of the larger of
// these and a year's usual consumption, its consumption while it differs by more
// than x per cent. The time from the event's year to the first year from which on a
// household stays inside is censored by death and by the end of the window while it
// is outside: shares and medians are those of Kaplan and Meier (1958, Journal of the
// American Statistical Association 53, 457–481) among the households of the event's
// year that were outside at all.
package contrast
