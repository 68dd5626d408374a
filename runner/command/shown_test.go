package command

import (
	"bytes"
	"reflect"
	"strings"
	"testing"

	"rimlight/reports"
	"rimlight/runner/canon"
	"rimlight/runner/engine"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/spectrum"
)

// listOf seals the elements of a list, and gives its type, length and reading, which
// begins twice, as it does when something has to be mended.
func listOf[T any](t *testing.T, typ string, items ...T) (slice string, n int, read reading) {
	t.Helper()
	layout, err := canon.Layout(reflect.TypeFor[T]())
	if err != nil {
		t.Fatal(err)
	}
	return "[]" + typ, len(items), func(each eachPart) error {
		for attempt := range 2 {
			for i, item := range items {
				if attempt == 0 && i > len(items)/2 {
					break
				}
				b, err := canon.Marshal(item)
				if err != nil {
					return err
				}
				b = canon.Seal(typ, layout, b)
				if err := each(i, engine.Part{Type: typ, Layout: layout, Size: int64(len(b)), Reader: bytes.NewReader(b)}); err != nil {
					return err
				}
			}
		}
		return nil
	}
}

func TestShownValue(t *testing.T) {
	points := []spectrum.Point{{Depth: 0.01, Flag: "a"}, {Depth: 0.02}, {Depth: 0.03}}
	typ, n, read := listOf(t, "rimlight/steps/spectrum.Point", points...)
	if got, err := shownValue(typ, n, read); err != nil || !reflect.DeepEqual(got, points) {
		t.Errorf("points are shown as %+v", got)
	}
	typ, n, read = listOf(t, "rimlight/steps/spectrum.Point", struct{ Depth float64 }{1}, struct{ Depth float64 }{2})
	if got, err := shownValue(typ, n, read); err != nil || got != nil {
		t.Errorf("points of another layout are shown as %+v", got)
	}
	fits := []fit.CurveFit{{Channel: lightcurve.Channel{Index: 4, Lo: 1, Hi: 2}, Time: []float64{1, 2}}, {Channel: lightcurve.Channel{Index: 5, Lo: 2, Hi: 3}}, {}}
	typ, n, read = listOf(t, "rimlight/steps/fit.CurveFit", fits...)
	want, _ := reports.LightOf(fits)
	got, err := shownValue(typ, n, read)
	if got, ok := got.(reports.Light); err != nil || !ok || got.Integrations != want.Integrations || !reflect.DeepEqual(got.Channels, want.Channels) || len(got.Scatter) != 3 {
		t.Errorf("fits are shown as %+v, expected %+v", got, want)
	}
	typ, n, read = listOf(t, "main.pair", struct{ A, B int }{1, 2}, struct{ A, B int }{3, 4})
	if got, err := shownValue(typ, n, read); err != nil || !reflect.DeepEqual(got, []any{map[string]any{"A": int64(1), "B": int64(2)}, map[string]any{"A": int64(3), "B": int64(4)}}) {
		t.Errorf("values of a recipe's own type are shown as %+v", got)
	}
	large := struct{ A string }{strings.Repeat("x", maxShown/2+1)}
	typ, n, read = listOf(t, "main.text", large, large)
	if got, err := shownValue(typ, n, read); err != nil || got != nil {
		t.Error("a large value of a recipe's own type is shown")
	}
}

// TestPassedFields holds that the report has no use for the fields that it
// passes over.
func TestPassedFields(t *testing.T) {
	cube := lightcurve.Cube{Time: []float64{1, 2}, Channels: []lightcurve.Channel{{Index: 1, Lo: 1, Hi: 2}}, Flux: [][]float64{{1, 2}}, Err: [][]float64{{1, 1}},
		Mask: [][]lightcurve.Flag{{0, lightcurve.Outlier}}, Aux: []lightcurve.Series{{Name: "X", Value: []float64{1, 2}}}}
	curve := lightcurve.Curve{Channel: cube.Channels[0], Time: cube.Time, Flux: cube.Flux[0], Err: cube.Err[0], Mask: cube.Mask[0], Aux: cube.Aux}
	_, _, cubes := listOf(t, "rimlight/steps/lightcurve.Cube", cube)
	_, _, curves := listOf(t, "rimlight/steps/lightcurve.Curve", curve)
	for typ, c := range map[string]struct {
		value any
		read  reading
	}{"rimlight/steps/lightcurve.Cube": {cube, cubes}, "rimlight/steps/lightcurve.Curve": {curve, curves}} {
		want, _ := reports.LightOf(c.value)
		if got, err := shownValue(typ, -1, c.read); err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("%s is shown as %+v, %v, expected %+v", typ, got, err, want)
		}
	}
}
