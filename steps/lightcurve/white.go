package lightcurve

import (
	"fmt"
	"math"
	"slices"
)

// leastWeight is the share of the total weight of all channels that must be
// usable in an integration; below it, the mean would be that of another mix of
// channels, of another transit depth and limb darkening.
const leastWeight = 0.5

// White returns the white light curve: the mean of all channels, each divided by
// the median of its own usable fluxes and weighted by the inverse square of its
// median relative error. Weights are constants of a channel, so that the white
// curve has one limb darkening and one depth; in an integration where a channel
// is masked, the remaining weights are renormalised. The flux is relative, about
// 1; the error is that of the weighted mean, channels independent.
//
// Integrations in which less than half of the total weight is usable are masked,
// with the reasons of the channels added up. Channels without a usable sample,
// or whose median flux or error is not above zero, take no part. The channel of
// the result has Index -1 and spans the channels that took part. Auxiliary
// columns are carried along. It is an error when no channel is usable.
func White(cube Cube) (Curve, error) {
	const what = "white light curve"
	if err := cube.checkShape(what); err != nil {
		return Curve{}, err
	}
	n := len(cube.Time)
	level := make([]float64, len(cube.Channels))
	weight := make([]float64, len(cube.Channels))
	white := Channel{Index: -1, Lo: math.Inf(1), Hi: math.Inf(-1)}
	total := 0.0
	for j, channel := range cube.Channels {
		level[j], weight[j] = levelAndWeight(cube.Flux[j], cube.Err[j], cube.Mask[j])
		if weight[j] > 0 {
			total += weight[j]
			white.Lo, white.Hi = math.Min(white.Lo, channel.Lo), math.Max(white.Hi, channel.Hi)
		}
	}
	if total == 0 {
		return Curve{}, fmt.Errorf("%s: none of %d channels has a usable sample with a positive flux and error", what, len(cube.Channels))
	}
	out := Curve{
		Channel: white,
		Time:    slices.Clone(cube.Time),
		Flux:    make([]float64, n),
		Err:     make([]float64, n),
		Mask:    make([]Flag, n),
		Aux:     cloneSeries(cube.Aux),
	}
	for i := range n {
		var sum, sumVar, usable float64
		var reasons Flag
		for j, w := range weight {
			if w == 0 {
				continue
			}
			if reason := cube.Mask[j][i]; reason != 0 {
				reasons |= reason
				continue
			}
			usable += w
			sum += w * cube.Flux[j][i] / level[j]
			e := w * cube.Err[j][i] / level[j]
			sumVar += e * e
		}
		out.Flux[i], out.Err[i] = math.NaN(), math.NaN()
		if usable > 0 {
			out.Flux[i], out.Err[i] = sum/usable, math.Sqrt(sumVar)/usable
		}
		if usable < leastWeight*total {
			out.Mask[i] = reasons
		} else if !finite(out.Flux[i]) || !finite(out.Err[i]) {
			out.Mask[i] = Missing
		}
	}
	return out, nil
}

// levelAndWeight returns the median of a channel's usable fluxes and the
// channel's weight, 0 for a channel that takes no part.
func levelAndWeight(flux, sigma []float64, mask []Flag) (level, weight float64) {
	var f, e []float64
	for i := range flux {
		if mask[i] == 0 {
			f = append(f, flux[i])
			e = append(e, sigma[i])
		}
	}
	level = medianInPlace(f)
	relative := medianInPlace(e) / level
	weight = 1 / (relative * relative)
	if !(level > 0) || !(relative > 0) || !finite(weight) {
		return 0, 0
	}
	return level, weight
}

// Curves returns the channels of a cube as light curves of their own, in order.
// They share no memory with the cube, but one copy of its times and auxiliaries
// with each other. A cube whose slices differ in length gives
// none; [MaskDead] and all other steps of cleaning say what is wrong with it.
func Curves(cube Cube) []Curve {
	if cube.checkShape("curves") != nil {
		return nil
	}
	out := make([]Curve, len(cube.Channels))
	time, aux := slices.Clone(cube.Time), cloneSeries(cube.Aux)
	for j, channel := range cube.Channels {
		out[j] = Curve{
			Channel: channel,
			Time:    time,
			Flux:    slices.Clone(cube.Flux[j]),
			Err:     slices.Clone(cube.Err[j]),
			Mask:    slices.Clone(cube.Mask[j]),
			Aux:     aux,
		}
	}
	return out
}
