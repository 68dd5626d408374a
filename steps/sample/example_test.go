package sample_test

import (
	"fmt"
	"math"

	"rimlight/steps/chain"
	"rimlight/steps/check"
	"rimlight/steps/sample"
)

// A share of which 7 in 20 trials tell, with a flat prior: the posterior is a beta
// distribution of 8 and 14.
func Example() {
	parameters := []sample.Parameter{{Name: "share", Lo: 0, Hi: 1}}
	density := func(x, gradient []float64) float64 {
		gradient[0] = 7/x[0] - 13/(1-x[0])
		return 7*math.Log(x[0]) + 13*math.Log1p(-x[0])
	}
	start, err := sample.Around(parameters, []float64{0.5}, []float64{0.3}, 4, 1)
	if err != nil {
		fmt.Println(err)
		return
	}
	draws, err := sample.NUTS(parameters, density, start, sample.NUTSSettings{Seed: 1})
	if err != nil {
		fmt.Println(err)
		return
	}
	summaries, err := chain.Summaries(draws)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("mean %.2f ± %.2f, %d failed checks\n", summaries[0].Mean, summaries[0].SD, len(check.Failed(chain.Checks("", draws))))
	// Output: mean 0.36 ± 0.10, 0 failed checks
}
