package figure

import (
	"bytes"
	"encoding/xml"
	"errors"
	"flag"
	"io"
	"math"
	"os"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"rimlight/steps/diagnose"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// write names a folder into which the test drawings are written, to be looked at.
var write = flag.String("write", "", "write the figures of a large scene into this folder")

// titles are the axis titles that each figure must carry.
var titles = map[string][]string{
	"map":       {"Wavelength (µm)", "Time from BJD_TDB 2460123.44996 (h)", "Relative flux − 1 (%)", "masked"},
	"detrended": {"Wavelength (µm)", "Time from BJD_TDB 2460123.44996 (h)", "Relative flux − 1 (%)", "masked"},
	"white":     {"Relative flux", "Residual (ppm)", "Time from mid-transit (h)"},
	"grid":      {"Relative flux", "Time from mid-transit (h)"},
	"scatter":   {"Bin length (min)", "Rms of binned residuals (ppm)", "White light", "Channels", "Uncorrelated noise"},
	"limb":      {"Wavelength (µm)", "Limb-darkening coefficient", "u₁", "u₂"},
	"spectrum":  {"Wavelength (µm)", "Transit depth (ppm)"},
}

// sizeLimit is the largest SVG that a figure may have, in bytes.
const sizeLimit = 150_000

func TestFigures(t *testing.T) {
	large := newScene(3000, 80)
	for _, d := range drawings() {
		t.Run(d.name, func(t *testing.T) {
			f, err := d.draw(large)
			if err != nil {
				t.Fatal(err)
			}
			checkFigure(t, f)
			words := texts(t, f.SVG)
			for _, want := range titles[d.name] {
				if !words[want] {
					t.Errorf("no text %q in the drawing", want)
				}
			}
			if len(f.SVG) > sizeLimit {
				t.Errorf("%d bytes; expected at most %d", len(f.SVG), sizeLimit)
			}
			again, err := d.draw(newScene(3000, 80))
			if err != nil || again.SVG != f.SVG || again.Caption != f.Caption || again.Alt != f.Alt {
				t.Errorf("drawn again it differs (%v)", err)
			}
			if *write != "" {
				if err := os.WriteFile(*write+"/"+d.name+".svg", []byte(f.SVG), 0o644); err != nil {
					t.Error(err)
				}
			}
		})
	}
}

// checkFigure holds what must be true of every figure.
func checkFigure(t *testing.T, f Figure) {
	t.Helper()
	if f.Title == "" || f.Caption == "" || f.Alt == "" {
		t.Errorf("title %q, caption %q, alternative %q; expected words in each", f.Title, f.Caption, f.Alt)
	}
	for _, text := range []string{f.Caption, f.Alt} {
		if !strings.HasSuffix(text, ".") || strings.Contains(text, "NaN") || strings.Contains(text, "Inf") || strings.Contains(text, "%!") || strings.Contains(text, "  ") {
			t.Errorf("not fit to be read: %q", text)
		}
	}
	if err := f.Data.Check(); err != nil {
		t.Error(err)
	}
	if f.Data.Rows() == 0 || f.Data.Title == "" {
		t.Errorf("no numbers behind the picture: %q", f.Data.Title)
	}
	texts(t, f.SVG)
	drawn := regexp.MustCompile(`data:image/png;base64,[A-Za-z0-9+/=]+`).ReplaceAllString(f.SVG, "")
	for _, bad := range []string{"NaN", "Inf", "<script", "url(", "@import", "data:", "<?xml", "font-variant"} {
		if strings.Contains(drawn, bad) {
			t.Errorf("the drawing holds %q", bad)
		}
	}
	links := strings.Count(drawn, "http")
	if names := strings.Count(drawn, `xmlns="http://www.w3.org/2000/svg"`) + strings.Count(drawn, `xmlns:xlink="http://www.w3.org/1999/xlink"`); links != names {
		t.Errorf("%d addresses beside the %d names of the format", links-names, names)
	}
	for _, size := range regexp.MustCompile(`font-size:([0-9.]+)px`).FindAllStringSubmatch(drawn, -1) {
		if x, err := strconv.ParseFloat(size[1], 64); err != nil || x < 6.5 || x > 8 {
			t.Errorf("type of %s points; expected 6.5 to 8", size[1])
		}
	}
}

// texts parses a drawing as XML and returns its texts.
func texts(t *testing.T, svg string) map[string]bool {
	t.Helper()
	out := map[string]bool{}
	decoder := xml.NewDecoder(strings.NewReader(svg))
	inText := false
	for {
		token, err := decoder.Token()
		if errors.Is(err, io.EOF) {
			return out
		}
		if err != nil {
			t.Fatalf("the drawing is not XML: %v", err)
		}
		switch token := token.(type) {
		case xml.StartElement:
			inText = token.Name.Local == "text"
		case xml.CharData:
			if inText {
				out[string(token)] = true
			}
		case xml.EndElement:
			inText = false
		}
	}
}

// spoiled returns scenes that no real data should give, by name.
func spoiled() map[string]scene {
	out := map[string]scene{
		"empty":            {},
		"one channel":      newScene(200, 1),
		"two channels":     newScene(200, 2),
		"one integration":  newScene(1, 3),
		"two integrations": newScene(2, 3),
	}
	masked := newScene(100, 4)
	for j := range masked.cube.Mask {
		for i := range masked.cube.Mask[j] {
			masked.cube.Mask[j][i] = lightcurve.Missing // shared with the fits
		}
	}
	for i := range masked.fits[0].Mask {
		masked.fits[0].Mask[i] = lightcurve.Missing
	}
	for k := range masked.points {
		masked.points[k] = spectrum.Point{Channel: masked.points[k].Channel, Depth: nan, DepthErr: nan, Flag: "masked"}
	}
	out["all masked"] = masked
	fill := func(name string, values ...float64) {
		s := newScene(100, 4)
		k := 0
		next := func() float64 { k++; return values[k%len(values)] }
		for j := range s.cube.Flux {
			for i := range s.cube.Flux[j] {
				s.cube.Flux[j][i], s.cube.Err[j][i] = next(), next()
			}
		}
		for _, f := range s.fits {
			for i := range f.Flux {
				f.Flux[i], f.Err[i], f.Transit[i], f.Trend[i] = next(), next(), next(), next()
			}
		}
		for i := range s.points {
			s.points[i].Depth, s.points[i].DepthErr, s.points[i].Limb = next(), math.Abs(next()), []float64{next(), next(), next()}
		}
		out[name] = s
	}
	fill("not a number", nan)
	fill("zeros", 0)
	fill("ones", 1)
	fill("infinite", math.Inf(1))
	fill("huge", 1e308, -1e308, 1e307)
	fill("tiny", 5e-324, 1e-310, -5e-324)
	fill("all sorts", nan, 0, 1, math.Inf(-1), 1e300, -1e-300, 0.99, math.Inf(1), 1.01, -3, 5e-324, 1e9)
	for name, value := range map[string]float64{"times missing": nan, "times infinite": math.Inf(1), "times equal": 5, "times huge": 1e300} {
		s := newScene(100, 4)
		for i := range s.cube.Time {
			s.cube.Time[i], s.fits[0].Time[i] = value, value // shared with the other fits
		}
		out[name] = s
	}
	some := newScene(100, 4)
	some.cube.Time[50], some.fits[0].Time[50], some.fits[0].Mid, some.fits[1].Mid = nan, nan, nan, nan
	some.cube.Time[99] = 1e12
	out["some times wild"] = some
	bare := newScene(100, 4)
	for i := range bare.points {
		bare.points[i].Limb, bare.points[i].LimbErr = nil, nil
	}
	out["nothing about limb darkening"] = bare
	return out
}

func TestFiguresOfSpoiledData(t *testing.T) {
	for name, s := range spoiled() {
		for _, d := range drawings() {
			if d.name == "spectrum" && len(s.points) == 0 {
				continue // there is no spectrum to be drawn
			}
			t.Run(name+"/"+d.name, func(t *testing.T) {
				f, err := d.draw(s)
				if err != nil {
					if !strings.HasPrefix(err.Error(), "figure of ") || f.SVG != "" {
						t.Errorf("error %q, drawing of %d bytes", err, len(f.SVG))
					}
					return
				}
				checkFigure(t, f)
			})
		}
	}
}

// TestFiguresThatMustBeDrawn: input that is small or partly spoiled is drawn.
func TestFiguresThatMustBeDrawn(t *testing.T) {
	all := spoiled()
	for _, name := range []string{"one channel", "two channels", "some times wild"} {
		for _, d := range drawings() {
			if _, err := d.draw(all[name]); err != nil {
				t.Errorf("%s, %s: %v", name, d.name, err)
			}
		}
	}
	if _, err := Map(all["one integration"].cube); err != nil {
		t.Error(err)
	}
}

func TestFiguresRefuseWrongShapes(t *testing.T) {
	s := newScene(50, 3)
	short := s.cube.Clone()
	short.Flux[1] = short.Flux[1][:49]
	if _, err := Map(short); err == nil || !strings.Contains(err.Error(), "channel 1 has 49 fluxes") {
		t.Errorf("error %v", err)
	}
	few := s.cube.Clone()
	few.Mask = few.Mask[:2]
	if _, err := Map(few); err == nil || !strings.Contains(err.Error(), "2 of flags") {
		t.Errorf("error %v", err)
	}
	other := newScene(40, 3)
	if _, err := Detrended(append(s.channels(), other.channels()...)); err == nil || !strings.Contains(err.Error(), "do not share their times") {
		t.Errorf("error %v", err)
	}
	reversed := s.cube.Clone()
	reversed.Channels[2].Hi = 0
	if _, err := Map(reversed); err == nil || !strings.Contains(err.Error(), "expected an interval") {
		t.Errorf("error %v", err)
	}
	fits := s.channels()
	fits[1].Channel.Lo = nan
	if _, err := Detrended(fits); err == nil || !strings.Contains(err.Error(), "expected an interval") {
		t.Errorf("error %v", err)
	}
	broken := s.white()
	broken.Trend = nil
	if _, err := WhiteFit(broken); err == nil || !strings.Contains(err.Error(), "has 0 trend values") {
		t.Errorf("error %v", err)
	}
	if _, err := BinnedScatter(broken, nil); err == nil || !strings.Contains(err.Error(), "has 0 trend values") {
		t.Errorf("error %v", err)
	}
	for what, spoil := range map[string]func(*diagnose.Summary){
		"has 49 mean times":        func(s *diagnose.Summary) { s.Flux.Time = s.Flux.Time[1:] },
		"has 0 counts of samples":  func(s *diagnose.Summary) { s.Flux.Samples = nil },
		"has 0 values of the mode": func(s *diagnose.Summary) { s.Model = nil },
		"scatters of white noise":  func(s *diagnose.Summary) { s.Binning.White = s.Binning.White[:1] },
		"has 400 intervals":        func(s *diagnose.Summary) { s.Flux.Value = make([]float64, 400) },
	} {
		fits := s.channels()
		spoil(&fits[1])
		for _, draw := range []func() (Figure, error){
			func() (Figure, error) { return ChannelGrid(fits, nil) },
			func() (Figure, error) { return BinnedScatter(s.white(), fits) },
			func() (Figure, error) { return Detrended(fits) },
		} {
			if _, err := draw(); err == nil || !strings.Contains(err.Error(), what) {
				t.Errorf("error %v, expected %q", err, what)
			}
		}
	}
}

// TestSpectrumGolden pins the bytes of a small figure.
func TestSpectrumGolden(t *testing.T) {
	var all []spectrum.Point
	for j, depth := range []float64{0.0101, 0.0102, nan, 0.0104, 0.0103, 0.2} {
		p := spectrum.Point{Channel: lightcurve.Channel{Index: j, Lo: 1 + 0.5*float64(j), Hi: 1.5 + 0.5*float64(j)}, Depth: depth, DepthErr: 5e-5}
		if j == 3 {
			p.Flag = "doubtful"
		}
		all = append(all, p)
	}
	s, err := spectrum.Assemble(all, nil)
	if err != nil {
		t.Fatal(err)
	}
	f, err := Spectrum(s)
	if err != nil {
		t.Fatal(err)
	}
	checkFigure(t, f)
	for _, want := range []string{"1 depth has a flag (hollow).", "1 channel has no depth", "1 depth has a value beyond the range shown"} {
		if !strings.Contains(f.Caption, want) {
			t.Errorf("caption %q; want %q in it", f.Caption, want)
		}
	}
	const path = "../../testdata/figure/spectrum.svg"
	if *update {
		if err := os.WriteFile(path, []byte(f.SVG), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal([]byte(f.SVG), want) {
		t.Errorf("%s differs; look at the figure and run the test with -update", path)
	}
}

func TestCaptionsCount(t *testing.T) {
	s := newScene(3000, 80)
	for _, tc := range []struct{ drawing, want string }{
		{"map", "3000 integrations in 80 channels from 0.6 to 5.2 µm"},
		{"map", "3 channels without a usable sample"},
		{"detrended", "3 channels without a usable sample"},
		{"white", "2992 integrations fitted, 8 masked"},
		{"grid", "24 channels, chosen evenly among the 77"},
		{"scatter", "the white light curve and 77 channels"},
		{"limb", "77 channels"},
		{"spectrum", "77 channels of 80"},
	} {
		for _, d := range drawings() {
			if d.name != tc.drawing {
				continue
			}
			if f, err := d.draw(s); err != nil || !strings.Contains(f.Caption, tc.want) {
				t.Errorf("%s: %v, %q; want %q in it", d.name, err, f.Caption, tc.want)
			}
		}
	}
}

func BenchmarkFigures(b *testing.B) {
	large := newScene(6000, 120)
	for _, d := range drawings() {
		b.Run(d.name, func(b *testing.B) {
			for range b.N {
				if _, err := d.draw(large); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
