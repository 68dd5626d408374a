// Package fit fits a transit and systematics to light curves.
//
// A [Model] is a light-curve model as data, with the [Priors] of its parameters,
// and writes itself as an [Equation]. A [Posterior] is what a fit says of the
// parameters: the maximum of the posterior, its covariance, what was held and what
// to be warned of. [White] fits a single light curve, such as that of white light;
// [Sample] draws from its posterior. [Channel] fits one spectroscopic channel with
// all that channels share held at the white fit's values, which gives a
// [spectrum.Point]; [SharedCovariance] is what the channels' depths have in common
// because of that.
//
// The model is transit times trend, plus terms that are added: the light curve of
// a dark sphere before a limb-darkened star (package transit), and linear
// combinations of the terms of a [systematics.Trend]. The method is
// Levenberg-Marquardt with analytic derivatives. Coefficients of the trend enter
// linearly and are found by variable projection (Golub & Pereyra 1973, Kaufman
// 1975): in tests, a fifth fewer iterations than a search in all parameters, each at
// about the same cost, to minima as low. The covariance holds all of them. The same
// input gives the same result, bit for bit.
//
// [Channels] gives posteriors of all channels, with intervals and not only errors, for
// less than the cost of their best fits: the likelihood is compressed (package
// compress). Draws follow from a seed.
//
// A recipe can bring a model of its own, a function of parameters that returns a
// column with a value for each integration (package vector): as a further factor
// beside the transit, in [WhiteWith], [ChannelWith] and [SampleWith], or instead of
// it, in [Function]. Its derivatives are numeric.
package fit
