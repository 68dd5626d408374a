package transit

import (
	"errors"
	"fmt"
	"math"

	"rimlight/steps/limb"
)

// largestCoefficient bounds the limb-darkening coefficients of [Quadratic] so
// that their sums and quotients stay finite.
const largestCoefficient = 1e100

// A Gradient is a relative flux and its derivatives, one value for each
// separation.
type Gradient struct {
	Flux          []float64
	ByRadius      []float64   // derivative by the radius ratio
	BySeparation  []float64   // derivative by the separation
	ByCoefficient [][]float64 // derivatives by the law's coefficients, a slice for each
}

// Flux returns the relative flux of a star with a limb-darkening law behind a
// planet of radius ratio r ≥ 0 at each separation z ≥ 0. It is exactly 1 for
// z ≥ 1+r and 0 for z ≤ r-1. For uniform, linear and quadratic laws the absolute
// error is that of [Quadratic]. For the others it is below the tolerance, which
// is [DefaultTolerance] if 0 is given and [LeastTolerance] or more, for physical
// laws (limb.Law.Physical) and exponents of the power-2 law up to 20; it grows in
// proportion to r beyond r = 10.
//
// It returns an error for a law that is not valid, a radius ratio that is
// negative or not finite, a separation that is negative or NaN, and a tolerance
// out of range.
func Flux(radiusRatio float64, separations []float64, law limb.Law, tolerance float64) ([]float64, error) {
	g, err := FluxGradient(radiusRatio, separations, law, tolerance)
	return g.Flux, err
}

// FluxGradient returns the flux of [Flux] and its derivatives, which have errors
// below 1e-10, relative to 1 or to their own size if that is larger. They are
// continuous, but for that by r and z at r = 1, z = 0,
// where 0 is returned, and 0 with respect to z at z = 0.
func FluxGradient(radiusRatio float64, separations []float64, law limb.Law, tolerance float64) (Gradient, error) {
	var g Gradient
	if err := FluxGradientInto(&g, radiusRatio, separations, law, tolerance); err != nil {
		return Gradient{}, err
	}
	return g, nil
}

// FluxGradientInto is [FluxGradient] with the result in *out, whose slices are
// used again as far as they are long enough.
func FluxGradientInto(out *Gradient, radiusRatio float64, separations []float64, law limb.Law, tolerance float64) error {
	if out == nil {
		return errors.New("transit: no Gradient to put the result into")
	}
	p, err := newProfile(law, tolerance)
	if err != nil {
		return err
	}
	if !(radiusRatio >= 0) || math.IsInf(radiusRatio, 1) {
		return fmt.Errorf("transit: radius ratio is %g, must be finite and not negative", radiusRatio)
	}
	for i, z := range separations {
		if !(z >= 0) {
			return fmt.Errorf("transit: separations[%d] is %g, must be 0 or more", i, z)
		}
	}
	out.resize(len(separations), p.count)
	p.fill(out, radiusRatio, separations)
	return nil
}

// resize makes room for n separations and a number of coefficients.
func (g *Gradient) resize(n, coefficients int) {
	for _, s := range []*[]float64{&g.Flux, &g.ByRadius, &g.BySeparation} {
		*s = grown(*s, n)
	}
	for len(g.ByCoefficient) < coefficients {
		g.ByCoefficient = append(g.ByCoefficient, nil)
	}
	g.ByCoefficient = g.ByCoefficient[:coefficients]
	for k := range g.ByCoefficient {
		g.ByCoefficient[k] = grown(g.ByCoefficient[k], n)
	}
}

// grown returns s with length n, a new slice if it has not the room.
func grown(s []float64, n int) []float64 {
	if cap(s) >= n {
		return s[:n]
	}
	return make([]float64, n)
}

// fill computes the flux and its derivatives at valid separations.
func (p *profile) fill(out *Gradient, r float64, separations []float64) {
	var b block
	var z [lanes]float64
	var at [lanes]int
	n := 0
	flush := func() {
		b.cover(p, r, z[:n])
		for k, i := range at[:n] {
			d := &b.covered[k]
			deficit := p.weigh(&d.value)
			out.Flux[i] = 1 - deficit
			out.ByRadius[i], out.BySeparation[i] = -p.weigh(&d.byR), -p.weigh(&d.byZ)
			for c, by := range out.ByCoefficient {
				by[i] = -p.byCoefficient(c, &d.value, deficit)
			}
		}
		n = 0
	}
	for i, separation := range separations {
		if separation-r >= 1 {
			out.Flux[i], out.ByRadius[i], out.BySeparation[i] = 1, 0, 0
			for _, by := range out.ByCoefficient {
				by[i] = 0
			}
			continue
		}
		z[n], at[n] = separation, i
		if n++; n == lanes {
			flush()
		}
	}
	flush()
}

// Quadratic returns the relative flux of a star with limb-darkening
// coefficients u1 and u2 of the quadratic law behind a planet of radius ratio r
// at separation z. It is exactly 1 for z ≥ 1+r and 0 for z ≤ r-1. The absolute
// error is below 1e-14 for r ≤ 10 and a physical law, and grows in proportion to
// r beyond.
//
// The result is NaN if r or z is negative or NaN, or r is infinite. It is 1 for
// coefficients with which the star has no light to lose: 1 - u1/3 - u2/6 = 0,
// or coefficients above 1e100. [FluxGradient] is faster for many separations.
func Quadratic(r, z, u1, u2 float64) float64 {
	flux, _, _, _, _ := QuadraticGradient(r, z, u1, u2)
	return flux
}

// QuadraticGradient returns the flux of [Quadratic] and its derivatives with
// respect to r, z, u1 and u2. The derivatives with respect to r and z are
// continuous, except at r = 1, z = 0, where 0 is returned; they are 0 with
// respect to z at z = 0. Where the flux is NaN, so are the derivatives.
func QuadraticGradient(r, z, u1, u2 float64) (flux, dr, dz, du1, du2 float64) {
	if z-r >= 1 && r >= 0 {
		return 1, 0, 0, 0, 0
	}
	if !(r >= 0 && z >= 0) || math.IsInf(r, 1) {
		nan := math.NaN()
		return nan, nan, nan, nan, nan
	}
	mean := 1 + u1*(-1./3) + u2*(-1./6)
	if !(mean != 0 && math.Abs(u1) <= largestCoefficient && math.Abs(u2) <= largestCoefficient) {
		return 1, 0, 0, 0, 0
	}
	p := profile{
		weights: [terms]float64{1 - u1 - u2, u1 + 2*u2, -u2},
		slopes:  [limb.Most][terms]float64{{-1, 1}, {-1, 2, -1}},
		inverse: 1 / mean,
		norm:    [limb.Most]float64{-1. / 3, -1. / 6},
	}
	var d deficits
	d.cover(&p, r, z, nil)
	deficit := p.weigh(&d.value)
	return 1 - deficit, -p.weigh(&d.byR), -p.weigh(&d.byZ), -p.byCoefficient(0, &d.value, deficit), -p.byCoefficient(1, &d.value, deficit)
}
