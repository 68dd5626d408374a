package surface

import (
	"reflect"
	"slices"
	"strings"

	"rimlight/runner/program/available"
	"rimlight/runner/program/symbols"
)

// A target is one thing that a recipe can call. A method has its receiver as
// the first argument.
type target struct {
	Name string // "lightcurve.White", "fit.Model.Equation"
	Func reflect.Value
	In   []reflect.Type
	Out  []reflect.Type
}

// targets lists every exported function of the step library and every exported
// method of its types, in order of name.
func targets() []target {
	var all []target
	for _, p := range available.Packages {
		if !available.IsStep(p.Path) {
			continue
		}
		for name, symbol := range symbols.Table[p.Path+"/"+p.Name] {
			if name[0] == '_' || available.Withheld(p.Path+"."+name) != "" {
				continue
			}
			switch t := symbol.Type(); {
			case t.Kind() == reflect.Func:
				all = append(all, newTarget(p.Name+"."+name, symbol))
			case t.Kind() == reflect.Pointer && symbol.IsNil():
				all = append(all, methods(p.Name+"."+name, t)...)
			}
		}
	}
	slices.SortFunc(all, func(a, b target) int { return strings.Compare(a.Name, b.Name) })
	return all
}

// methods lists the methods of the type that t points to, those with the value
// itself as receiver on it, the others on the pointer.
func methods(name string, t reflect.Type) []target {
	var all []target
	for i := range t.NumMethod() {
		m := t.Method(i)
		if onValue, ok := t.Elem().MethodByName(m.Name); ok {
			m = onValue
		}
		all = append(all, newTarget(name+"."+m.Name, m.Func))
	}
	return all
}

func newTarget(name string, f reflect.Value) target {
	t := target{Name: name, Func: f}
	for i := range f.Type().NumIn() {
		t.In = append(t.In, f.Type().In(i))
	}
	for i := range f.Type().NumOut() {
		t.Out = append(t.Out, f.Type().Out(i))
	}
	return t
}

// call calls the target; a variadic parameter is the slice of its arguments.
func (t target) call(args []reflect.Value) []reflect.Value {
	if t.Func.Type().IsVariadic() {
		return t.Func.CallSlice(args)
	}
	return t.Func.Call(args)
}

// rare are targets that take a millisecond or more and get three calls where
// others get eight. It is for the running time alone.
var rare = []string{
	"fit.White", "fit.WhiteOrbit", "fit.Channel", "fit.WhiteWith", "fit.ChannelWith", "fit.Function", "fit.Sample", "fit.SampleWith", "simulate.Make", "figure.",
	"sample.NUTS", "sample.Ensemble", "sample.Nested",
}

func (t target) weight() int {
	for _, r := range rare {
		if t.Name == r || strings.HasSuffix(r, ".") && strings.HasPrefix(t.Name, r) {
			return 3
		}
	}
	return 8
}

// A job is one call: the target and the number that its arguments follow from.
type job struct {
	Target string
	Seed   uint64
}

// schedule gives the jobs number from to from+n-1 of the endless list in which
// the targets whose name contains only take turns.
func schedule(all []target, only string, from uint64, n int) []job {
	var round []string
	for turn := range 8 {
		for _, t := range all {
			if strings.Contains(t.Name, only) && turn < t.weight() {
				round = append(round, t.Name)
			}
		}
	}
	if len(round) == 0 {
		return nil
	}
	jobs := make([]job, n)
	for i := range jobs {
		at := from + uint64(i)
		jobs[i] = job{Target: round[at%uint64(len(round))], Seed: at}
	}
	return jobs
}
