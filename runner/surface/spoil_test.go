package surface

import (
	"reflect"
	"slices"
)

// spoil changes one thing somewhere in v, which is settable.
func (g *generator) spoil(v reflect.Value) {
	switch v.Kind() {
	case reflect.Struct:
		if v.NumField() == 0 || hidden(v.Type()) {
			return
		}
		if g.IntN(30) == 0 {
			v.SetZero()
			return
		}
		g.spoil(v.Field(g.IntN(v.NumField())))
		for g.IntN(4) == 0 { // what goes wrong may take two
			g.spoil(v.Field(g.IntN(v.NumField())))
		}
	case reflect.Array:
		if v.Len() > 0 {
			g.spoil(v.Index(g.IntN(v.Len())))
		}
	case reflect.Slice:
		switch {
		case v.Type().Elem().Kind() == reflect.Uint8 && v.Len() > 100:
			v.SetBytes(g.spoilBytes(v.Bytes()))
		case v.Len() > 0 && g.IntN(2) == 0:
			g.spoil(v.Index(g.IntN(v.Len())))
		default:
			g.spoilSlice(v)
		}
	default:
		g.fill(v, 2)
	}
}

// spoilSlice changes the length, order or many elements of a slice.
func (g *generator) spoilSlice(v reflect.Value) {
	n := v.Len()
	elem := v.Type().Elem()
	switch g.IntN(10) {
	case 0:
		v.SetZero()
	case 1:
		v.Set(reflect.MakeSlice(v.Type(), 0, 0))
	case 2: // one less
		v.Set(v.Slice(0, max(0, n-1)))
	case 3:
		v.Set(v.Slice(0, g.IntN(n+1)))
	case 4: // one more
		one := reflect.New(elem).Elem()
		g.fillFromSample(one, 2)
		v.Set(reflect.Append(v, one))
	case 5: // a repeated element
		if n > 0 {
			v.Set(reflect.Append(v, clone(v.Index(g.IntN(n)))))
		}
	case 6: // two elements change places
		if n > 1 {
			i, j := g.IntN(n), g.IntN(n)
			a, b := clone(v.Index(i)), clone(v.Index(j))
			v.Index(i).Set(b)
			v.Index(j).Set(a)
		}
	case 7: // all the same
		one := reflect.New(elem).Elem()
		g.fillFromSample(one, 2)
		for i := range n {
			v.Index(i).Set(clone(one))
		}
	case 8: // every third element
		one := reflect.New(elem).Elem()
		g.fill(one, 2)
		for i := g.IntN(3); i < n; i += 3 {
			v.Index(i).Set(clone(one))
		}
	case 9: // much longer
		limit := 4000
		if composed(elem) || elem.Kind() == reflect.String {
			limit = 200
		}
		if g.IntN(30) == 0 && elem.Kind() != reflect.String {
			limit *= 20
		}
		for v.Len() > 0 && v.Len() < limit {
			m := min(v.Len(), limit-v.Len())
			v.Set(reflect.AppendSlice(v, clone(v.Slice(0, m))))
		}
	}
}

// spoilBytes changes a file.
func (g *generator) spoilBytes(data []byte) []byte {
	at := g.IntN(len(data))
	switch g.IntN(7) {
	case 0: // cut off
		return data[:at]
	case 1: // cut out
		return slices.Delete(data, at, min(len(data), at+1+g.IntN(200)))
	case 2: // repeat
		return slices.Insert(data, at, slices.Clone(data[at:min(len(data), at+1+g.IntN(3000))])...)
	case 3: // put in
		return slices.Insert(data, at, []byte(g.text())...)
	case 4: // one bit
		data[at] ^= 1 << g.IntN(8)
		return data
	case 5: // another byte
		data[at] = "\n,\"= '0-#\xff\x00"[g.IntN(11)]
		return data
	}
	// Another number, as long as the old one if that stood in a padded place.
	from := at
	for from < len(data) && (data[from] < '0' || data[from] > '9') {
		from++
	}
	to := from
	for to < len(data) && data[to] >= '0' && data[to] <= '9' {
		to++
	}
	numbers := [...]string{"0", "-1", "9", "99", "4096", "65537", "999999", "2147483648", "99999999999", "9223372036854775807", "1e999", "nan", "1e300"}
	number := numbers[g.IntN(len(numbers))]
	if grown := len(number) - (to - from); grown > 0 && from >= grown && data[from-1] == ' ' && g.IntN(4) != 0 {
		from -= grown
	}
	return slices.Replace(data, from, to, []byte(number)...)
}
