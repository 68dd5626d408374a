package fit

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// A linearSet is a set of the NIST Statistical Reference Datasets for linear
// regression: of powers of one predictor, or of several predictors.
type linearSet struct {
	Name      string      `json:"name"`
	Level     string      `json:"level"`
	Index     []int       `json:"param_index"`
	Certified []string    `json:"certified"`
	SD        []string    `json:"certified_sd"`
	Data      [][]float64 `json:"data"`
}

// terms are the columns of the design and the response.
func (s linearSet) terms() (design [][]float64, response []float64) {
	design, response = columns(len(s.Index), len(s.Data)), make([]float64, len(s.Data))
	for i, row := range s.Data {
		response[i] = row[0]
		for k, b := range s.Index {
			switch {
			case len(row) > 2 && b == 0:
				design[k][i] = 1
			case len(row) > 2:
				design[k][i] = row[b]
			default:
				design[k][i] = math.Pow(row[1], float64(b))
			}
		}
	}
	return design, response
}

// TestNISTLinear fits the linear sets with the projection that finds coefficients
// of the trend, which has to give six digits of parameters and standard
// deviations. The digits are listed.
func TestNISTLinear(t *testing.T) {
	text, err := os.ReadFile("../../testdata/nist/nist_lls.json")
	if err != nil {
		t.Fatal(err)
	}
	var sets []linearSet
	if err := json.Unmarshal(text, &sets); err != nil {
		t.Fatal(err)
	}
	if len(sets) != 11 {
		t.Fatalf("%d sets, want 11", len(sets))
	}
	for _, s := range sets {
		design, response := s.terms()
		n, rows := len(design), len(response)
		q := newProjection(n, rows)
		for k := range design {
			copy(q.terms[k], design[k])
		}
		q.factorise()
		coefficients := q.coefficients(response)
		left := append([]float64(nil), response...)
		q.remove(left)
		sum := dot(left, left)
		value, sd := 15.0, 15.0
		for k, got := range coefficients {
			want := parse(t, s.Certified[k])
			value = min(value, digits(got, want))
			// Row k of the inverse of the triangle.
			unit := make([]float64, n)
			unit[k] = 1
			inverse := solveTransposed(q.r, unit)
			spread := math.Sqrt(dot(inverse, inverse) * sum / float64(rows-n))
			if certified := parse(t, s.SD[k]); certified > 0 {
				sd = min(sd, digits(spread, certified))
			} else if spread > 1e-6*math.Abs(want) {
				t.Errorf("%s: standard deviation %g of an exact fit", s.Name, spread)
			}
		}
		t.Logf("%-9s %-7s %4.1f digits of parameters, %4.1f of sd", s.Name, s.Level, value, sd)
		if value < 6 || sd < 6 {
			t.Errorf("%s: %.1f digits of parameters, %.1f of sd; want 6", s.Name, value, sd)
		}
	}
}
