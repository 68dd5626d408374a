package orbit

import (
	"math"
	"testing"
)

// TestSkyReference compares places on the sky, separations and all derivatives
// with those of 60-digit arithmetic. Allowed is what times that are off by a few
// roundings would do.
func TestSkyReference(t *testing.T) {
	names := []string{"z", "X", "Y", "Z", "zP", "zT", "zA", "zI", "zE", "zW", "zH", "zK"}
	all := func(p *Path, since, elapsed float64) (v [12]float64) {
		var grad [6]float64
		v[0], _, grad = p.SeparationGradient(since, elapsed)
		copy(v[4:], grad[:])
		v[1], v[2], v[3] = p.Sky(since)
		_, _, grad = p.VectorGradient(since, elapsed)
		copy(v[10:], grad[4:])
		return v
	}
	var worst [12]float64
	for line, row := range readTable(t, "geometry/sky_gradient.csv") {
		get := func(name string) float64 { return number(t, row[name]) }
		o := Orbit{Period: get("period"), MidTransit: get("midTransit"), AxisRatio: get("axisRatio"), Inclination: get("inclination"),
			Eccentricity: get("eccentricity"), Periastron: get("periastron"), StarRadius: get("starRadius")}
		if err := o.Validate(); err != nil {
			t.Fatal(err)
		}
		p := o.Path()
		since, elapsed := p.Fold(get("time"))
		got := all(p, since, elapsed)
		if again, front := p.Separation(since); math.Abs(again-got[0]) > 4e-16*got[0] || front != (got[3] > 0) {
			t.Errorf("line %d: z = %.17g, but %.17g with the gradient", line+2, again, got[0])
		}
		const roundings = 4 * 0x1p-52
		late := roundings * (math.Abs(since) + math.Abs(elapsed-since)*0x1p-2)
		before, after := all(p, since-late, elapsed-late), all(p, since+late, elapsed+late)
		for i, name := range names {
			want := get(name)
			allowed := math.Abs(after[i]-want) + math.Abs(before[i]-want)
			relative := 1e-10
			if i < 4 {
				relative = 4e-16
				allowed += 4e-16 * o.AxisRatio * math.Min(1, math.Abs(got[i])) // of sine and cosine of the inclination
			}
			if name == "Y" || name == "zI" { // cos i near 90° is that of the number in the table
				allowed += 2e-16 * o.AxisRatio
			}
			d := math.Abs(got[i] - want)
			if d > allowed {
				worst[i] = max(worst[i], (d-allowed)/math.Abs(want))
			}
			if !(d <= allowed+relative*math.Abs(want)) {
				t.Errorf("line %d: %s is %.17g, expected %.17g, e = %g, z = %g", line+2, name, got[i], want, o.Eccentricity, got[0])
			}
		}
	}
	t.Logf("largest errors beyond that of the time: %.2g", worst)
}
