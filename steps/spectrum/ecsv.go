package spectrum

import (
	"bytes"
	"fmt"
	"strconv"
	"strings"
)

// A Note is a named text in the header of a written spectrum, such as the title
// of the reduction or the version of the program.
type Note struct {
	Name string
	Text string
}

// ECSV writes a spectrum as Enhanced Character-Separated Values 1.0 (the
// Astropy project's APE 6): the columns of [CSV] with units and descriptions,
// comma-separated, and in front of the flags the column depth_cov: row i of the
// covariance of the depths, as a JSON array with null where a channel has no
// depth. depth_cov is left out when the channels are independent, as depth_err
// then says all.
// Notes go into the metadata in their order, after limb_law and limb_policy. It
// is an error when two notes have one name or a note has none.
func ECSV(s Spectrum, notes []Note) ([]byte, error) {
	meta, err := header(s, notes)
	if err != nil {
		return nil, err
	}
	all := fields()
	shared := s.correlated()
	var out bytes.Buffer
	out.WriteString("# %ECSV 1.0\n# ---\n# delimiter: ','\n# datatype:\n")
	var names []string
	describe := func(name, unit, kind, subtype, about string) {
		names = append(names, name)
		fmt.Fprintf(&out, "# - {name: %s, ", name)
		if unit != "" {
			fmt.Fprintf(&out, "unit: %s, ", unit)
		}
		fmt.Fprintf(&out, "datatype: %s, ", kind)
		if subtype != "" {
			fmt.Fprintf(&out, "subtype: '%s', ", subtype)
		}
		fmt.Fprintf(&out, "description: %s}\n", yamlString(about))
	}
	last := len(all) - 1
	for k, f := range all {
		if k == last && shared {
			describe("depth_cov", "", "string", fmt.Sprintf("float64[%d]", len(s.Points)),
				"row of the covariance of the depths, channels in the order of the rows")
		}
		describe(f.name, f.unit, f.kind, "", f.about)
	}
	out.WriteString("# meta: !!omap\n")
	for _, n := range meta {
		fmt.Fprintf(&out, "# - {%s: %s}\n", yamlString(n.Name), yamlString(n.Text))
	}
	out.WriteString("# schema: astropy-2.0\n")
	out.WriteString(strings.Join(names, ",") + "\n")
	sigma := s.Errors()
	if shared {
		out.Grow(len(s.Points) * len(s.Points) * 24)
	}
	for i := range s.Points {
		for k, f := range all {
			if k == last && shared {
				out.WriteByte('"')
				out.Write(appendRow(out.AvailableBuffer(), s.Cov[i]))
				out.WriteString(`",`)
			}
			cell := f.cell(&s.Points[i], sigma[i])
			if f.text != nil {
				cell = quoted(cell)
			}
			out.WriteString(cell)
			if k < last {
				out.WriteByte(',')
			}
		}
		out.WriteByte('\n')
	}
	return out.Bytes(), nil
}

// header returns all notes of the header.
func header(s Spectrum, notes []Note) ([]Note, error) {
	out := append([]Note{{"limb_law", s.Law}, {"limb_policy", s.Policy}}, notes...)
	seen := map[string]bool{}
	for _, n := range out {
		if n.Name == "" {
			return nil, fmt.Errorf("write spectrum: the note %.40q has no name; give it one", n.Text)
		}
		if seen[n.Name] {
			return nil, fmt.Errorf("write spectrum: two notes are named %.40q; rename one", n.Name)
		}
		seen[n.Name] = true
	}
	return out, nil
}

// correlated reports whether the covariance has an element off the diagonal.
func (s Spectrum) correlated() bool {
	if len(s.Cov) != len(s.Points) {
		return false
	}
	found := false
	for i, row := range s.Cov {
		if len(row) != len(s.Points) {
			return false
		}
		for j, c := range row {
			found = found || i != j && c == c && c != 0
		}
	}
	return found
}

// appendRow appends numbers as a JSON array; what is not finite becomes null.
func appendRow(dst []byte, row []float64) []byte {
	dst = append(dst, '[')
	for j, x := range row {
		if j > 0 {
			dst = append(dst, ',')
		}
		if finite(x) {
			dst = strconv.AppendFloat(dst, x, 'g', -1, 64)
		} else {
			dst = append(dst, "null"...)
		}
	}
	return append(dst, ']')
}

// quoted encloses text in quotes for a data line. Line breaks become spaces:
// readers of ECSV take data line by line.
func quoted(text string) string {
	if text == "" {
		return ""
	}
	text = strings.Join(strings.FieldsFunc(strings.ToValidUTF8(text, "\ufffd"), lineBreak), " ")
	return `"` + strings.ReplaceAll(text, `"`, `""`) + `"`
}

// lineBreak reports whether some reader ends a line at r.
func lineBreak(r rune) bool {
	switch r {
	case '\n', '\v', '\f', '\r', '\x1c', '\x1d', '\x1e', '\u0085', '\u2028', '\u2029':
		return true
	}
	return false
}

// yamlString writes text as a double-quoted YAML scalar. The escapes of Go's
// ASCII quoting are a subset of YAML's.
func yamlString(text string) string {
	return strconv.QuoteToASCII(strings.ToValidUTF8(text, "\ufffd"))
}
