package compress

import (
	"errors"
	"fmt"
	"math"
	"sync"

	"rimlight/steps/systematics"
)

var errIndefinite = errors.New("a matrix is not positive definite")

// A Trend says what multiplies, or adds to, the light of the star.
type Trend struct {
	Columns  [][]float64 // at the times; the first is 1
	Added    []bool      // which of them add to the star's light, and have no part in the transit; nil for none
	Settling bool        // whether there is a column exp(-(t-Start)/τ) too, which comes last
	Start    float64     // time from which settling counts
	Settle   Prior       // of τ, days; Fixed for a given one
	Least    float64     // τ is not below, days
	Most     float64     // nor above
	Normal   []Coefficient
}

// A Coefficient is a normal prior of a coefficient of the trend, relative to the median
// flux. The settling column is the one after Columns.
type Coefficient struct {
	Column   int
	Mean, SD float64
}

// Shared is what light curves have in common. Its methods may be called from several
// goroutines at once; what they return does not depend on the order of calls.
type Shared struct {
	star    Star
	trend   Trend
	law     law
	columns [][]float64 // those of the trend, then those of the family
	fixed   int         // how many of them do not belong to the family
	stars   []bool      // which columns of the model multiply the star
	family  *family     // nil without a settling time to find
	mutex   sync.Mutex
	known   map[[2]float64]*entry
}

// An entry is a table of deficits, made once, with the sums over products of all columns
// with weight 1.
type entry struct {
	once     sync.Once
	deficits *Deficits
	err      error
	sumOnce  sync.Once
	sums     *sums
}

// NewShared prepares light curves of a star and a trend. Errors: a law of limb darkening
// that is not linear in its coefficients; columns of other lengths than the times; a
// range of settling times that is none.
func NewShared(star Star, trend Trend) (*Shared, error) {
	l, err := newLaw(star.Law)
	if err != nil {
		return nil, err
	}
	l.share = 1 / (1 + star.Companion)
	s := &Shared{star: star, trend: trend, law: l, known: map[[2]float64]*entry{}}
	if len(trend.Columns) == 0 {
		return nil, errors.New("a trend without columns; expected at least a constant")
	}
	for k, column := range trend.Columns {
		if len(column) != len(star.Times) {
			return nil, fmt.Errorf("column %d of the trend has %d values; expected one for each of %d times", k+1, len(column), len(star.Times))
		}
	}
	s.columns = append(s.columns, trend.Columns...)
	lo, hi := trend.settlingRange()
	switch {
	case !trend.Settling:
	case !(lo > 0 && lo <= hi):
		return nil, fmt.Errorf("settling times from %g to %g d; expected an increasing range above 0", lo, hi)
	case !(hi > lo*(1+1e-9)):
		s.columns = append(s.columns, systematics.Settle(star.Times, trend.Start, lo))
	default:
		s.family = newFamily(star.Times, trend.Start, math.Log(lo), math.Log(hi))
		s.columns = append(s.columns, s.family.columns...)
	}
	s.fixed = len(s.columns)
	if s.family != nil {
		s.fixed = len(trend.Columns)
	}
	size := len(trend.Columns)
	if trend.Settling {
		size++
	}
	s.stars = make([]bool, size)
	for j := range s.stars {
		s.stars[j] = j >= len(trend.Added) || !trend.Added[j]
	}
	return s, nil
}

// settlingRange is where settling times may be.
func (t *Trend) settlingRange() (lo, hi float64) {
	p := t.Settle
	lo, hi = p.limits()
	if p.Kind == Normal {
		lo, hi = p.A-farthest*p.B, p.A+farthest*p.B
	}
	if p.Kind == TruncatedNormal {
		lo, hi = p.window()
	}
	return math.Max(lo, t.Least), math.Min(hi, t.Most)
}

// table gives the deficits for radius ratios between two values.
func (s *Shared) table(lo, hi float64) (*entry, error) {
	key := [2]float64{math.Max(lo, 0), hi}
	s.mutex.Lock()
	e := s.known[key]
	if e == nil {
		e = &entry{}
		s.known[key] = e
	}
	s.mutex.Unlock()
	e.once.Do(func() { e.deficits, e.err = newDeficits(&s.star, &s.law, key[0], key[1]) })
	return e, e.err
}

// unit gives the sums of weight 1 over all columns.
func (s *Shared) unit(e *entry) *sums {
	e.sumOnce.Do(func() {
		one := make([]float64, len(s.star.Times))
		for i := range one {
			one[i] = 1
		}
		e.sums = newSums(len(s.columns), len(e.deficits.values))
		e.sums.addSquares(one, s.columns, e.deficits)
	})
	return e.sums
}

// around is an interval of radius ratios that holds the one from lo to hi, wider by a
// third to nine tenths: one of a fixed set, so that light curves share tables.
func around(lo, hi float64) (from, to float64) {
	level := math.Ceil(2 * math.Log2((hi-lo)/0.75))
	width := math.Exp2(level / 2)
	center := math.Round((lo+hi)/2/(width/4)) * (width / 4)
	return center - width/2, center + width/2
}
