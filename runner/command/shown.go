package command

import (
	"io"
	"reflect"

	"rimlight/reports"
	"rimlight/runner/canon"
	"rimlight/runner/engine"
	"rimlight/steps/check"
	"rimlight/steps/diagnose"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
	"rimlight/steps/spectrum"
	"rimlight/steps/table"
)

// shown are the library's result types, by the Go type that recipes know them
// by. Values of other types are decoded without their Go type.
var shown = types(
	check.Check{}, diagnose.Summary{}, figure.Figure{}, fit.CurveFit{}, fit.Model{}, fit.Posterior{}, fit.Sampled{}, fit.Quantity{}, lightcurve.Channel{}, lightcurve.Cube{}, lightcurve.Curve{},
	limbtable.Table{}, spectrum.Point{}, spectrum.Spectrum{}, table.Table{}, false, 0, 0.0, "",
)

func types(samples ...any) map[string]reflect.Type {
	out := map[string]reflect.Type{}
	for _, s := range samples {
		t := reflect.TypeOf(s)
		name := t.String()
		if p := t.PkgPath(); p != "" {
			name = p + "." + t.Name()
		}
		out[name] = t
		out["[]"+name] = reflect.SliceOf(t)
	}
	return out
}

// maxShown is the largest value, in bytes, that is decoded without its Go
// type: such values are shown as trees, which grow in memory.
const maxShown = 4 << 20

// passed are fields that the report has no use for, of types that are mass data.
// They are passed over.
var passed = map[string][]string{
	"rimlight/steps/lightcurve.Cube":  {"Flux", "Err"},
	"rimlight/steps/lightcurve.Curve": {"Flux", "Err"},
}

// A reading hands over the parts of a result: the elements of a list, or else
// the result as one part. It may begin again at part 0.
type reading func(each eachPart) error

type eachPart = func(i int, p engine.Part) error

// shownValue turns a result into Go for the report; nil when it is not to be
// shown. It has n parts, or is no list when n is negative. Of light curves and
// fits only the sum of what they hold stays in memory. The result is read as a
// whole, also when little of it is shown, so that damage to it is found. The
// error is that of reading.
func shownValue(typ string, n int, read reading) (any, error) {
	var out any
	var err error
	slice, known := shown[typ]
	sum, isLight := reports.Lights(typ)
	switch {
	case n < 0:
		err = read(func(_ int, p engine.Part) error { out = decode(p); return nil })
	case isLight:
		err = read(func(i int, p engine.Part) error {
			if i == 0 {
				sum, _ = reports.Lights(typ)
			}
			if one, ok := reports.LightOf(decode(p)); ok {
				sum.Add(one)
			}
			return nil
		})
		out = sum
	case known:
		out, err = shownSlice(slice, n, read)
	default:
		out, err = shownTree(read)
	}
	if err != nil {
		return nil, err
	}
	if l, ok := reports.LightOf(out); ok {
		return l, nil
	}
	return out, nil
}

// shownSlice decodes a list of a type that is known here; nil when it has
// another layout than it has here.
func shownSlice(slice reflect.Type, n int, read reading) (any, error) {
	list := reflect.MakeSlice(slice, n, n)
	good := true
	err := read(func(i int, p engine.Part) error {
		one := decode(p)
		if good = i < n && reflect.TypeOf(one) == slice.Elem() && (good || i == 0); good {
			list.Index(i).Set(reflect.ValueOf(one))
		}
		return nil
	})
	if err != nil || !good {
		return nil, err
	}
	return list.Interface(), nil
}

// shownTree decodes a list of a type that is not known here; nil when it is too
// large.
func shownTree(read reading) (any, error) {
	var tree []any
	size := int64(0)
	err := read(func(i int, p engine.Part) error {
		if i == 0 {
			tree, size = nil, 0
		}
		if size += p.Size; size <= maxShown {
			tree = append(tree, decode(p))
		}
		return nil
	})
	if err != nil || size > maxShown {
		return nil, err
	}
	return tree, nil
}

// decode turns a kept value into Go; nil when it is not to be shown.
func decode(p engine.Part) any {
	if t, ok := shown[p.Type]; ok {
		if want, err := canon.Layout(t); err == nil && want == p.Layout {
			v := reflect.New(t).Elem()
			if canon.ReadSealed(p, p.Size, v, passed[p.Type]...) != nil {
				return nil
			}
			return v.Interface()
		}
	}
	if p.Size > maxShown {
		return nil
	}
	b, err := io.ReadAll(p)
	if err != nil {
		return nil
	}
	_, _, data, err := canon.Open(b)
	if err != nil {
		return nil
	}
	v, err := canon.Tree(data, maxShown)
	if err != nil {
		return nil
	}
	return v
}
