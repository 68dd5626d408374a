// Package chain holds samples of a posterior and says how far they can be
// trusted.
//
// Draws are what Markov chains give: every draw counts the same, but a draw is
// like the one before it. Weighted draws are what importance and nested sampling
// give: they are independent, or nearly so, but count differently. Both are
// summarised by the same table of intervals ([Summary]).
//
// Two questions are asked of chains. Have they met, or does each still tell of
// its own start? R-hat compares the scatter between chains with that within
// ([RHat]). And how many independent draws are they worth? That is the effective
// sample size, of the bulk and of the tails ([BulkESS], [TailESS]), from which
// the Monte-Carlo errors of a mean or an interval's end follow ([MeanError],
// [QuantileError]). Of weights one asks whether their variance is finite: the
// Pareto k-hat says so ([ParetoSmooth]).
//
// [Checks] and [ImportanceChecks] hold these numbers against the limits of the
// papers: R-hat at most 1.01 and effective sample sizes of at least 400 (Vehtari,
// Gelman, Simpson, Carpenter & Bürkner 2021), no divergences, an energy fraction
// of at least 0.3 (Betancourt 2016; the limit is common practice, no source),
// and k-hat at most 0.7, less for fewer than 2154 draws (Vehtari, Simpson,
// Gelman, Yao & Gabry 2024).
//
// The functions that take a column, x, want the draws of one quantity chain
// after chain: x[c*n+i] is draw i of chain c, of chains of n draws.
package chain
