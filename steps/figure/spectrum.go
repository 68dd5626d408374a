package figure

import (
	"fmt"
	"math"

	"rimlight/steps/spectrum"
)

// Spectrum draws transit depth against wavelength: horizontal bars are the widths
// of the channels, vertical bars one standard deviation, shared part included.
// Doubtful depths (with a flag) are hollow, channels without a depth are marked at
// the lower edge, and depths far off the others are marked by a dash at the edge
// that they lie beyond. It is an error when no channel has a depth.
func Spectrum(s spectrum.Spectrum) (Figure, error) {
	sigma := s.Errors()
	var good, doubtful points
	var lost []float64
	var edges []float64
	for i, p := range s.Points {
		c := p.Channel
		if !finite(c.Lo) || !finite(c.Hi) {
			continue
		}
		edges = append(edges, c.Lo, c.Hi)
		switch {
		case !finite(p.Depth) || !finite(sigma[i]):
			lost = append(lost, (c.Lo+c.Hi)/2)
		case p.Flag != "":
			doubtful.add(c.Lo, c.Hi, p.Depth*perMillion, sigma[i]*perMillion)
		default:
			good.add(c.Lo, c.Hi, p.Depth*perMillion, sigma[i]*perMillion)
		}
	}
	all := good.with(doubtful)
	if len(all.y) == 0 {
		return Figure{}, fmt.Errorf("figure of the spectrum: none of %d channels has a depth and an error", len(s.Points))
	}
	lo, hi := all.core()
	x := newSpan(extent(edges)).padded(0.015, 0.015)
	panel, frame := newPage(doubleColumn, 80).single(x, newSpan(lo, hi).padded(0.1, 0.06), 10, 7)
	panel.draw(good, indigo, indigo)
	panel.draw(doubtful, amber, color(0xffffff))
	var low, high []float64
	for i, y := range all.y {
		switch {
		case y > panel.y.hi:
			high = append(high, all.x[i])
		case y < panel.y.lo:
			low = append(low, all.x[i])
		}
	}
	panel.edgeMarks(lost, 0, 0.028, stroke{color: quiet, width: 0.9})
	panel.edgeMarks(low, 0, 0.028, stroke{color: indigo, width: 1.6})
	panel.edgeMarks(high, 1, 0.972, stroke{color: indigo, width: 1.6})
	frame.xTitle, frame.yTitle = waveTitle, "Transit depth (ppm)"
	panel.axes(frame)

	sum := s.Summary()
	least, most := all.extremes()
	finding := fmt.Sprintf("Depths lie between %s and %s ppm", wholeNumber(least.y), wholeNumber(most.y))
	if len(all.y) > 1 {
		finding += fmt.Sprintf(", least at %s µm and greatest at %s µm", plain(least.x, 3), plain(most.x, 3))
	}
	caption := sentences(
		fmt.Sprintf("Transit depth of %s of %d from %s.", counted(sum.Good, "channel"), sum.Channels, waveRange(sum.Lo, sum.Hi)),
		"Horizontal bars are the widths of the channels, vertical bars one standard deviation, with what the channels share.",
		fmt.Sprintf("The median error is %s; the weighted mean depth is %s.", ppm(sum.MedianErr), ppmWithError(sum.MeanDepth, sum.MeanDepthErr)),
		flatness(sum),
		whichHave(len(doubtful.y), "depth", "a flag (hollow)"),
		whichHave(len(lost), "channel", "no depth (marks at the lower edge)"),
		whichHave(len(low)+len(high), "depth", "a value beyond the range shown (thick marks at the edge)"))
	alt := fmt.Sprintf("Transmission spectrum of %s from %s. %s; the median error is %s.",
		counted(sum.Good, "channel"), waveRange(sum.Lo, sum.Hi), finding, ppm(sum.MedianErr))
	return finish(panel.page, Figure{Title: "Transmission spectrum", Caption: caption, Alt: alt, Data: spectrum.Table(s)})
}

// flatness says how well a constant describes the spectrum.
func flatness(s spectrum.Summary) string {
	if s.FlatDof < 1 || !finite(s.FlatChi2) {
		return ""
	}
	return fmt.Sprintf("A constant depth has a chi-square of %s for %s of freedom.", plain(s.FlatChi2, 4), degrees(s.FlatDof))
}

func degrees(n int) string {
	if n == 1 {
		return "1 degree"
	}
	return fmt.Sprintf("%d degrees", n)
}

// points holds measurements of channels.
type points struct {
	lo, hi, x, y, err []float64
}

func (p *points) add(lo, hi, y, err float64) {
	p.lo, p.hi = append(p.lo, lo), append(p.hi, hi)
	p.x, p.y, p.err = append(p.x, (lo+hi)/2), append(p.y, y), append(p.err, err)
}

// with returns the points of both.
func (p points) with(q points) points {
	join := func(a, b []float64) []float64 { return append(append([]float64(nil), a...), b...) }
	return points{join(p.lo, q.lo), join(p.hi, q.hi), join(p.x, q.x), join(p.y, q.y), join(p.err, q.err)}
}

// farOff is the distance from the median, in robust standard deviations of the
// values, beyond which a value does not widen the range shown.
const farOff = 8

// core returns the range of the values with their errors, without those that are
// far off or have errors of more than five times the median.
func (p points) core() (lo, hi float64) {
	middle, typical := median(p.y), median(p.err)
	apart := make([]float64, len(p.y))
	for i, y := range p.y {
		apart[i] = math.Abs(y - middle)
	}
	reach := farOff * (1.4826*median(apart) + typical)
	lo, hi = math.Inf(1), math.Inf(-1)
	for i, y := range p.y {
		if apart[i] <= reach && p.err[i] <= 5*typical {
			lo, hi = min(lo, y-p.err[i]), max(hi, y+p.err[i])
		}
	}
	if lo > hi {
		return middle - reach, middle + reach
	}
	return lo, hi
}

// An extreme is one point.
type extreme struct{ x, y float64 }

// extremes returns the points of least and greatest value.
func (p points) extremes() (least, most extreme) {
	for i, y := range p.y {
		if i == 0 || y < least.y {
			least = extreme{p.x[i], y}
		}
		if i == 0 || y > most.y {
			most = extreme{p.x[i], y}
		}
	}
	return least, most
}
