// Package transit computes the flux of a star while a planet crosses it, and of a
// planet that its star hides.
//
// The star is a disc of radius 1 with a limb-darkening law (package limb), the
// planet a dark disc of radius r, the radius ratio, whose centre is at the
// separation z, in stellar radii (package orbit). The flux is relative: 1 while
// no part of the star is covered. The deficit is 1 minus the flux. A term is one
// of the functions of μ that the laws are sums of.
//
// [Flux] and [FluxGradient] give the flux for any separations, [Curve] and
// [CurveGradient] for the times of a light curve, averaged over exposures and
// diluted by companions; gradients are exact derivatives in all parameters.
// [Halves] is a planet whose morning and evening limbs differ, [Spot] a spot on
// the star, and [Eclipse] the light of a planet that passes behind its star.
//
// # Accuracy
//
//	uniform, linear and quadratic laws   closed expressions, to rounding: 1e-14
//	other laws                           quadratures, 1e-9, or as asked to 1e-12
//	two limbs                            quadratures, 1e-13, or as for other laws
//	spots                                quadratures, 1e-11
//	exposures                            1e-8
//
// # Methods
//
// The light behind the planet is an integral along the planet's edge (Green's
// theorem). For the first three terms, 1, μ and μ², it has the closed form of Agol,
// Luger & Foreman-Mackey (2020, AJ 159, 123), with complete elliptic integrals by
// the method of Bulirsch (1965, Numer. Math. 7, 78; 1969, Numer. Math. 13, 305).
// The terms without square root are arranged here so that nothing cancels near a
// contact. Other terms are integrated with steps that suit the singularity at the
// star's edge, see arc.go; so are outlines that are not circles.
//
// Derivatives need no differences: that by any parameter is the integral, along
// the edge, of the intensity times the speed at which the edge moves outwards
// with it.
package transit
