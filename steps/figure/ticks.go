package figure

import (
	"math"
	"strconv"
	"strings"
)

// A span is the range of an axis, lo < hi, both above 0 when it is logarithmic.
type span struct {
	lo, hi float64
	log    bool
}

// widest is the largest number that an axis reaches to.
const widest = 1e150

// newSpan returns a linear span from lo to hi that has a width: numbers that are
// not finite give 0 to 1, equal ones a span about them.
func newSpan(lo, hi float64) span {
	if math.IsNaN(lo) || math.IsNaN(hi) || lo > hi {
		return span{lo: 0, hi: 1}
	}
	lo, hi = min(max(lo, -widest), widest), min(max(hi, -widest), widest)
	if most := max(math.Abs(lo), math.Abs(hi), 1e-150); !(hi-lo > 1e-9*most) {
		return span{lo: lo - most/1000, hi: hi + most/1000}
	}
	return span{lo: lo, hi: hi}
}

// newLogSpan returns a logarithmic span from lo to hi, 1 to 10 when they do not
// make one.
func newLogSpan(lo, hi float64) span {
	if !(lo >= 1/widest && hi <= widest && lo <= hi) {
		return span{lo: 1, hi: 10, log: true}
	}
	if hi < 1.05*lo {
		lo, hi = lo/1.05, hi*1.05
	}
	return span{lo: lo, hi: hi, log: true}
}

// padded returns the span widened by shares of its width.
func (s span) padded(below, above float64) span {
	if s.log {
		w := math.Log(s.hi / s.lo)
		return span{lo: s.lo * math.Exp(-below*w), hi: s.hi * math.Exp(above*w), log: true}
	}
	w := s.hi - s.lo
	return span{lo: s.lo - below*w, hi: s.hi + above*w}
}

// at returns where v lies in the span, 0 at lo and 1 at hi.
func (s span) at(v float64) float64 {
	if s.log {
		return math.Log(v/s.lo) / math.Log(s.hi/s.lo)
	}
	return (v - s.lo) / (s.hi - s.lo)
}

// A tick is a mark on an axis. Marks without a label are shorter.
type tick struct {
	value float64
	label string
}

// ticks returns the marks of an axis, about as many with labels as asked for. A
// logarithmic span that holds fewer than two labels is marked as a linear one.
func (s span) ticks(count int) []tick {
	// Few numbers asked for can leave a single one within the span.
	for more := count; s.log && more < count+6; more++ {
		if marks := s.logTicks(more); labelled(marks) > 1 {
			return marks
		}
	}
	for more := count; ; more++ {
		if marks := s.linearTicks(more); labelled(marks) > 1 || more > count+5 {
			return marks
		}
	}
}

// labelled counts the marks that have a label.
func labelled(marks []tick) int {
	n := 0
	for _, t := range marks {
		if t.label != "" {
			n++
		}
	}
	return n
}

// linearTicks places labels at multiples of 1, 2 or 5 times a power of ten,
// and marks between them.
func (s span) linearTicks(count int) []tick {
	rough := (s.hi - s.lo) / float64(max(count, 1))
	power := int(math.Floor(math.Log10(rough)))
	mantissa, parts := 10.0, 5
	for _, m := range []float64{1, 2, 5} {
		if rough <= m*math.Pow(10, float64(power))*(1+1e-9) {
			mantissa = m
			break
		}
	}
	switch mantissa {
	case 2:
		parts = 4
	case 10:
		mantissa, power = 1, power+1
	}
	value := func(i float64) float64 { // of the i-th mark, rounded once
		if power < 0 {
			return i * mantissa / float64(parts) / math.Pow(10, float64(-power))
		}
		return i * mantissa / float64(parts) * math.Pow(10, float64(power))
	}
	step := value(1)
	edge := 1e-9 * (s.hi - s.lo)
	var out []tick
	first := math.Ceil((s.lo - edge) / step)
	for k := 0; k < 40*max(count, 1); k++ {
		i := first + float64(k)
		v := value(i)
		if v > s.hi+edge {
			break
		}
		if s.log && v < s.lo {
			continue
		}
		t := tick{value: v}
		if math.Mod(i, float64(parts)) == 0 {
			t.label = decimal(v, power)
		}
		out = append(out, t)
	}
	return out
}

// logTicks places marks at whole multiples of powers of ten; which of them have
// labels depends on how many decades there are.
func (s span) logTicks(count int) []tick {
	from, to := int(math.Floor(math.Log10(s.lo))), int(math.Ceil(math.Log10(s.hi)))
	every := 1 + (to-from)/max(count, 1) // decades from label to label
	var out []tick
	for power := from; power <= to; power++ {
		for m := 1; m <= 9; m++ {
			v, err := strconv.ParseFloat(strconv.Itoa(m)+"e"+strconv.Itoa(power), 64)
			if err != nil || v < s.lo*(1-1e-9) || v > s.hi*(1+1e-9) {
				continue
			}
			t := tick{value: v}
			switch {
			case m == 1 && power%every == 0,
				(m == 2 || m == 5) && 3*math.Log10(s.hi/s.lo) <= float64(count):
				t.label = decimal(v, power)
			case every > 1 && m != 1:
				continue
			}
			out = append(out, t)
		}
	}
	return out
}

// decimal writes v, a multiple of 10 to the power given, with a minus sign in
// place of a hyphen; numbers that would be long have an exponent.
func decimal(v float64, power int) string {
	size := math.Abs(v)
	if size < 0.5*math.Pow(10, float64(power)) {
		return "0"
	}
	text := strconv.FormatFloat(v, 'f', max(0, -power), 64)
	digits := int(math.Floor(math.Log10(size)*(1+1e-12))) - power // after the first
	if power < -6 && size < 1 || size >= 1e6 && digits < 4 || size >= 1e16 {
		text = strconv.FormatFloat(v, 'e', max(digits, 0), 64)
	}
	return strings.ReplaceAll(text, "-", "−")
}
