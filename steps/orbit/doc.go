// Package orbit places a planet in front of its star.
//
// An [Orbit] is a Keplerian orbit seen from afar. Its separation is the
// distance between the centres of planet and star on the sky, in units of the
// star's radius; the contacts are the instants at which the edges of the two
// discs touch. A [Track] is an orbit prepared for evaluation at many times.
//
// The conventions: the observer looks along the z axis, and a planet at the
// true anomaly f and the distance d from the star is at
//
//	X = -d cos(w+f),  Y = -d sin(w+f) cos i,  Z = d sin(w+f) sin i,
//
// in front of the star when Z > 0. w is the argument of periastron of the
// star's orbit about the common centre of mass, as radial velocities give it, i
// the inclination. The mid-transit time is that of inferior conjunction,
// f = 90 deg - w; on an eccentric and inclined orbit the separation is smallest
// a little before or after it. Light travel time is left out.
package orbit
