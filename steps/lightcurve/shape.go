package lightcurve

import (
	"fmt"
	"slices"
)

// Clone returns a copy of c that shares no memory with it.
func (c Cube) Clone() Cube {
	out := Cube{
		Time:     slices.Clone(c.Time),
		Channels: slices.Clone(c.Channels),
		Flux:     make([][]float64, len(c.Flux)),
		Err:      make([][]float64, len(c.Err)),
		Mask:     make([][]Flag, len(c.Mask)),
		Aux:      cloneSeries(c.Aux),
	}
	for j := range c.Flux {
		out.Flux[j] = slices.Clone(c.Flux[j])
	}
	for j := range c.Err {
		out.Err[j] = slices.Clone(c.Err[j])
	}
	for j := range c.Mask {
		out.Mask[j] = slices.Clone(c.Mask[j])
	}
	return out
}

// ownMasks is c with masks of its own. All else it shares with c.
func (c Cube) ownMasks() Cube {
	c.Mask = slices.Clone(c.Mask)
	for j := range c.Mask {
		c.Mask[j] = slices.Clone(c.Mask[j])
	}
	return c
}

func cloneSeries(aux []Series) []Series {
	out := slices.Clone(aux)
	for k := range out {
		out[k].Value = slices.Clone(out[k].Value)
	}
	return out
}

// checkShape reports the first slice of the cube whose length does not fit the
// others. what names the caller in the message.
func (c Cube) checkShape(what string) error {
	n, m := len(c.Time), len(c.Channels)
	for _, part := range []struct {
		name string
		have int
	}{{"flux", len(c.Flux)}, {"error", len(c.Err)}, {"mask", len(c.Mask)}} {
		if part.have != m {
			return fmt.Errorf("%s: the cube has %d channels but %d %s series; give one per channel", what, m, part.have, part.name)
		}
	}
	for j := range c.Flux {
		if len(c.Flux[j]) != n || len(c.Err[j]) != n || len(c.Mask[j]) != n {
			return fmt.Errorf("%s: channel %d has %d fluxes, %d errors and %d flags; expected one of each for %d times",
				what, j, len(c.Flux[j]), len(c.Err[j]), len(c.Mask[j]), n)
		}
	}
	return checkAux(what, c.Aux, n)
}

// checkShape is [Cube.checkShape] for one curve.
func (c Curve) checkShape(what string) error {
	n := len(c.Time)
	if len(c.Flux) != n || len(c.Err) != n || len(c.Mask) != n {
		return fmt.Errorf("%s: the curve has %d fluxes, %d errors and %d flags; expected one of each for %d times",
			what, len(c.Flux), len(c.Err), len(c.Mask), n)
	}
	return checkAux(what, c.Aux, n)
}

func checkAux(what string, aux []Series, n int) error {
	for _, s := range aux {
		if len(s.Value) != n {
			return fmt.Errorf("%s: auxiliary column %.40s has %d values; expected one for each of %d times", what, s.Name, len(s.Value), n)
		}
	}
	return nil
}
