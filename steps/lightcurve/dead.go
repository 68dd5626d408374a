package lightcurve

// deadRatio is the least ratio of median flux to the scatter of one integration
// that a channel with starlight in it must show. At this ratio the noise of one
// integration is a third of the star's flux, and a thousand integrations in
// transit leave an error of a per cent of the star's light on the depth: nothing is
// lost by leaving such a channel out, and noise about zero never passes.
const deadRatio = 3

// MaskDead returns raw with masks of its own, in which every sample of a dead
// channel carries [Excluded]. A channel is dead when, over all its finite fluxes outside other
// excluded samples,
//
//   - none is above zero, or
//   - all are the same number (a stuck detector element), or
//   - the median is not above three times the point-to-point scatter, estimated
//     from the median absolute deviation of neighbours' differences: then no
//     integration sees the star, only noise.
//
// Fluxes masked as negative or zero count here, for they are half of what noise
// about zero looks like.
func MaskDead(raw Cube) (Cube, error) {
	if err := raw.checkShape("mask dead channels"); err != nil {
		return Cube{}, err
	}
	out := raw.ownMasks()
	for j := range out.Flux {
		if dead(out.Flux[j], out.Mask[j]) {
			for i := range out.Mask[j] {
				out.Mask[j][i] |= Excluded
			}
		}
	}
	return out, nil
}

// dead applies the criterion of [MaskDead] to one channel.
func dead(flux []float64, mask []Flag) bool {
	counts := func(i int) bool { return finite(flux[i]) && mask[i]&(Excluded|Outlier) == 0 }
	var kept []float64
	for i, f := range flux {
		if counts(i) {
			kept = append(kept, f)
		}
	}
	if len(kept) < 2 {
		return true
	}
	median := medianInPlace(kept)
	if kept[0] == kept[len(kept)-1] || median <= 0 {
		return true
	}
	// The comparison is this way round so that a scatter that cannot be computed
	// (no two neighbours are usable) does not count against the channel.
	return median <= deadRatio*pointToPoint(flux, counts)
}
