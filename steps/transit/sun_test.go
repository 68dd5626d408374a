package transit

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"rimlight/steps/limb"
	"rimlight/steps/orbit"
)

// TestSolarSystem has the Earth and Jupiter cross the Sun: published depths of
// transits over a disc of even brightness, and what the observed limb darkening
// of the Sun makes of them. At the centre of the disc the depth is the squared
// radius ratio divided by the observed ratio of mean to central intensity, but
// for the little that the light varies behind the planet.
func TestSolarSystem(t *testing.T) {
	raw, err := os.ReadFile("../../testdata/geometry/solar_system_transits.json")
	if err != nil {
		t.Fatal(err)
	}
	var planets map[string]map[string]any
	if err := json.Unmarshal(raw, &planets); err != nil {
		t.Fatal(err)
	}
	for name, published := range map[string]float64{"earth": 0.0084, "jupiter_mean_radius": 0.0101 * 100} {
		planet := planets[name]
		get := func(key string) float64 { return number(t, planet[key].(string)) }
		p := Params{
			Orbit:       orbit.Orbit{Period: get("P_days"), AxisRatio: get("a_over_R"), Inclination: math.Pi / 2},
			RadiusRatio: get("k"), Law: limb.Law{Name: limb.Uniform},
		}
		depth := func() float64 {
			flux, err := Curve([]float64{0}, p)
			if err != nil {
				t.Fatal(err)
			}
			return 1 - flux[0]
		}
		uniform := depth()
		if math.Abs(uniform*1e6-get("depth_ppm")) > 1e-9 || math.Abs(100*uniform-published) > 5e-3*published {
			t.Errorf("%s: depth %g %%, published %g %%", name, 100*uniform, published)
		}
		for _, row := range table(t, "transit/sun.csv") {
			p.Law = limb.Law{Name: limb.FourParameter, Coefficients: []float64{number(t, row["c1"]), number(t, row["c2"]), number(t, row["c3"]), number(t, row["c4"])}}
			if got, want := depth(), uniform/number(t, row["mean_to_centre"]); math.Abs(got/want-1) > 4*number(t, row["rms"])+uniform {
				t.Errorf("%s at %s nm: depth %g, want %g", name, row["wavelength_nm"], got, want)
			}
		}
		// First to fourth contact.
		half := get("T14_h") / 48
		flux, err := Curve([]float64{-1.0001 * half, -0.9999 * half, 0.9999 * half, 1.0001 * half}, p)
		if err != nil {
			t.Fatal(err)
		}
		if flux[0] != 1 || flux[1] >= 1 || flux[2] >= 1 || flux[3] != 1 {
			t.Errorf("%s: fluxes about the contacts are %v", name, flux)
		}
	}
}
