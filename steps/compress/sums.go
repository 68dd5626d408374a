package compress

import "gonum.org/v1/gonum/floats"

// stretchLength is how many integrations are worked on at a time, so that the columns
// stay in the processor's cache.
const stretchLength = 512

// Sums are all that a likelihood needs of the samples, for functions of time F_a and
// columns B_j, with weights w and residuals e against a flat curve:
//
//	square: Σ w B_j B_k, then Σ w F_a B_j B_k, then Σ w F_a F_b B_j B_k
//	cross:  Σ w B_j e, then Σ w F_a B_j e
//	rest:   Σ w e²
//
// Pairs (j, k), and (a, b), are those with k ≤ j, in the order (0,0), (1,0), (1,1), ...
type sums struct {
	columns, functions int
	square             []float64 // blocks of pairs of columns
	cross              []float64 // blocks of columns
	rest               float64
}

// pairs is how many pairs there are of n things, with themselves too.
func pairs(n int) int { return n * (n + 1) / 2 }

func newSums(columns, functions int) *sums {
	return &sums{columns: columns, functions: functions,
		square: make([]float64, (1+functions+pairs(functions))*pairs(columns)),
		cross:  make([]float64, (1+functions)*columns),
	}
}

// block is the part of square for the function number t in the order of Sums.
func (s *sums) block(t int) []float64 {
	n := pairs(s.columns)
	return s.square[t*n : (t+1)*n]
}

// addSquares adds the sums over products of columns.
func (s *sums) addSquares(weight []float64, columns [][]float64, d *Deficits) {
	work, scratch := make([]float64, stretchLength), make([]float64, stretchLength)
	stretches(0, len(weight), func(from, to int) {
		s.addBlock(0, weight[from:to], columns, from, scratch)
	})
	d.eachRun(func(first, until, offset int) {
		stretches(first, until, func(from, to int) {
			n, at := to-from, offset+from-first
			for a := range s.functions {
				wf := floats.MulTo(work[:n], weight[from:to], d.values[a][at:at+n])
				s.addBlock(1+a, wf, columns, from, scratch)
			}
			t := 1 + s.functions
			for a := range s.functions {
				wf := scratch[:n]
				for b := range a + 1 {
					floats.MulTo(wf, weight[from:to], d.values[a][at:at+n])
					floats.MulTo(work[:n], wf, d.values[b][at:at+n])
					s.addBlock(t, work[:n], columns, from, scratch)
					t++
				}
			}
		})
	})
}

// addBlock adds to block t the sums of weight times products of columns, from an
// integration on.
func (s *sums) addBlock(t int, weight []float64, columns [][]float64, from int, scratch []float64) {
	out, n, i := s.block(t), len(weight), 0
	for j, column := range columns {
		wb := floats.MulTo(scratch[:n], weight, column[from:from+n])
		for _, other := range columns[:j+1] {
			out[i] += floats.Dot(wb, other[from:from+n])
			i++
		}
	}
}

// addCrosses adds the sums over products with the residuals.
func (s *sums) addCrosses(weight, residual []float64, columns [][]float64, d *Deficits) {
	we := floats.MulTo(make([]float64, len(weight)), weight, residual)
	work := make([]float64, stretchLength)
	s.rest += floats.Dot(we, residual)
	for j, column := range columns {
		s.cross[j] += floats.Dot(we, column)
	}
	d.eachRun(func(first, until, offset int) {
		stretches(first, until, func(from, to int) {
			n, at := to-from, offset+from-first
			for a := range s.functions {
				wef := floats.MulTo(work[:n], we[from:to], d.values[a][at:at+n])
				out := s.cross[(1+a)*s.columns:]
				for j, column := range columns {
					out[j] += floats.Dot(wef, column[from:to])
				}
			}
		})
	})
}

// scaled is the squares of shared sums of weight 1, for the first of their functions,
// less those of the integrations listed, times a weight.
func (s *sums) scaled(functions int, without []int, columns [][]float64, d *Deficits, weight float64) *sums {
	out := newSums(s.columns, functions)
	n := pairs(s.columns)
	copy(out.square, s.square[:(1+functions)*n])
	copy(out.square[(1+functions)*n:], s.square[(1+s.functions)*n:(1+s.functions+pairs(functions))*n])
	product := make([]float64, n)
	for _, i := range without {
		x := 0
		for j := range columns {
			for k := range j + 1 {
				product[x] = columns[j][i] * columns[k][i]
				x++
			}
		}
		floats.Sub(out.block(0), product)
		at := d.place(i)
		if at < 0 {
			continue
		}
		t := 1 + functions
		for a := range functions {
			f := d.values[a][at]
			floats.AddScaled(out.block(1+a), -f, product)
			for b := range a + 1 {
				floats.AddScaled(out.block(t), -f*d.values[b][at], product)
				t++
			}
		}
	}
	floats.Scale(weight, out.square)
	return out
}

// eachRun calls use for the runs of integrations in transit: from the integration first
// to that before until, whose values begin at offset.
func (d *Deficits) eachRun(use func(first, until, offset int)) {
	offset := 0
	for k, first := range d.first {
		use(first, d.until[k], offset)
		offset += d.until[k] - first
	}
}

// place is where the values of an integration are, or -1 out of transit.
func (d *Deficits) place(i int) int {
	at := -1
	d.eachRun(func(first, until, offset int) {
		if i >= first && i < until {
			at = offset + i - first
		}
	})
	return at
}

// stretches calls use for pieces of the range from first to until.
func stretches(first, until int, use func(from, to int)) {
	for from := first; from < until; from += stretchLength {
		use(from, min(from+stretchLength, until))
	}
}
