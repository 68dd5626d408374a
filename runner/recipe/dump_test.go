package recipe

import (
	"fmt"
	"strings"
)

// dump writes all that was read from a recipe, one item per line.
func dump(r *Recipe) string {
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	line("title %q", r.Title)
	for i, s := range r.Sections {
		line("section %d %d:%d level %d %q", i, s.Pos.Line, s.Pos.Col, s.Level, s.Heading)
		if s.Priors != nil {
			line("\t%d priors", len(s.Priors))
		}
		for _, p := range s.Priors {
			line("\tprior %d:%d %s %d:%d %s unit %q about %q", p.Pos.Line, p.Pos.Col, p.Name, p.PriorPos.Line, p.PriorPos.Col, p.Kind, p.Unit, p.About)
			for _, t := range p.Terms {
				line("\t\tterm %d:%d %q %+g", t.Pos.Line, t.Pos.Col, t.Setting, t.Offset)
			}
		}
	}
	for _, in := range r.Inputs {
		line("input %d:%d %s %d:%d %q %d:%d %q about %q", in.Pos.Line, in.Pos.Col, in.Name, in.FilePos.Line, in.FilePos.Col, in.Files,
			in.LayoutPos.Line, in.LayoutPos.Col, in.Layout, in.About)
	}
	for _, s := range r.Settings {
		k, err := s.Value.Kind()
		line("setting %d:%d %s %d:%d %q %s %v unit %q about %q", s.Pos.Line, s.Pos.Col, s.Name, s.ValuePos.Line, s.ValuePos.Col, s.Value.Text, k, err, s.Unit, s.About)
		for _, v := range s.AlsoTry {
			k, err := v.Kind()
			line("\talso %q %s %v", v.Text, k, err)
		}
	}
	for _, c := range r.Columns {
		line("column %d:%d %s input %q hdu %q name %q unit %q offset %g about %q", c.Pos.Line, c.Pos.Col, c.Role, c.Input, c.HDU, c.Name, c.Unit, c.Offset, c.About)
	}
	for _, f := range r.Blocks {
		line("block fence %d section %d line %d", f.Fence, f.Section, f.Line)
		for l := range strings.Lines(f.Code) {
			line("\t%q", l)
		}
	}
	line("code")
	for i, l := range strings.Split(string(r.Code()), "\n") {
		if l != "" {
			line("%4d %s", i+1, l)
		}
	}
	return b.String()
}
