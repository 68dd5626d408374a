package compress

import "testing"

// typical is a channel as the shipped recipe fits it: six columns, of which one settles
// in a time to be found, and errors that are not all alike.
func typical(n int) scene {
	return scene{n: n, r: 0.11, b: 0.3, u: [2]float64{0.3, 0.15}, noise: 4e-4, slope: true, curved: true, pointing: 2,
		settling: true, tau: 0.02, hook: 1e-3, seed: 3, unequal: 0.05, exposure: 8}
}

func BenchmarkPosterior(b *testing.B) {
	for _, test := range []struct {
		name string
		s    scene
	}{
		{"6000", typical(6000)},
		{"6000/alike", func() scene { s := typical(6000); s.unequal = 0; return s }()},
		{"20000", typical(20000)},
	} {
		b.Run(test.name, func(b *testing.B) {
			star := test.s.star()
			trend := test.s.trend(star)
			shared, err := NewShared(star, trend)
			if err != nil {
				b.Fatal(err)
			}
			var curves []*Curve
			for i := range 8 {
				s := test.s
				s.r += 1e-4 * float64(i)
				curves = append(curves, s.curve(b, star, trend, uint64(i)))
			}
			for _, c := range curves { // what is shared
				if _, err := shared.Posterior(c, Settings{Effective: 4000}); err != nil {
					b.Fatal(err)
				}
			}
			for i := 0; b.Loop(); i++ {
				if _, err := shared.Posterior(curves[i%len(curves)], Settings{Effective: 4000}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
