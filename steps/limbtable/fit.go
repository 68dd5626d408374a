package limbtable

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/interp"
	"gonum.org/v1/gonum/mat"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
)

// Places of a [Choice] at which law and profile are compared, and weights.
const (
	GridTable  = "table"  // at the mu of the profile
	GridMu     = "mu"     // at equal steps in mu
	GridRadius = "radius" // at equal steps in the distance from the centre of the disc, √(1-mu²)

	WeightEqual = "equal" // each place the same
	WeightArea  = "area"  // by the area of the disc around it
)

const (
	defaultPoints = 100
	mostPoints    = 10000
	// exponents of the power-2 law that are searched.
	leastExponent, mostExponent = 0.01, 50
	// exponentSteps divide their range, in the logarithm, in the search for the
	// best.
	exponentSteps = 200
)

// A Choice says how a law is fitted to a profile. Published coefficients of one
// and the same model differ by these choices more than by their errors.
type Choice struct {
	Law    string  // see package limb; "quadratic" when empty
	Grid   string  // [GridTable] (also when empty), [GridMu] or [GridRadius]; the last two interpolate in the profile
	Points int     // of the last two grids, 2 to 10000; 0 means 100
	Edge   float64 // distance from the centre, in radii of the table's disc, that counts as the edge of the star; above 0, 0 means 1; see [SteepestEdge]
	MuCut  float64 // places with a mu, counted from that edge, below are left out; from 0, below 1
	Weight string  // [WeightEqual] (also when empty) or [WeightArea]
}

// Fitted is a law fitted to a profile, and how well it fits.
type Fitted struct {
	Law       limb.Law
	Physical  bool      // whether the law is, see [limb.Law.Physical]
	RMS       float64   // weighted root mean square of law minus profile, in units of the central intensity
	Largest   float64   // law minus profile where its size is largest
	LargestMu float64   // where that is
	Mean      float64   // mean of law minus profile over the area of the disc that the places stand for
	Mu        []float64 // the places, increasing, counted from the edge of the choice
	Intensity []float64 // of the profile there
	Model     []float64 // of the law there
}

// check fills in defaults and reports choices out of their range.
func (c *Choice) check() error {
	for _, field := range []struct {
		name  string
		value *string
		known []string
	}{
		{"Law", &c.Law, append([]string{limb.Quadratic}, limb.Names()...)},
		{"Grid", &c.Grid, []string{GridTable, GridMu, GridRadius}},
		{"Weight", &c.Weight, []string{WeightEqual, WeightArea}},
	} {
		if *field.value == "" {
			*field.value = field.known[0]
		}
		if field.name != "Law" && !slices.Contains(field.known, *field.value) {
			return fmt.Errorf("choice: %s is %.40q, expected one of %q", field.name, *field.value, field.known)
		}
	}
	if _, err := limb.Count(c.Law); err != nil {
		return err
	}
	if c.Points == 0 {
		c.Points = defaultPoints
	}
	if c.Points < 2 || c.Points > mostPoints {
		return fmt.Errorf("choice: Points is %d, expected 2 to %d", c.Points, mostPoints)
	}
	if c.Edge == 0 {
		c.Edge = 1
	}
	if !(c.Edge > 0 && c.Edge <= 1) {
		return fmt.Errorf("choice: Edge is %g, expected a number above 0, up to 1", c.Edge)
	}
	if !(c.MuCut >= 0 && c.MuCut < 1) {
		return fmt.Errorf("choice: MuCut is %g, expected a number from 0, below 1", c.MuCut)
	}
	return nil
}

// FitLaw fits a law to a profile by least squares of the intensities, with the
// centre of the disc held at 1, at the places and with the weights of the choice.
// Interpolation in the profile is by a monotonic cubic (Fritsch & Butland 1984,
// SIAM J. Sci. Stat. Comput. 5, 300). There is no extrapolation: places are at mu
// from the smallest of the profile up.
//
// It is an error when the choice or the profile are not as their types say, when
// fewer places are left than the law has coefficients, when these cannot be told
// apart, when the best exponent of the power-2 law is not within 0.01 to 50, or
// when the fitted law is not valid.
func FitLaw(p Profile, c Choice) (Fitted, error) {
	fitted, err := fitLaw(p, c)
	if err != nil {
		return Fitted{}, fmt.Errorf("fit of a limb-darkening law: %w", err)
	}
	return fitted, nil
}

func fitLaw(p Profile, c Choice) (Fitted, error) {
	if err := c.check(); err != nil {
		return Fitted{}, err
	}
	if err := p.check(); err != nil {
		return Fitted{}, err
	}
	if c.Edge < 1 {
		p = p.within(c.Edge)
		if len(p.Mu) < 2 {
			return Fitted{}, fmt.Errorf("the profile has no place off the centre within an edge at %g", c.Edge)
		}
	}
	f := Fitted{}
	if err := f.place(p, c); err != nil {
		return Fitted{}, err
	}
	area := areas(f.Mu)
	weights := area
	if c.Weight == WeightEqual {
		weights = slices.Repeat([]float64{1}, len(f.Mu))
	}
	coefficients, err := solve(c.Law, f.Mu, f.Intensity, weights)
	if err != nil {
		return Fitted{}, err
	}
	if f.Law, err = limb.New(c.Law, coefficients); err != nil {
		return Fitted{}, err
	}
	f.Physical = f.Law.Physical()
	var sum, squares, whole, mean float64
	for i, mu := range f.Mu {
		model := f.Law.Intensity(mu)
		d := model - f.Intensity[i]
		f.Model = append(f.Model, model)
		sum += weights[i]
		squares += weights[i] * d * d
		whole += area[i]
		mean += area[i] * d
		if math.Abs(d) > math.Abs(f.Largest) {
			f.Largest, f.LargestMu = d, mu
		}
	}
	f.RMS, f.Mean = math.Sqrt(squares/sum), mean/whole
	return f, nil
}

// place chooses where law and profile are compared.
func (f *Fitted) place(p Profile, c Choice) error {
	start := max(p.Mu[0], c.MuCut)
	switch c.Grid {
	case GridTable:
		for i, mu := range p.Mu {
			if mu >= c.MuCut {
				f.Mu, f.Intensity = append(f.Mu, mu), append(f.Intensity, p.Intensity[i])
			}
		}
	case GridMu:
		for i := range c.Points {
			f.Mu = append(f.Mu, start+(1-start)*float64(i)/float64(c.Points-1))
		}
	case GridRadius:
		edge := math.Sqrt((1 - start) * (1 + start))
		for i := c.Points - 1; i >= 0; i-- {
			r := edge * float64(i) / float64(c.Points-1)
			f.Mu = append(f.Mu, min(1, max(start, math.Sqrt((1-r)*(1+r)))))
		}
	}
	if c.Grid == GridTable {
		return nil
	}
	var cubic interp.FritschButland
	if err := cubic.Fit(p.Mu, p.Intensity); err != nil {
		return fmt.Errorf("the profile cannot be interpolated: %w", err)
	}
	for _, mu := range f.Mu {
		f.Intensity = append(f.Intensity, cubic.Predict(mu))
	}
	return nil
}

// areas returns the area of the disc, over that of the whole, that is nearer to
// each mu than to the others, in the square of the radius.
func areas(mu []float64) []float64 {
	all := make([]float64, len(mu))
	for i := 1; i < len(mu); i++ {
		half := (mu[i] - mu[i-1]) * (mu[i] + mu[i-1]) / 2
		all[i-1] += half
		all[i] += half
	}
	return all
}

// solve returns the coefficients of the law that fit best.
func solve(law string, mu, intensity, weights []float64) ([]float64, error) {
	count, err := limb.Count(law)
	if err != nil {
		return nil, err
	}
	places := 0
	for i, m := range mu {
		if m < 1 && weights[i] > 0 {
			places++
		}
	}
	if places < max(count, 1) {
		return nil, fmt.Errorf("%d places off the centre of the disc are left, expected at least %d for the %s law", places, max(count, 1), law)
	}
	switch law {
	case limb.Uniform:
		return nil, nil
	case limb.Power2:
		return solvePower(mu, intensity, weights)
	}
	a, b := mat.NewDense(len(mu), count, nil), mat.NewVecDense(len(mu), nil)
	zero := limb.Law{Name: law, Coefficients: make([]float64, count)}
	for i, m := range mu {
		w := math.Sqrt(weights[i])
		_, grad := zero.Gradient(m)
		for k := range count {
			a.Set(i, k, -w*grad[k])
		}
		b.SetVec(i, w*(1-intensity[i]))
	}
	var qr mat.QR
	qr.Factorize(a)
	if cond := qr.Cond(); !(cond < 1e12) {
		return nil, fmt.Errorf("the coefficients of the %s law cannot be told apart at these %d places", law, places)
	}
	u := mat.NewVecDense(count, nil)
	if err := qr.SolveVecTo(u, false, b); err != nil {
		return nil, fmt.Errorf("the %s law: %w", law, err)
	}
	return u.RawVector().Data, nil
}

// solvePower is solve for the power-2 law: for each exponent the other coefficient
// is known; the best exponent is looked for on a grid and then by the method of
// Gauss and Newton.
func solvePower(mu, intensity, weights []float64) ([]float64, error) {
	best := func(alpha float64) (c, sum float64) {
		l := limb.Law{Name: limb.Power2, Coefficients: []float64{1, alpha}}
		var product, square float64
		for i, m := range mu {
			t := 1 - l.Intensity(m)
			product += weights[i] * t * (1 - intensity[i])
			square += weights[i] * t * t
		}
		c = product / square
		for i, m := range mu {
			d := 1 - intensity[i] - c*(1-l.Intensity(m))
			sum += weights[i] * d * d
		}
		return c, sum
	}
	dark := false
	for i := range mu {
		dark = dark || intensity[i] != 1 && weights[i] > 0
	}
	if !dark {
		return []float64{0, 1}, nil // whatever the exponent
	}
	at, lowest := 0, math.Inf(1)
	ratio := math.Log(mostExponent/leastExponent) / exponentSteps
	for i := range exponentSteps + 1 {
		if _, sum := best(leastExponent * math.Exp(ratio*float64(i))); sum < lowest {
			at, lowest = i, sum
		}
	}
	if at == 0 || at == exponentSteps {
		return nil, fmt.Errorf("the best exponent of the power-2 law is not within %g to %g", leastExponent, float64(mostExponent))
	}
	low, high := leastExponent*math.Exp(ratio*float64(at-1)), leastExponent*math.Exp(ratio*float64(at+1))
	const golden = 0.6180339887498949
	for high-low > 1e-7*high {
		a, b := high-golden*(high-low), low+golden*(high-low)
		_, fa := best(a)
		_, fb := best(b)
		if fa < fb {
			high = b
		} else {
			low = a
		}
	}
	alpha := (low + high) / 2
	c, _ := best(alpha)
	for range 10 {
		l := limb.Law{Name: limb.Power2, Coefficients: []float64{c, alpha}}
		var cc, ca, aa, rc, ra float64
		for i, m := range mu {
			value, g := l.Gradient(m)
			d := intensity[i] - value
			cc, ca, aa = cc+weights[i]*g[0]*g[0], ca+weights[i]*g[0]*g[1], aa+weights[i]*g[1]*g[1]
			rc, ra = rc+weights[i]*g[0]*d, ra+weights[i]*g[1]*d
		}
		step := (cc*ra - ca*rc) / (cc*aa - ca*ca)
		if !(math.Abs(step) < 1e-4*alpha) { // not determined better than by the search
			break
		}
		alpha += step
		c, _ = best(alpha)
	}
	return []float64{c, alpha}, nil
}

// Coefficients fits a law in each of the channels, whose bands weigh and see the
// light as [Band] says, and returns the table of coefficients, without errors, and
// the fits. A law without coefficients has no table. Errors are those of Band and
// [FitLaw], with the channel.
func Coefficients(t Intensities, s Throughput, channels []lightcurve.Channel, weight string, c Choice) (Table, []Fitted, error) {
	fail := func(err error) (Table, []Fitted, error) { return Table{}, nil, err }
	if err := c.check(); err != nil {
		return fail(fmt.Errorf("limb-darkening coefficients: %w", err))
	}
	if c.Law == limb.Uniform {
		return fail(fmt.Errorf("limb-darkening coefficients: the uniform law has none"))
	}
	if err := t.check(); err != nil {
		return fail(fmt.Errorf("limb-darkening coefficients: %w", err))
	}
	if err := s.check(); err != nil {
		return fail(fmt.Errorf("limb-darkening coefficients: %w", err))
	}
	var lo, hi []float64
	var u, none [limb.Most][]float64
	var fits []Fitted
	for i, channel := range channels {
		p, err := band(t, s, channel.Lo, channel.Hi, weight)
		if err != nil {
			return fail(fmt.Errorf("channel %d: %w", i, err))
		}
		f, err := FitLaw(p, c)
		if err != nil {
			return fail(fmt.Errorf("channel %d: %w", i, err))
		}
		fits = append(fits, f)
		lo, hi = append(lo, channel.Lo), append(hi, channel.Hi)
		for k, v := range f.Law.Coefficients {
			u[k] = append(u[k], v)
		}
	}
	if u[1] == nil {
		u[1] = make([]float64, len(lo))
	}
	table, err := newTable(lo, hi, u, none, c.Law, func(i int) string { return fmt.Sprintf("channel %d", i) })
	if err != nil {
		return fail(fmt.Errorf("limb-darkening coefficients: %w", err))
	}
	return table, fits, nil
}
