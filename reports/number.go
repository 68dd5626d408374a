package reports

import (
	"math"
	"strconv"
	"strings"
)

// number writes a value with at most the given number of significant digits:
// plainly when that is short, with a power of ten otherwise. NaN is "NaN".
func number(v float64, digits int) string { return decimal(v, digits, false) }

// decimal is number, with all digits written when padded, zeros at the end too.
func decimal(v float64, digits int, padded bool) string {
	trim := func(s string) string {
		if !padded && strings.Contains(s, ".") {
			s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
		}
		return minus(s)
	}
	switch {
	case math.IsNaN(v):
		return "NaN"
	case math.IsInf(v, 1):
		return "∞"
	case math.IsInf(v, -1):
		return "−∞"
	case v == 0:
		return "0"
	}
	digits = max(1, min(digits, 17))
	mantissa, exp := split(v, digits)
	if exp >= -4 && exp < max(digits, 6) {
		s := strconv.FormatFloat(v, 'f', max(0, digits-1-exp), 64)
		if v == math.Trunc(v) {
			s = strconv.FormatFloat(v, 'f', 0, 64)
		}
		return trim(s)
	}
	return trim(mantissa) + "×10" + superscript(exp)
}

// split writes v as a decimal mantissa of the given digits, and its exponent.
func split(v float64, digits int) (mantissa string, exp int) {
	m, e, _ := strings.Cut(strconv.FormatFloat(v, 'e', digits-1, 64), "e")
	exp, _ = strconv.Atoi(e)
	return m, exp
}

// fixed writes a value with the given number of decimals.
func fixed(v float64, decimals int) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return number(v, 1)
	}
	return minus(strconv.FormatFloat(v, 'f', decimals, 64))
}

func minus(s string) string { return strings.Replace(s, "-", "−", 1) }

func superscript(n int) string {
	const digits = "⁰¹²³⁴⁵⁶⁷⁸⁹"
	var b strings.Builder
	for _, r := range strconv.Itoa(n) {
		if r == '-' {
			b.WriteRune('⁻')
			continue
		}
		b.WriteRune([]rune(digits)[r-'0'])
	}
	return b.String()
}

// measured writes a value with its standard deviation: the deviation with two
// significant digits, the value to the same decimal. Without a deviation above
// zero, the value alone with six digits.
func measured(v, err float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) || !(err > 0) || math.IsInf(err, 0) {
		return number(v, 6)
	}
	_, exp := split(err, 2)
	decimals := 1 - exp
	_, lead := split(v, 2)
	if v == 0 {
		lead = exp
	}
	switch {
	case decimals < 0 || decimals > 15: // too large or too small to be written out
		_, scale := split(math.Max(math.Abs(v), err), 2)
		d := max(0, min(15, scale-exp+1))
		unit := math.Pow(10, float64(scale))
		return "(" + fixed(v/unit, d) + " ± " + fixed(err/unit, d) + ")×10" + superscript(scale)
	case decimals > 7 && lead < -4:
		d := max(0, min(15, lead-exp+1))
		unit := math.Pow(10, float64(lead))
		return "(" + fixed(v/unit, d) + " ± " + fixed(err/unit, d) + ")×10" + superscript(lead)
	}
	return fixed(v, decimals) + " ± " + fixed(err, decimals)
}

// ppm writes a fraction in parts per million, and its deviation likewise.
func ppm(v, err float64) string {
	if !(err > 0) {
		if math.IsNaN(v) {
			return "–"
		}
		return fixed(v*1e6, 0)
	}
	if err*1e6 >= 100 {
		return fixed(v*1e6, 0) + " ± " + fixed(err*1e6, 0)
	}
	return measured(v*1e6, err*1e6)
}

// percent writes a share with two or three digits.
func percent(part, whole int) string {
	if whole == 0 {
		return "none"
	}
	p := 100 * float64(part) / float64(whole)
	if part == 0 {
		return "0 %"
	}
	if p < 0.01 {
		return "< 0.01 %"
	}
	return number(math.Round(p*100)/100, 3) + " %"
}

// exact writes a number so that it reads back the same; for files.
func exact(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

// precise gives a number in full when that takes at most 15 digits, as a
// Julian date does, and to 8 digits otherwise.
func precise(v float64) string {
	if s := strconv.FormatFloat(v, 'f', -1, 64); len(s) <= 16 {
		return minus(s)
	}
	return number(v, 8)
}

func counted(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return grouped(n) + " " + many
}

// median of a slice, NaN when it is empty. It sorts its argument's copy.
func median(values []float64) float64 {
	s := sorted(values)
	n := len(s)
	if n == 0 {
		return math.NaN()
	}
	return (s[(n-1)/2] + s[n/2]) / 2
}

// grouped writes a whole number with thin spaces between groups of three
// digits when it has more than four.
func grouped(n int) string {
	s := strconv.Itoa(n)
	if len(s) < 5 {
		return s
	}
	var b strings.Builder
	for i, r := range s {
		if i > 0 && (len(s)-i)%3 == 0 && s[i-1] != '-' {
			b.WriteRune('\u202f')
		}
		b.WriteRune(r)
	}
	return b.String()
}
