package chain

import "rimlight/steps/table"

// Table returns summaries as a table to be read, one row for each parameter.
func Table(title string, summaries []Summary) table.Table {
	names, units := make([]string, len(summaries)), make([]string, len(summaries))
	for i, s := range summaries {
		names[i], units[i] = s.Name, s.Unit
	}
	column := func(name, about string, digits int, of func(s Summary) float64) table.Column {
		values := make([]float64, len(summaries))
		for i, s := range summaries {
			values[i] = of(s)
		}
		return table.Number(name, "", about, digits, values)
	}
	return table.Table{Title: title, Columns: []table.Column{
		table.Text("parameter", "", names),
		table.Text("unit", "", units),
		column("median", "", 7, func(s Summary) float64 { return s.Median }),
		column("minus", "from the median down to the lower end of the central 68.3%", 3, func(s Summary) float64 { return s.Median - s.Lo68 }),
		column("plus", "from the median up to the upper end of the central 68.3%", 3, func(s Summary) float64 { return s.Hi68 - s.Median }),
		column("lo95", "lower end of the central 95.4%", 6, func(s Summary) float64 { return s.Lo95 }),
		column("hi95", "upper end of the central 95.4%", 6, func(s Summary) float64 { return s.Hi95 }),
		column("mean", "", 7, func(s Summary) float64 { return s.Mean }),
		column("sd", "standard deviation", 3, func(s Summary) float64 { return s.SD }),
		column("median_error", "Monte-Carlo standard error of the median, which more draws would lessen", 2, func(s Summary) float64 { return s.MedianError }),
		column("r_hat", "at most 1.01 when the chains have met", 5, func(s Summary) float64 { return s.RHat }),
		column("bulk_ess", "independent draws that these are worth for the median", 4, func(s Summary) float64 { return s.BulkESS }),
		column("tail_ess", "independent draws that these are worth for the ends of intervals", 4, func(s Summary) float64 { return s.TailESS }),
	}}
}
