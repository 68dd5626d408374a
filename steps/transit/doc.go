// Package transit computes the flux of a star while a planet crosses it.
//
// The star is a disc of radius 1 with quadratic limb darkening (package limb),
// the planet a dark disc of radius r, the radius ratio, whose centre is at the
// separation z, in stellar radii (package orbit). The flux is relative: 1 while
// no part of the star is covered. The deficit is 1 minus the flux.
//
// [Quadratic] gives the flux for one separation, [Curve] for the times of a
// light curve, averaged over exposures; [QuadraticGradient] and [CurveGradient]
// add exact derivatives.
//
// The integrals over the disc are those of Agol, Luger & Foreman-Mackey (2020,
// AJ 159, 123), with complete elliptic integrals by the method of Bulirsch
// (1965, Numer. Math. 7, 78; 1969, Numer. Math. 13, 305). The terms without
// square root are arranged here so that nothing cancels near a contact.
package transit
