package figure

import (
	"image"
	"math"
	"slices"

	"rimlight/steps/diagnose"
)

// Largest size of the image of a map, in cells.
const (
	mapColumns = 320
	mapRows    = 360
)

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

// newRaster averages the rows of a map.
func newRaster(time []float64, channels []mapRow) raster {
	first, last := extent(time)
	step := diagnose.Cadence(time) / (hours * minutes)
	if !(step > 0) {
		step = 1.0 / (hours * minutes)
	}
	out := raster{from: first - step/2, to: last + step/2, lo: math.Inf(1), hi: math.Inf(-1)}
	out.columns = int(min(max(math.Round((out.to-out.from)/step), 1), mapColumns))
	narrow, wide := math.Inf(1), 0.0
	for _, r := range channels {
		c := r.channel
		out.lo, out.hi = min(out.lo, c.Lo), max(out.hi, c.Hi)
		narrow, wide = min(narrow, c.Hi-c.Lo), max(wide, c.Hi-c.Lo)
	}
	// Channels of one width without gaps need one row each.
	out.rows = mapRows
	if n := (out.hi - out.lo) / wide; wide-narrow <= 0.01*wide && math.Abs(n-float64(len(channels))) < 0.01 && len(channels) < mapRows {
		out.rows = len(channels)
	}
	column := make([]int, len(time)) // of each time, -1 for none
	seen := make([]int, out.columns)
	for i, t := range time {
		column[i] = -1
		if finite(t) {
			column[i] = min(max(int(float64(out.columns)*((t-out.from)/(out.to-out.from))), 0), out.columns-1)
			seen[column[i]]++
		}
	}
	out.most = slices.Max(seen)
	out.value = make([]float64, out.columns*out.rows)
	out.filled = make([]bool, len(out.value))
	sum, good, bad := make([]float64, out.columns), make([]int, out.columns), make([]int, out.columns)
	for row := range out.rows {
		clear(sum)
		clear(good)
		clear(bad)
		for _, j := range out.channelsOf(row, channels) {
			for i, f := range channels[j].flux {
				switch c := column[i]; {
				case c < 0:
				case finite(f):
					sum[c] += f
					good[c]++
				default:
					bad[c]++
				}
			}
		}
		for c := range out.columns {
			k := row*out.columns + c
			out.filled[k] = good[c]+bad[c] > 0
			out.value[k] = nan
			if good[c] > bad[c] {
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
