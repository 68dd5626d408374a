package fits

import "fmt"

// Float64s reads a column of one number per row. Integers are converted,
// undefined values become NaN.
func (t *Table) Float64s(name string) ([]float64, error) {
	v, c, err := t.scalar(name, "numbers", Integer, Unsigned, Real)
	if err != nil {
		return nil, err
	}
	x, err := v.Float64s()
	if err != nil {
		return nil, fmt.Errorf("fits: %s: column %s %w", t.hdu.Label(), c.Label(), err)
	}
	return x, nil
}

// Float64Rows reads a column of numbers, one slice per row, whether it has
// one number per row, several, or arrays of different lengths. The slices
// share one array.
func (t *Table) Float64Rows(name string) ([][]float64, error) {
	v, c, err := t.column(name, "numbers", Integer, Unsigned, Real)
	if err != nil {
		return nil, err
	}
	x, err := v.Float64s()
	if err != nil {
		return nil, fmt.Errorf("fits: %s: column %s %w", t.hdu.Label(), c.Label(), err)
	}
	rows := make([][]float64, t.Rows)
	for i := range rows {
		rows[i] = x[v.Offsets[i]:v.Offsets[i+1]:v.Offsets[i+1]]
	}
	return rows, nil
}

// Int64s reads a column of one integer per row. An undefined value is an
// error; [Table.Values] tells them apart.
func (t *Table) Int64s(name string) ([]int64, error) {
	v, c, err := t.scalar(name, "integers", Integer)
	if err != nil {
		return nil, err
	}
	return v.Ints, t.noNull(&v, c)
}

// Strings reads a column of one string per row, without spaces at the end.
func (t *Table) Strings(name string) ([]string, error) {
	v, _, err := t.scalar(name, "strings", String)
	return v.Strings, err
}

// Bools reads a column of one logical value per row. An undefined value is an
// error; [Table.Values] tells them apart.
func (t *Table) Bools(name string) ([]bool, error) {
	v, c, err := t.scalar(name, "logical values", Logical)
	if err != nil {
		return nil, err
	}
	return v.Bools, t.noNull(&v, c)
}

// column reads a column that must be of one of the given kinds.
func (t *Table) column(name, want string, kinds ...Kind) (Values, *Column, error) {
	c, err := t.Column(name)
	if err != nil {
		return Values{}, nil, err
	}
	for _, k := range kinds {
		if c.Kind == k {
			v, err := t.ValuesAt(c.Index)
			return v, c, err
		}
	}
	return Values{}, nil, fmt.Errorf("fits: %s: column %s holds %s values, expected %s", t.hdu.Label(), c.Label(), c.Kind, want)
}

// scalar is column for one element per row.
func (t *Table) scalar(name, want string, kinds ...Kind) (Values, *Column, error) {
	c, err := t.Column(name)
	if err != nil {
		return Values{}, nil, err
	}
	if !c.Scalar() {
		return Values{}, nil, fmt.Errorf("fits: %s: column %s has the format %q, expected one value per row", t.hdu.Label(), c.Label(), c.Form)
	}
	return t.column(name, want, kinds...)
}

// Scalar reports whether the column has exactly one element in each row.
func (c *Column) Scalar() bool { return !c.Variable && c.Width == 1 }

func (t *Table) noNull(v *Values, c *Column) error {
	for i, null := range v.Null {
		if null {
			return fmt.Errorf("fits: %s: column %s: row %d is undefined", t.hdu.Label(), c.Label(), i+1)
		}
	}
	return nil
}
