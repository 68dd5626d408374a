// Package simulate makes raw spectroscopic light curves with a known truth.
//
// A [Scenario] says how star, planet, instrument and observation are; [Make]
// gives the light-curve table that an extraction would hand on, and the
// [Truth] behind it. The transit is integrated over the stellar disc
// numerically, with an orbit of its own, and shares no code with the fitter:
// that the two agree is evidence for both.
//
// All scenarios are invented.
package simulate
