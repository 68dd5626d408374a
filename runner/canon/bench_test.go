package canon

import (
	"testing"

	"rimlight/steps/lightcurve"
)

// cube has 3000 integrations of 80 channels.
func cube() lightcurve.Cube {
	var c lightcurve.Cube
	for range 80 {
		flux, mask := make([]float64, 3000), make([]lightcurve.Flag, 3000)
		for i := range flux {
			flux[i] = 1 + 1e-5*float64(i)
		}
		c.Flux, c.Err, c.Mask = append(c.Flux, flux), append(c.Err, flux), append(c.Mask, mask)
		c.Channels = append(c.Channels, lightcurve.Channel{Lo: 1, Hi: 2})
		c.Time = flux
	}
	return c
}

func BenchmarkMarshalCube(b *testing.B) {
	c := cube()
	data, err := Marshal(c)
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		if _, err := Marshal(c); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkUnmarshalCube(b *testing.B) {
	data, err := Marshal(cube())
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		var c lightcurve.Cube
		if err := Unmarshal(data, &c); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSplitCurves(b *testing.B) {
	c := cube()
	curves := make([]lightcurve.Curve, len(c.Flux))
	for i := range curves {
		curves[i] = lightcurve.Curve{Time: c.Time, Flux: c.Flux[i], Err: c.Err[i], Mask: c.Mask[i]}
	}
	data, err := Marshal(curves)
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		if _, err := Split("struct{…}", data); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkCopy is what the others are to be compared with.
func BenchmarkCopy(b *testing.B) {
	data, err := Marshal(cube())
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		_ = append(make([]byte, 0, len(data)), data...)
	}
}
