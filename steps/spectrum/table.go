package spectrum

import (
	"rimlight/steps/table"
)

// perMillion turns a fraction into parts per million.
const perMillion = 1e6

// Table returns the spectrum as a table to be read: wavelengths in um, depths
// and scatter in parts per million, limb-darkening coefficients, quality of the
// fits and flags. Errors of depths include what the channels share.
func Table(s Spectrum) table.Table {
	n := len(s.Points)
	sigma := s.Errors()
	flags := make([]string, n)
	column := func(name, unit, about string, digits int, of func(i int) float64) table.Column {
		values := make([]float64, n)
		for i := range values {
			values[i] = of(i)
		}
		return table.Number(name, unit, about, digits, values)
	}
	named := map[string]field{}
	for _, f := range fields() {
		named[f.name] = f
	}
	plain := func(name string, digits int) table.Column {
		f := named[name]
		return column(name, f.unit, f.about, digits, func(i int) float64 { return f.number(&s.Points[i], sigma[i]) })
	}
	for i, p := range s.Points {
		flags[i] = p.Flag
	}
	return table.Table{Title: "Transmission spectrum", Columns: []table.Column{
		plain("wave_lo", 6),
		plain("wave_hi", 6),
		column("depth_ppm", "", "transit depth, parts per million", 6, func(i int) float64 { return s.Points[i].Depth * perMillion }),
		column("depth_err_ppm", "", "one standard deviation of the depth, parts per million, what the channels share included", 3,
			func(i int) float64 { return sigma[i] * perMillion }),
		plain("radius_ratio", 6),
		plain("radius_ratio_err", 2),
		plain("u1", 4), plain("u1_err", 2), plain("u2", 4), plain("u2_err", 2),
		plain("chi2_reduced", 3),
		column("scatter_ppm", "", "standard deviation of the residuals of one integration, parts per million", 4,
			func(i int) float64 { return s.Points[i].Scatter * perMillion }),
		plain("samples_used", 6),
		plain("samples_masked", 6),
		table.Text("flag", "why there is no depth, or what is doubtful", flags),
	}}
}
