// Package fit fits a transit and systematics to light curves.
//
// A [Model] is what a recipe's settings give, [Priors] a table of priors, and a
// [Posterior] what a fit says of the parameters: the maximum of the posterior,
// its covariance, what was held and what to be warned of. [White] fits the white
// light curve, [Channel] one spectroscopic channel with the orbit held at the
// white fit's values, which gives a [spectrum.Point]; [SharedCovariance] is what
// the channels' depths have in common because of that.
//
// The model is transit times trend: the light curve of a dark sphere before a
// limb-darkened star (package transit), and a linear combination of the terms of
// a [systematics.Trend]. The method is Levenberg-Marquardt with analytic
// derivatives; all coefficients, of the transit and of the trend, are fitted
// jointly, so that the covariance holds all of them. The same input gives the same
// result, bit for bit.
//
// [Channels] gives posteriors of all channels, with intervals and not only errors, for
// less than the cost of their best fits: the likelihood is compressed (package
// compress). Its draws follow from a seed.
//
// A recipe can bring a model of its own, a function of parameters that returns a
// column with a value for each integration (package vector): as a further factor
// beside the transit, in [WhiteWith] and [ChannelWith], or instead of it, in
// [Function]. Its derivatives are numeric.
package fit
