package fit

import (
	"flag"
	"math"
	"testing"
	"time"

	"rimlight/steps/lightcurve"
	"rimlight/steps/simulate"
	"rimlight/steps/systematics"
)

var study = flag.Bool("study", false, "run the long study of how honest the errors of a spectrum are")

// TestStudy prints, for full-size simulated data whose transits come from other
// code than the fit's, mean and rms of (depth - truth)/error under several
// treatments of orbit, limb darkening and settling. It judges nothing.
func TestStudy(t *testing.T) {
	if !*study {
		t.Skip("only with -study")
	}
	settling := Prior{Name: "settlingTime", Kind: LogUniform, A: 0.002, B: 0.1}
	treatments := []struct {
		name    string
		held    []string // parameters of the orbit to hold at the truth
		channel Priors
	}{
		{"orbit fitted, u", nil, channelPriors("u1", "u2", -1, 2)},
		{"orbit fitted, q", nil, channelPriors("q1", "q2", 0, 1)},
		{"orbit fitted, u, settling free", nil, append(channelPriors("u1", "u2", -1, 2), settling)},
		{"orbit held, u", []string{"axisRatio", "inclination"}, channelPriors("u1", "u2", -1, 2)},
		{"orbit held, q", []string{"axisRatio", "inclination"}, channelPriors("q1", "q2", 0, 1)},
		{"orbit held, u, settling free", []string{"axisRatio", "inclination"}, append(channelPriors("u1", "u2", -1, 2), settling)},
	}
	for _, size := range []struct {
		n, m  int
		seeds uint64
	}{{3000, 80, 6}, {6000, 120, 3}} {
		for seed := uint64(1); seed <= size.seeds; seed++ {
			scenario := simulate.Continuous(seed)
			scenario.Cadence *= float64(scenario.Integrations) / float64(size.n)
			scenario.Exposure = 0.9 * scenario.Cadence
			scenario.Integrations, scenario.Channels = size.n, size.m
			raw, truth, err := simulate.Make(scenario)
			if err != nil {
				t.Fatal(err)
			}
			clean, err := lightcurve.MaskOutliers(raw, lightcurve.RunningMedian{Window: 21, Sigma: 5})
			if err != nil {
				t.Fatal(err)
			}
			clean, _, err = lightcurve.RescaleErrors(clean)
			if err != nil {
				t.Fatal(err)
			}
			s := scene{cube: clean, depth: truth.Depth, u1: truth.U1, u2: truth.U2}
			for _, treat := range treatments {
				model := Model{
					Period: scenario.Period, MidTransit: scenario.MidTransit - 0.006, AxisRatio: scenario.AxisRatio, Inclination: scenario.Inclination,
					Periastron: 90, RadiusRatio: 0.1, Exposure: scenario.Exposure,
					Trend: systematics.Trend{Polynomial: 1, Settling: true, SettlingTime: 0.01, Regressors: []string{"X", "Y"}},
				}
				var white Priors
				for _, p := range whitePriors() {
					free := true
					for _, name := range treat.held {
						free = free && p.Name != name
					}
					if free {
						white = append(white, p)
					}
				}
				start := time.Now()
				posterior, points := s.reduce(t, model, white, treat.channel)
				took := time.Since(start).Seconds()
				shared := SharedCovariance(points, posterior)
				var own, total, ratio, chi2 tally
				dead, edges := 0, 0
				for i, p := range points {
					if truth.Dead[i] != !p.Good() {
						t.Errorf("channel %d: dead %v, flag %q", i, truth.Dead[i], p.Flag)
					}
					if !p.Good() {
						dead++
						continue
					}
					if p.Flag != "" {
						edges++
					}
					own.add((p.Depth - truth.Depth[i]) / p.DepthErr)
					total.add((p.Depth - truth.Depth[i]) / math.Sqrt(p.DepthErr*p.DepthErr+shared[i][i]))
					ratio.add(math.Sqrt(shared[i][i]) / p.DepthErr)
					chi2.add(p.Chi2 / float64(p.Dof))
				}
				t.Logf("%d×%d seed %d %-30s own errors: mean %+.2f rms %.2f; with shared: mean %+.2f rms %.2f; shared/own %.2f; chi2 %.3f; %d dead, %d flagged; white chi2 %.3f, %v; %.1f s",
					size.n, size.m, seed, treat.name, own.mean(), own.rms(), total.mean(), total.rms(), ratio.mean(), chi2.mean(), dead, edges,
					posterior.Chi2/float64(posterior.Dof), posterior.Warnings, took)
			}
		}
	}
}

// A tally sums numbers for their mean and root mean square.
type tally struct{ n, sum, sumSq float64 }

func (t *tally) add(x float64) { t.n, t.sum, t.sumSq = t.n+1, t.sum+x, t.sumSq+x*x }
func (t *tally) mean() float64 { return t.sum / t.n }
func (t *tally) rms() float64  { return math.Sqrt(t.sumSq / t.n) }
