// Package limb describes how the disc of a star darkens towards its edge.
//
// Nouns. mu is the cosine of the angle between the line of sight and the normal
// of the star's surface: 1 at the centre of the disc, 0 at its edge. The
// intensity I(mu) is relative to that at the centre. A law is a formula for it
// with up to four coefficients u1 to u4, dimensionless. The flux norm is the
// mean intensity of the disc, 2 ∫ I(mu) mu dmu from 0 to 1: the flux of the star
// relative to that of a disc as bright as its centre.
//
//	name             1 - I(mu)                                     paper
//	uniform          0
//	linear           u1 (1-mu)                                     Schwarzschild 1906
//	quadratic        u1 (1-mu) + u2 (1-mu)²                        Kopal 1950
//	square-root      u1 (1-mu) + u2 (1-√mu)                        Díaz-Cordovés & Giménez 1992
//	logarithmic      u1 (1-mu) + u2 mu ln mu                       Klinglesmith & Sobieski 1970
//	power-2          u1 (1-mu^u2)                                  Hestroffer 1997
//	three-parameter  u1 (1-mu) + u2 (1-mu^3/2) + u3 (1-mu²)        Sing et al. 2009
//	four-parameter   Σ un (1-mu^(n/2)), n = 1 to 4                 Claret 2000
//
// (Papers from memory.) Sing et al. call the coefficients of their law c2, c3
// and c4; those of the power-2 law are also known as c and α. These names are
// the values that the setting limbLaw and tables of coefficients use.
//
// A law is physical when the intensity is nowhere negative and nowhere increases
// from the centre of the disc to its edge. For laws of two coefficients the
// physical ones fill a triangle, which [FromSquare] maps the unit square onto.
package limb
