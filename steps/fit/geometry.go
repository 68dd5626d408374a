package fit

import (
	"fmt"
	"math"
	"math/rand/v2"

	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

const (
	leastGeometries = 8
	mostGeometries  = 100
	// geometryStream is the second half of the seed of draws of the geometry.
	geometryStream = 0x67656f6d
	// triesOfGeometry bounds how often a draw outside of what an orbit can be is made again.
	triesOfGeometry = 1000
)

// GeometryDraws draws n posteriors of a white fit from its errors: the values of the
// parameters are from the normal distribution of its covariance, within what the priors
// and the parameters themselves allow, and exact. Coefficients of the trend, of limb
// darkening and of the noise, and what the data do not determine, stay as they are.
//
// Errors: an n that is not from 8 to 100; a posterior without a covariance, or with one
// that is none.
func GeometryDraws(white Posterior, model Model, n int, seed uint64) ([]Posterior, error) {
	const what = "draws of the geometry"
	if n < leastGeometries || n > mostGeometries {
		return nil, fmt.Errorf("%s: %d asked for; expected %d to %d", what, n, leastGeometries, mostGeometries)
	}
	if err := model.check(); err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	s := newSpace(model)
	if err := s.take(white, nil); err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	size := len(white.Names)
	if len(white.Cov) != size {
		return nil, fmt.Errorf("%s: a covariance of %d rows for %d parameters; expected the result of a white fit", what, len(white.Cov), size)
	}
	var free []int
	for g, name := range white.Names {
		if len(white.Cov[g]) != size {
			return nil, fmt.Errorf("%s: row %d of the covariance has %d elements; expected %d", what, g, len(white.Cov[g]), size)
		}
		if isTrend(name) || isLimb(name) {
			continue
		}
		p, err := findName(name)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", what, err)
		}
		if !noisy(p.slot) && white.Cov[g][g] > 0 && !math.IsInf(white.Cov[g][g], 1) {
			free = append(free, g)
		}
	}
	factor, err := factorOf(white.Cov, free)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	rng := rand.New(rand.NewPCG(seed, geometryStream))
	out := make([]Posterior, n)
	for i := range out {
		if out[i], err = drawGeometry(white, model, s, free, factor, rng); err != nil {
			return nil, fmt.Errorf("%s: %w", what, err)
		}
	}
	return out, nil
}

// factorOf is the Cholesky factor of the covariance of some parameters.
func factorOf(cov [][]float64, free []int) ([][]float64, error) {
	l := columns(len(free), len(free))
	for a := range free {
		for b := range a + 1 {
			sum := cov[free[a]][free[b]]
			for k := range b {
				sum -= l[a][k] * l[b][k]
			}
			if a != b {
				l[a][b] = sum / l[b][b]
				continue
			}
			if !(sum > -1e-9*cov[free[a]][free[a]]) {
				return nil, fmt.Errorf("the covariance of the white posterior is not positive definite")
			}
			l[a][a] = math.Sqrt(math.Max(sum, 1e-12*cov[free[a]][free[a]]))
		}
	}
	return l, nil
}

// drawGeometry makes one draw.
func drawGeometry(white Posterior, model Model, s *space, free []int, factor [][]float64, rng *rand.Rand) (Posterior, error) {
	z := make([]float64, len(free))
	for range triesOfGeometry {
		for k := range z {
			z[k] = rng.NormFloat64()
		}
		out := white
		out.Value = append([]float64(nil), white.Value...)
		out.Err = make([]float64, len(white.Err))
		out.Cov = columns(len(white.Names), len(white.Names))
		possible := true
		for a, g := range free {
			for b := range a + 1 {
				out.Value[g] += factor[a][b] * z[b]
			}
			name := white.Names[g]
			lo, hi := math.Inf(-1), math.Inf(1)
			for _, p := range model.White {
				if p.Name != name {
					continue
				}
				if row, err := p.normalise(white.Units[g]); err == nil {
					a, b := row.limits()
					lo, hi = math.Max(lo, a), math.Min(hi, b)
				}
			}
			possible = possible && out.Value[g] >= lo && out.Value[g] <= hi
		}
		if !possible {
			continue
		}
		trial := *s
		if trial.take(out, nil) != nil {
			continue
		}
		for _, g := range free {
			p, err := findName(white.Names[g])
			if err != nil {
				return Posterior{}, err
			}
			lo, hi := trial.allowed(p.slot)
			possible = possible && trial.value[p.slot] >= lo && trial.value[p.slot] <= hi
		}
		if _, err := trial.orbit(&trial.value); err == nil && possible {
			return out, nil
		}
	}
	return Posterior{}, fmt.Errorf("no draw of %d is an orbit that the priors allow", triesOfGeometry)
}

// ChannelsOverGeometry carries the white fit's errors into the channels: it samples them,
// as [Channels] does, for each of n draws of the geometry ([GeometryDraws]), and joins the
// results. Depths and errors of the points are those of all draws together, the part that
// channels share included in neither: it is the second result, a covariance for
// spectrum.Assemble in the place of [SharedCovariance], which is the same to first order
// in the errors of the orbit. Its own relative error is about √(2/n). The rest of a point
// is that for the white fit's values.
//
// The third result is the posteriors at the white fit's values. Errors: those of both.
func ChannelsOverGeometry(curves []lightcurve.Curve, white Posterior, model Model, sampling Sampling, n int) ([]spectrum.Point, [][]float64, []ChannelPosterior, error) {
	draws, err := GeometryDraws(white, model, n, sampling.Seed)
	if err != nil {
		return nil, nil, nil, err
	}
	if len(curves) > spectrum.MaxPoints {
		return nil, nil, nil, fmt.Errorf("channels: %d; expected at most %d, as their covariance has the square of that", len(curves), spectrum.MaxPoints)
	}
	points, posteriors, err := Channels(curves, white, model, sampling)
	if err != nil {
		return nil, nil, nil, err
	}
	m := len(curves)
	depth, variance := columns(n, m), make([]float64, m)
	quick := sampling
	quick.Effective, quick.Compared = 1000, -1 // means and errors need fewer draws than intervals
	for d, geometry := range draws {
		some, _, err := channels(curves, geometry, model, quick, true)
		if err != nil {
			return nil, nil, nil, err
		}
		for i, p := range some {
			depth[d][i] = p.Depth
			variance[i] += p.DepthErr * p.DepthErr / float64(n)
		}
	}
	mean, shared := make([]float64, m), columns(m, m)
	for _, row := range depth {
		for i, x := range row {
			mean[i] += x / float64(n)
		}
	}
	for _, row := range depth {
		for i := range m {
			for j := range m {
				shared[i][j] += (row[i] - mean[i]) * (row[j] - mean[j]) / float64(n-1)
			}
		}
	}
	for i := range points {
		if !points[i].Good() || !finite(mean[i]) {
			for j := range m {
				shared[i][j], shared[j][i] = math.NaN(), math.NaN()
			}
			continue
		}
		points[i].Depth, points[i].DepthErr = mean[i], math.Sqrt(variance[i])
	}
	return points, shared, posteriors, nil
}
