package figure

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"rimlight/steps/lightcurve"
)

// Factors from fractions to what is shown.
const (
	perMillion = 1e6
	perCent    = 1e2
	hours      = 24 // per day
	minutes    = 60 // per hour
)

// nan stands for a number that there is none of.
var nan = math.NaN()

// waveTitle is the title of axes of wavelength.
const waveTitle = "Wavelength (µm)"

// plain writes x with that many significant digits, without an exponent and
// without digits that are not significant; "unknown" when it is not finite.
func plain(x float64, digits int) string {
	if !finite(x) {
		return "unknown"
	}
	if x == 0 {
		return "0"
	}
	power := int(math.Floor(math.Log10(math.Abs(x))))
	if power > 15 || power < -9 {
		return strconv.FormatFloat(x, 'g', digits, 64)
	}
	if above := power - digits + 1; above > 0 {
		scale := math.Pow(10, float64(above))
		return decimal(math.Round(x/scale)*scale, 0)
	}
	return strings.ReplaceAll(strconv.FormatFloat(x, 'f', digits-1-power, 64), "-", "−")
}

// ppm writes a fraction in parts per million, with at least the unit's digit.
func ppm(x float64) string {
	x *= perMillion
	if math.Abs(x) >= 100 {
		return wholeNumber(x) + " ppm"
	}
	return plain(x, 2) + " ppm"
}

// wholeNumber writes x rounded to a whole number; "unknown" when it is not finite.
func wholeNumber(x float64) string {
	if !finite(x) {
		return "unknown"
	}
	return strings.ReplaceAll(strconv.FormatFloat(math.Round(x), 'f', 0, 64), "-", "−")
}

// counted writes a number and the noun it counts, which has a regular plural.
func counted(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return strconv.Itoa(n) + " " + noun + "s"
}

// ppmWithError writes a depth and its error.
func ppmWithError(depth, err float64) string {
	return wholeNumber(depth*perMillion) + " ± " + ppm(err)
}

// whichHave says what some of the things shown have, nothing when there are none.
func whichHave(n int, noun, has string) string {
	switch n {
	case 0:
		return ""
	case 1:
		return "1 " + noun + " has " + has + "."
	}
	return counted(n, noun) + " have " + has + "."
}

// wave writes the middle of a channel in um.
func wave(c lightcurve.Channel) string {
	return strconv.FormatFloat((c.Lo+c.Hi)/2, 'f', 3, 64)
}

// waveRange writes a range of wavelengths.
func waveRange(lo, hi float64) string {
	return trimmed(lo) + " to " + trimmed(hi) + " µm"
}

// trimmed writes a wavelength in um with up to four decimals.
func trimmed(x float64) string {
	return strings.TrimSuffix(strings.TrimRight(strconv.FormatFloat(x, 'f', 4, 64), "0"), ".")
}

// listed joins the first of some words, and says how many more there are.
func listed(words []string, limit int) string {
	if len(words) <= limit {
		return strings.Join(words, ", ")
	}
	return fmt.Sprintf("%s and %d more", strings.Join(words[:limit], ", "), len(words)-limit)
}

// sentences joins those that are not empty.
func sentences(all ...string) string {
	var kept []string
	for _, s := range all {
		if s != "" {
			kept = append(kept, s)
		}
	}
	return strings.Join(kept, " ")
}
