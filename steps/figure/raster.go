package figure

import (
	"image"
	"math"
	"slices"
)

// mapRows is the greatest number of rows of the image of a map. It has the
// columns that its channels have intervals.
const mapRows = 360

// A raster is a map as an image: equal intervals of time by equal intervals of
// wavelength, row by row from the longest wavelength.
type raster struct {
	columns, rows int
	from, to      float64 // days
	lo, hi        float64 // um
	value         []float64
	filled        []bool // false outside all channels and where there is no integration
	most          int    // samples of one channel in a cell
}

// newRaster puts channels that share their intervals of time together.
func newRaster(channels []mapRow) raster {
	time := channels[0].flux
	out := raster{columns: len(time.Value), from: time.Begin, to: time.End, lo: math.Inf(1), hi: math.Inf(-1)}
	narrow, wide := math.Inf(1), 0.0
	for _, r := range channels {
		c := r.channel
		out.lo, out.hi = min(out.lo, c.Lo), max(out.hi, c.Hi)
		narrow, wide = min(narrow, c.Hi-c.Lo), max(wide, c.Hi-c.Lo)
		out.most = max(out.most, slices.Max(r.flux.Samples))
	}
	// Channels of one width without gaps need one row each.
	out.rows = mapRows
	if n := (out.hi - out.lo) / wide; wide-narrow <= 0.01*wide && math.Abs(n-float64(len(channels))) < 0.01 && len(channels) < mapRows {
		out.rows = len(channels)
	}
	out.value = make([]float64, out.columns*out.rows)
	out.filled = make([]bool, len(out.value))
	sum, good, all := make([]float64, out.columns), make([]int, out.columns), make([]int, out.columns)
	for row := range out.rows {
		clear(sum)
		clear(good)
		clear(all)
		for _, j := range out.channelsOf(row, channels) {
			flux := channels[j].flux
			for c, used := range flux.Used {
				all[c] += flux.Samples[c]
				if finite(flux.Value[c]) {
					sum[c] += flux.Value[c] * float64(used)
					good[c] += used
				}
			}
		}
		for c := range out.columns {
			k := row*out.columns + c
			out.filled[k] = all[c] > 0
			out.value[k] = nan
			if 2*good[c] > all[c] {
				out.value[k] = sum[c] / float64(good[c])
			}
		}
	}
	return out
}

// channelsOf returns the channels whose middles lie in a row, or else the first one that
// covers the middle of the row.
func (r raster) channelsOf(row int, channels []mapRow) []int {
	height := (r.hi - r.lo) / float64(r.rows)
	top := r.hi - float64(row)*height
	var inside []int
	cover := -1
	for j, m := range channels {
		c := m.channel
		if middle := (c.Lo + c.Hi) / 2; middle < top && middle >= top-height {
			inside = append(inside, j)
		}
		if middle := top - height/2; cover < 0 && c.Lo <= middle && middle < c.Hi {
			cover = j
		}
	}
	if len(inside) == 0 && cover >= 0 {
		return []int{cover}
	}
	return inside
}

// picture colours the raster; share gives where a value lies in the scale, 0 to 1.
func (r raster) picture(share func(v float64) float64) image.Image {
	img := image.NewPaletted(image.Rect(0, 0, r.columns, r.rows), mapPalette())
	for k, v := range r.value {
		switch {
		case !r.filled[k]:
			img.Pix[k] = blankIndex
		case !finite(v):
			img.Pix[k] = maskedIndex
		default:
			img.Pix[k] = rampIndex(share(v))
		}
	}
	return img
}

// rampIndex returns the entry of the palette for a share of the scale.
func rampIndex(x float64) uint8 {
	return firstColor + uint8(math.Round(min(max(x, 0), 1)*(rampColors-1)))
}

// rampPicture is the scale itself, from the top down.
func rampPicture() image.Image {
	img := image.NewPaletted(image.Rect(0, 0, 1, rampColors), mapPalette())
	for k := range rampColors {
		img.Pix[k] = uint8(firstColor + rampColors - 1 - k)
	}
	return img
}
