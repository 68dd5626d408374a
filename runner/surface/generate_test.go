package surface

import (
	"hash/fnv"
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
)

// A generator makes the arguments of one job.
type generator struct {
	*rand.Rand
	samples *samples
	makers  map[reflect.Type][]target // targets that return values of types with hidden fields
}

func newGenerator(j job, s *samples, makers map[reflect.Type][]target) *generator {
	h := fnv.New64a()
	h.Write([]byte(j.Target))
	return &generator{Rand: rand.New(rand.NewPCG(j.Seed, h.Sum64())), samples: s, makers: makers}
}

// A bomb is what the generated functions panic with: not the library's doing.
type bomb struct{}

var (
	hostileFloats = []float64{
		0, math.Copysign(0, -1), 1, -1, math.NaN(), math.Inf(1), math.Inf(-1),
		math.MaxFloat64, -math.MaxFloat64, math.SmallestNonzeroFloat64, 1e-310, 1e-200, 1e-30, 1e-16,
		1e16, 1e19, 1e30, 1e100, 1e155, 1e300, -1e300, math.MaxInt64, math.MinInt64, 1 << 31, 1 << 53,
	}
	plausibleFloats = []float64{
		0.001, 0.01, 0.02, 0.05, 0.1, 0.12, 0.3, 0.5, 0.9, 0.95, 0.99, 0.999, 1.2, 1.5, 2, 3, 3.2147, 5, 9.5,
		10, 20, 30, 60, 87.7, 90, 100, 300, 1000, 2460512.3, 2460512.35, 2460512.5, -0.1, -2, math.Pi, math.Pi / 2,
	}
	hostileInts   = []int64{0, -1, 1, 2, -2, 100, 1000, 65536, 1e6, 1e9, 1 << 31, 1 << 40, 1 << 62, math.MaxInt64, math.MinInt64}
	plausibleInts = []int64{1, 2, 3, 4, 5, 6, 7, 9, 10, 11, 21, 24, 50}

	hostileStrings = []string{
		"", " ", "\x00", "\xff\xfe", "a\xc3", "\n", "a,b", `"`, "%s%d", "%999999999d", "<script>", "]]>&", "\u202e", "é", "\U0001f600",
		strings.Repeat("x", 100), strings.Repeat("long ", 2000), strings.Repeat("ü", 5000), "../../etc/passwd", "NaN", "1e999", "$\\frac{1}{2}$",
	}
	plausibleStrings = []string{
		"", "quadratic", "linear", "uniform", "free", "fixed", "prior", "fitted", "published", "tested", "U", "N", "TN", "logU", "=",
		"period", "midTransit", "midTransitOffset", "axisRatio", "inclination", "impact", "eccentricity", "periastron", "radiusRatio",
		"u1", "u2", "q1", "q2", "settlingTime", "trend.constant", "X", "Y", "airmass", "TIME", "FLUX", "FLUX_ERR", "WAVE_LO", "WAVE_HI",
		"d", "s", "min", "um", "nm", "deg", "rad", "pix", "converged", "time", "settling", "constant", "1", "LIGHTCURVES", "CHANNELS", "white light",
	}
)

// arguments makes arguments for a target: mostly samples of which a few fields
// are spoiled.
func (g *generator) arguments(of target, depth int) []reflect.Value {
	args := make([]reflect.Value, len(of.In))
	for i, t := range of.In {
		args[i] = reflect.New(t).Elem()
		pool := g.samples.of(of.Name, i, t)
		if len(pool) > 0 && g.Float64() < 0.93 {
			args[i].Set(clone(pool[g.IntN(len(pool))]))
		} else {
			g.fill(args[i], depth)
		}
	}
	if len(args) == 0 {
		return args
	}
	spoils := [...]int{0, 0, 1, 1, 1, 1, 1, 2, 2, 3, 5, 9}
	for range spoils[g.IntN(len(spoils))] {
		g.spoil(args[g.IntN(len(args))])
	}
	return args
}

// fill sets v, which is settable, to a value made from nothing.
func (g *generator) fill(v reflect.Value, depth int) {
	switch v.Kind() {
	case reflect.Bool:
		v.SetBool(g.IntN(2) == 0)
	case reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
		v.SetInt(g.integer())
	case reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64:
		v.SetUint(uint64(g.integer()))
	case reflect.Float32, reflect.Float64:
		v.SetFloat(g.float())
	case reflect.Complex64, reflect.Complex128:
		v.SetComplex(complex(g.float(), g.float()))
	case reflect.String:
		v.SetString(g.text())
	case reflect.Slice:
		lengths := [...]int{0, 1, 2, 3, 5, 8, 72}
		n := lengths[g.IntN(len(lengths))]
		if depth > 1 {
			n = min(n, 3)
		}
		v.Set(reflect.MakeSlice(v.Type(), n, n))
		for i := range n {
			g.fillFromSample(v.Index(i), depth+1)
		}
	case reflect.Array:
		for i := range v.Len() {
			g.fillFromSample(v.Index(i), depth+1)
		}
	case reflect.Struct:
		if hidden(v.Type()) {
			g.make(v, depth)
			return
		}
		for i := range v.NumField() {
			g.fillFromSample(v.Field(i), depth+1)
		}
	case reflect.Pointer:
		if g.IntN(8) == 0 {
			return // nil
		}
		if !g.make(v, depth) || g.IntN(8) == 0 {
			v.Set(reflect.New(v.Type().Elem()))
		}
	case reflect.Map:
		if g.IntN(8) == 0 {
			return
		}
		v.Set(reflect.MakeMap(v.Type()))
		for range g.IntN(4) {
			key, value := reflect.New(v.Type().Key()).Elem(), reflect.New(v.Type().Elem()).Elem()
			g.fill(key, depth+1)
			g.fill(value, depth+1)
			v.SetMapIndex(key, value)
		}
	case reflect.Func:
		g.function(v, depth)
	}
}

// fillFromSample is fill, but takes a sample of the type half of the time.
func (g *generator) fillFromSample(v reflect.Value, depth int) {
	if pool := g.samples.byType[v.Type()]; len(pool) > 0 && g.IntN(2) == 0 {
		v.Set(clone(pool[g.IntN(len(pool))]))
		return
	}
	g.fill(v, depth)
}

// make sets v to what a target returns; it reports whether there is one.
func (g *generator) make(v reflect.Value, depth int) bool {
	makers := g.makers[v.Type()]
	if len(makers) == 0 || depth > 2 {
		return false
	}
	maker := makers[g.IntN(len(makers))]
	for _, out := range maker.call(g.arguments(maker, depth+1)) {
		if out.Type() == v.Type() {
			v.Set(out)
		}
	}
	return true
}

// function sets v to a function that returns new values at each call, or
// panics at some calls.
func (g *generator) function(v reflect.Value, depth int) {
	t := v.Type()
	panics := g.IntN(8) == 0
	if g.IntN(16) == 0 {
		return // nil
	}
	v.Set(reflect.MakeFunc(t, func(args []reflect.Value) []reflect.Value {
		if panics && g.IntN(4) == 0 {
			panic(bomb{})
		}
		out := make([]reflect.Value, t.NumOut())
		for i := range out {
			out[i] = reflect.New(t.Out(i)).Elem()
			// Most often what came in, the right shape for a model.
			for _, a := range args {
				if a.Type() == t.Out(i) && g.IntN(4) != 0 {
					out[i].Set(clone(a))
				}
			}
			if out[i].IsZero() {
				g.fill(out[i], depth+1)
			}
		}
		return out
	}))
}

func (g *generator) float() float64 {
	switch g.IntN(4) {
	case 0:
		return hostileFloats[g.IntN(len(hostileFloats))]
	case 1:
		return g.NormFloat64() * math.Pow(10, float64(g.IntN(12)-6))
	}
	return plausibleFloats[g.IntN(len(plausibleFloats))]
}

func (g *generator) integer() int64 {
	if g.IntN(2) == 0 {
		return hostileInts[g.IntN(len(hostileInts))]
	}
	return plausibleInts[g.IntN(len(plausibleInts))]
}

func (g *generator) text() string {
	if g.IntN(2) == 0 {
		return hostileStrings[g.IntN(len(hostileStrings))]
	}
	return plausibleStrings[g.IntN(len(plausibleStrings))]
}

// hidden reports whether a struct has fields that only its package can set.
func hidden(t reflect.Type) bool {
	for i := range t.NumField() {
		if !t.Field(i).IsExported() {
			return true
		}
	}
	return false
}

// clone returns a copy of v that shares no memory with it.
func clone(v reflect.Value) reflect.Value {
	out := reflect.New(v.Type()).Elem()
	out.Set(v)
	switch v.Kind() {
	case reflect.Slice:
		if v.IsNil() {
			break
		}
		out.Set(reflect.MakeSlice(v.Type(), v.Len(), v.Len()))
		if composed(v.Type().Elem()) {
			for i := range v.Len() {
				out.Index(i).Set(clone(v.Index(i)))
			}
		} else {
			reflect.Copy(out, v)
		}
	case reflect.Struct:
		if hidden(v.Type()) {
			break
		}
		for i := range v.NumField() {
			if composed(v.Field(i).Type()) {
				out.Field(i).Set(clone(v.Field(i)))
			}
		}
	}
	return out
}

func composed(t reflect.Type) bool {
	return t.Kind() == reflect.Slice || t.Kind() == reflect.Struct
}
