package compress

import (
	"fmt"
	"testing"
	"time"
)

func TestTry(t *testing.T) {
	s := scene{n: 6000, r: 0.11, b: 0.3, u: [2]float64{0.3, 0.15}, noise: 4e-4, slope: true, curved: true, pointing: 2, settling: true, tau: 0.02, hook: 1e-3, seed: 3, unequal: 0.05, exposure: 8}
	shared, curve := s.make(t, 0)
	for i := range 4 {
		curve = s.curve(t, shared.star, shared.trend, uint64(i))
		begin := time.Now()
		p, err := shared.Posterior(curve, Settings{Effective: 4000, Compare: 50, Seed: 1})
		if err != nil {
			t.Fatal(err)
		}
		fmt.Println(time.Since(begin))
		fmt.Printf("%+v\n", *p)
	}
}
