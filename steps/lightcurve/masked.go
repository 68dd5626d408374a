package lightcurve

import (
	"math"

	"rimlight/steps/table"
)

// maskReasons lists the reasons for masking in the order of their bits.
var maskReasons = [...]struct {
	flag        Flag
	name, about string
}{
	{Missing, "missing", "flux or error is not a number"},
	{Zero, "zero", "flux is exactly zero"},
	{Negative, "negative", "flux below zero, or error not above zero"},
	{Outlier, "outlier", "far from its neighbours"},
	{Excluded, "excluded", "left out on purpose, or a dead channel"},
}

// Masked counts the samples of each channel by reason of masking. A sample with
// several reasons counts under each of them, but once in the column "usable",
// which counts samples without any.
func Masked(cube Cube) table.Table {
	m := len(cube.Mask)
	number := func(name, unit, about string) table.Column {
		return table.Column{Name: name, Unit: unit, About: about, Number: make([]float64, m)}
	}
	columns := []table.Column{
		number("channel", "", "position in the input"),
		number("wave_lo", "um", "lower edge"),
		number("wave_hi", "um", "upper edge"),
		number("samples", "", "integrations"),
		number("usable", "", "samples without any reason for masking"),
	}
	for _, reason := range maskReasons {
		columns = append(columns, number(reason.name, "", reason.about))
	}
	first := len(columns) - len(maskReasons)
	for j, mask := range cube.Mask {
		index, lo, hi := math.NaN(), math.NaN(), math.NaN()
		if j < len(cube.Channels) {
			c := cube.Channels[j]
			index, lo, hi = float64(c.Index), c.Lo, c.Hi
		}
		columns[0].Number[j], columns[1].Number[j], columns[2].Number[j] = index, lo, hi
		columns[3].Number[j] = float64(len(mask))
		for _, flag := range mask {
			if flag == 0 {
				columns[4].Number[j]++
			}
			for k, reason := range maskReasons {
				if flag&reason.flag != 0 {
					columns[first+k].Number[j]++
				}
			}
		}
	}
	return table.Table{Title: "Masked samples", Columns: columns}
}

// MaskedShare returns the share of all samples of the cube that are masked, and
// the share that carries the given reason, both between 0 and 1. With flag 0
// the second is the share of usable samples. An empty cube gives zeros.
func MaskedShare(cube Cube, flag Flag) (masked, reason float64) {
	var all, anyReason, thisReason int
	for _, mask := range cube.Mask {
		all += len(mask)
		for _, f := range mask {
			if f != 0 {
				anyReason++
			}
			if f&flag != 0 || flag == 0 && f == 0 {
				thisReason++
			}
		}
	}
	if all == 0 {
		return 0, 0
	}
	return float64(anyReason) / float64(all), float64(thisReason) / float64(all)
}
