package canon

import (
	"bytes"
	"math"
	"sort"
	"strconv"
	"strings"
)

// flagField is the field of a structure that can say why there is no result.
const flagField = "Flag"

// telling are the fields that say what a structure is about.
var telling = map[string]bool{"Channel": true, "Index": true, "Name": true}

// maxGap is the most bytes that a gap takes: fixed arrays can be of any length.
const maxGap = 1 << 20

// Flagged reports whether values of a layout are structures with a text field
// Flag, which can say of themselves that, and why, they hold no result.
func Flagged(layout string) bool {
	fields, ok := fieldsOf(layout)
	if !ok {
		return false
	}
	for _, f := range fields {
		if f.name == flagField && f.layout == "string" {
			return true
		}
	}
	return false
}

// Gap gives the bytes of a value of a layout that stands for a result that
// could not be had: floats are NaN, integers 0, texts and slices empty, and a
// text field Flag at the top says why. What the result would have been about is
// taken from what it would have been computed from, a value of the layout
// fromLayout: its fields Channel, Index and Name, where both have them with the
// same layout.
func Gap(layout, flag, fromLayout string, from []byte) ([]byte, error) {
	taken, err := tellingFields(fromLayout, from)
	if err != nil {
		return nil, err
	}
	g := gapWriter{taken: taken, flag: strings.ToValidUTF8(flag, "\ufffd")}
	return g.append(nil, layout, 0)
}

// A layoutField is a field of a structure as its layout names it.
type layoutField struct{ name, layout string }

// fieldsOf takes the layout of a structure apart; false if it is none.
func fieldsOf(layout string) ([]layoutField, bool) {
	rest, ok := strings.CutPrefix(layout, "struct{")
	if !ok || !strings.HasSuffix(rest, "}") {
		return nil, false
	}
	rest = strings.TrimSuffix(rest, "}")
	var out []layoutField
	for rest != "" {
		end, depth := len(rest), 0
	scan:
		for i := range len(rest) {
			switch rest[i] {
			case '{':
				depth++
			case '}':
				depth--
			case ';':
				if depth == 0 {
					end = i
					break scan
				}
			}
		}
		name, of, ok := strings.Cut(rest[:end], " ")
		if !ok {
			return nil, false
		}
		out = append(out, layoutField{name, of})
		rest = strings.TrimPrefix(rest[min(end+1, len(rest)):], " ")
	}
	return out, true
}

// tellingFields gives the encoded fields that say what a structure is about,
// by their names and layouts.
func tellingFields(layout string, data []byte) (map[layoutField][]byte, error) {
	fields, ok := fieldsOf(layout)
	if !ok {
		return nil, nil
	}
	layouts := map[string]string{}
	for _, f := range fields {
		layouts[f.name] = f.layout
	}
	out := map[layoutField][]byte{}
	r := reader{data: data}
	err := r.eachEntry(func(key any) error {
		start := r.data
		if err := r.skip(1); err != nil {
			return err
		}
		if name, _ := key.(string); telling[name] {
			out[layoutField{name, layouts[name]}] = start[:len(start)-len(r.data)]
		}
		return nil
	})
	return out, err
}

var nan = math.NaN()

type gapWriter struct {
	taken map[layoutField][]byte
	flag  string
}

func (g *gapWriter) append(dst []byte, layout string, depth int) ([]byte, error) {
	if depth > maxDepth || len(dst) > maxGap {
		return nil, errorf("a gap of the layout %.60q would be too large", layout)
	}
	if fields, ok := fieldsOf(layout); ok {
		return g.record(dst, fields, depth)
	}
	switch {
	case strings.HasPrefix(layout, "["):
		return g.sequence(dst, layout, depth)
	case strings.HasPrefix(layout, "map["):
		return appendHead(dst, majorMap, 0), nil
	}
	switch layout {
	case "bool":
		return append(dst, simpleFalse), nil
	case "string":
		return appendText(dst, ""), nil
	case "float32", "float64":
		return appendFloat(dst, nan), nil
	}
	if _, ok := numberNamed(layout); !ok {
		return nil, errorf("the layout %.60q is not known", layout)
	}
	return appendHead(dst, majorNatural, 0), nil
}

func (g *gapWriter) record(dst []byte, fields []layoutField, depth int) ([]byte, error) {
	keys := make([][]byte, len(fields))
	order := make([]int, len(fields))
	for i, f := range fields {
		keys[i], order[i] = appendText(nil, f.name), i
	}
	sort.Slice(order, func(i, j int) bool { return bytes.Compare(keys[order[i]], keys[order[j]]) < 0 })
	dst = appendHead(dst, majorMap, uint64(len(fields)))
	for _, i := range order {
		f := fields[i]
		dst = append(dst, keys[i]...)
		taken, known := g.taken[f]
		var err error
		switch {
		case depth == 0 && f == layoutField{flagField, "string"}:
			dst = appendText(dst, g.flag)
		case depth == 0 && known:
			dst = append(dst, taken...)
		default:
			if dst, err = g.append(dst, f.layout, depth+1); err != nil {
				return nil, within("."+f.name, err)
			}
		}
	}
	return dst, nil
}

func (g *gapWriter) sequence(dst []byte, layout string, depth int) ([]byte, error) {
	length, elem, ok := strings.Cut(layout[1:], "]")
	n := 0
	if length != "" {
		var err error
		if n, err = strconv.Atoi(length); err != nil || n < 0 || n > maxGap {
			return nil, errorf("a gap of the layout %.60q would be too large", layout)
		}
	}
	if !ok {
		return nil, errorf("the layout %.60q is not known", layout)
	}
	if k, ok := numberNamed(elem); ok {
		dst = appendTyped(dst, k, n)
		switch elem {
		case "float64":
			return appendFloat64s(dst, filled(n, nan)), nil
		case "float32":
			return appendFloat32s(dst, filled(n, float32(nan))), nil
		}
		return append(dst, make([]byte, n*k.width)...), nil
	}
	dst = appendHead(dst, majorArray, uint64(n))
	for range n {
		var err error
		if dst, err = g.append(dst, elem, depth+1); err != nil {
			return nil, err
		}
	}
	return dst, nil
}

func filled[T any](n int, x T) []T {
	out := make([]T, n)
	for i := range out {
		out[i] = x
	}
	return out
}
