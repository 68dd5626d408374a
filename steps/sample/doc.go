// Package sample draws from posteriors.
//
// A target is a Go function: the natural logarithm of a density of some
// [Parameter]s, up to a constant. Three samplers are for three kinds of target.
// [NUTS] needs the gradient and repays it: its cost per independent draw hardly
// grows with the number of parameters. [Ensemble] needs only the density, for
// models of a handful of parameters. [Nested] takes prior and likelihood apart and
// gives the evidence, and finds several modes. Where a posterior is nearly normal,
// independent draws from a [StudentT] distribution with weights are cheapest
// ([Importance]).
//
// Draws come with what is needed to judge them; see package chain, and
// [EvidenceChecks].
//
// # Targets
//
// A target gets a slice which is its own until it returns. It must depend on
// nothing but this, and what stands fixed around it. -Inf is a density of zero.
// NaN and +Inf are taken for it too, but counted after the warm-up, which fails a
// check: a target says itself where it has no density. Within limits, it is never called with
// parameters beyond them.
//
// # Random numbers
//
// All of them follow from the seed, and chain c of a call has the random numbers
// of stream Stream + c of that seed (PCG, O'Neill 2014). So a call for four chains
// gives what four calls for one chain give, on as many cores, one after another in
// [chain.Join]. Nothing here starts a goroutine.
package sample
