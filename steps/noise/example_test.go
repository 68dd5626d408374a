package noise_test

import (
	"fmt"
	"math"

	"rimlight/steps/noise"
)

// A level and a slope are fitted in red noise.
func Example() {
	model := noise.White(false, true).Plus(noise.NewTerm("red", noise.Matern32))
	fmt.Println(model.Equation())

	var data noise.Data
	level, slope, flux := make([]float64, 100), make([]float64, 100), make([]float64, 100)
	for i := range flux {
		t := float64(i) / 500 // days
		data.Time, data.Err = append(data.Time, t), append(data.Err, 1e-4)
		level[i], slope[i] = 1, t
		flux[i] = 1 + 2e-3*t + 1e-4*math.Sin(100*t)
	}
	process, err := noise.New(model, data)
	if err != nil {
		fmt.Println(err)
		return
	}
	values := []float64{5e-5, 1e-4, 0.02} // jitter, red.sigma, red.timescale
	covariance, err := process.At(values)
	if err != nil {
		fmt.Println(err)
		return
	}
	fit, err := covariance.LeastSquares([][]float64{level, slope}, flux)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("slope %.4f ± %.4f per day\n", fit.Value[1], fit.Err[1])

	gradient, err := process.Gradient(values, fit.Residual)
	if err != nil {
		fmt.Println(err)
		return
	}
	for k, p := range process.Parameters() {
		fmt.Printf("d log L / d log %s = %.2f\n", p.Name, gradient.ByLog[k])
	}
	// Output:
	// cov(i, j) = (err_i² + jitter²) δ_ij + red.sigma² (1 + √3 d) exp(-√3 d), d = |Δtime|/red.timescale
	// slope 0.0020 ± 0.0007 per day
	// d log L / d log jitter = -17.24
	// d log L / d log red.sigma = -4.73
	// d log L / d log red.timescale = 1.25
}
