package orbit

import (
	"math"
	"testing"
)

// TestNoPath checks that a path of no orbit can be asked anything.
func TestNoPath(t *testing.T) {
	for name, p := range map[string]*Path{"nil": nil, "zero": {}, "of no orbit": Orbit{}.Path()} {
		if since, _ := p.Fold(1); !math.IsNaN(since) {
			t.Errorf("%s path: folded time %g", name, since)
		}
		if z, front := p.Separation(1); !(z == 0 || math.IsNaN(z)) || front {
			t.Errorf("%s path: separation %g, in front %v", name, z, front)
		}
		p.SeparationGradient(1, 1)
		if from, to := p.Window(2); !math.IsInf(from, -1) || !math.IsInf(to, 1) {
			t.Errorf("%s path: window from %g to %g", name, from, to)
		}
		p.Contacts(0.1)
	}
}
