package spectrum

import (
	"fmt"
	"math"
	"slices"

	"rimlight/steps/lightcurve"
)

// edgeTolerance is how far neighbouring channels may overlap, in units of the
// narrower one: edges that were rounded to single precision are no overlap.
const edgeTolerance = 1e-3

// asymmetry is the largest difference between two mirrored elements of a
// covariance matrix, in units of the geometric mean of their variances, that is
// put down to rounding.
const asymmetry = 1e-6

// MaxPoints is the largest number of points of a spectrum. Its covariance has as
// many rows and columns, which then take 128 MiB.
const MaxPoints = 4096

// noDepth is the flag of a point that came without a depth and without a reason.
const noDepth = "no depth"

// Assemble puts the points of a spectrum in order of wavelength. The covariance
// of their depths is the square of DepthErr on the diagonal plus shared, the
// covariance that the channels have in common (from the geometry they share),
// whose rows and columns are in the order of points as given. A nil shared means
// independent channels; rows and columns of points without depth are not read,
// and are NaN in the result.
//
// A point without a finite depth and a finite error above zero keeps its place
// with depth and error NaN, and is flagged "no depth" unless it says why itself.
// It is an error when there are no points or more than [MaxPoints], when a channel is not an interval,
// when two channels are equal or overlap by more than a thousandth of their width
// (such channels share photons, or belong to two spectra), and when shared is not
// a symmetric matrix of finite numbers with a diagonal of at least 0. Law and
// Policy of the result are empty: set them.
func Assemble(points []Point, shared [][]float64) (Spectrum, error) {
	if len(points) == 0 {
		return Spectrum{}, fmt.Errorf("assemble spectrum: no points; expected one for each channel")
	}
	if len(points) > MaxPoints {
		return Spectrum{}, fmt.Errorf("assemble spectrum: %d points; expected at most %d, as their covariance has the square of that", len(points), MaxPoints)
	}
	for _, p := range points {
		if c := p.Channel; !(c.Lo < c.Hi) || !finite(c.Lo) || !finite(c.Hi) {
			return Spectrum{}, fmt.Errorf("assemble spectrum: channel %d reaches from %g to %g um; expected an interval, lower edge first", c.Index, c.Lo, c.Hi)
		}
	}
	order := make([]int, len(points))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch ca, cb := points[a].Channel, points[b].Channel; {
		case ca.Lo != cb.Lo:
			return sign(ca.Lo - cb.Lo)
		default:
			return sign(ca.Hi - cb.Hi)
		}
	})
	out := Spectrum{Points: make([]Point, len(points)), Cov: make([][]float64, len(points))}
	for i, from := range order {
		out.Points[i] = settled(points[from])
		if i > 0 {
			if err := apart(out.Points[i-1].Channel, out.Points[i].Channel); err != nil {
				return Spectrum{}, err
			}
		}
	}
	if err := checkShared(points, shared); err != nil {
		return Spectrum{}, err
	}
	for i := range out.Points {
		out.Cov[i] = make([]float64, len(points))
		for j := range out.Points {
			p, q := out.Points[i], out.Points[j]
			switch {
			case !p.Good() || !q.Good():
				out.Cov[i][j] = math.NaN()
			case shared != nil:
				a, b := order[i], order[j]
				out.Cov[i][j] = (shared[a][b] + shared[b][a]) / 2
			}
			if i == j && p.Good() {
				out.Cov[i][i] += p.DepthErr * p.DepthErr
			}
		}
	}
	return out, nil
}

// settled returns p with its depth and error NaN unless both are usable.
func settled(p Point) Point {
	if p.Good() && finite(p.Depth) && finite(p.DepthErr) {
		return p
	}
	p.Depth, p.DepthErr = math.NaN(), math.NaN()
	if p.Flag == "" {
		p.Flag = noDepth
	}
	return p
}

// apart reports whether two neighbouring channels are separate ones.
func apart(a, b lightcurve.Channel) error {
	if a.Lo == b.Lo && a.Hi == b.Hi {
		return fmt.Errorf("assemble spectrum: channels %d and %d both reach from %g to %g um; give each channel once", a.Index, b.Index, a.Lo, a.Hi)
	}
	if a.Hi-b.Lo > edgeTolerance*math.Min(a.Hi-a.Lo, b.Hi-b.Lo) {
		return fmt.Errorf("assemble spectrum: channel %d (%g to %g um) overlaps channel %d (%g to %g um); assemble spectral orders one by one",
			a.Index, a.Lo, a.Hi, b.Index, b.Lo, b.Hi)
	}
	return nil
}

// checkShared reports what is wrong with a shared covariance.
func checkShared(points []Point, shared [][]float64) error {
	if shared == nil {
		return nil
	}
	if len(shared) != len(points) {
		return fmt.Errorf("assemble spectrum: the shared covariance has %d rows; expected one for each of %d points", len(shared), len(points))
	}
	for i, row := range shared {
		if len(row) != len(points) {
			return fmt.Errorf("assemble spectrum: row %d of the shared covariance has %d elements; expected one for each of %d points", i, len(row), len(points))
		}
	}
	for i := range shared {
		if !settled(points[i]).Good() {
			continue
		}
		if !(shared[i][i] >= 0) {
			return fmt.Errorf("assemble spectrum: element %d of the diagonal of the shared covariance is %g; expected a variance of at least 0", i, shared[i][i])
		}
		for j := range shared {
			if !settled(points[j]).Good() {
				continue
			}
			if !finite(shared[i][j]) {
				return fmt.Errorf("assemble spectrum: element (%d, %d) of the shared covariance is %g; expected a finite number", i, j, shared[i][j])
			}
			if math.Abs(shared[i][j]-shared[j][i]) > asymmetry*math.Sqrt(shared[i][i]*shared[j][j]) {
				return fmt.Errorf("assemble spectrum: elements (%d, %d) and (%d, %d) of the shared covariance are %g and %g; expected a symmetric matrix",
					i, j, j, i, shared[i][j], shared[j][i])
			}
		}
	}
	return nil
}

// Errors returns one standard deviation of each depth, in the order of the
// points: the root of the diagonal of the covariance, which includes what the
// channels share. Without a covariance matrix of the right size it is the
// points' own DepthErr. Points without depth have NaN.
func (s Spectrum) Errors() []float64 {
	out := make([]float64, len(s.Points))
	for i, p := range s.Points {
		out[i] = p.DepthErr
		if len(s.Cov) == len(s.Points) && len(s.Cov[i]) == len(s.Points) {
			out[i] = math.Sqrt(s.Cov[i][i])
		}
		if !p.Good() || !(out[i] > 0) {
			out[i] = math.NaN()
		}
	}
	return out
}

// ReducedChi2 returns Chi2 per degree of freedom, NaN without any.
func (p Point) ReducedChi2() float64 {
	if p.Dof <= 0 {
		return math.NaN()
	}
	return p.Chi2 / float64(p.Dof)
}

func sign(x float64) int {
	switch {
	case x < 0:
		return -1
	case x > 0:
		return 1
	}
	return 0
}

// finite reports whether x is neither NaN nor infinite.
func finite(x float64) bool { return x-x == 0 }
