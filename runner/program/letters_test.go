package program

import (
	"strings"
	"testing"
)

func TestLetters(t *testing.T) {
	fine := []string{
		"σ", "λ0", "Δflux", "σWhite", "ρStar", "νMax", "µm", "Θ", "ν", "α", "Α", "ширина", "größe", "Ångström", "naïve", "光度", "光のカーブ", "x_1", "λ, v, ν := 1.0, 2.0, 3.0; _ = λ; _, _ =",
	}
	for _, name := range fine {
		src := "\nfunc F(x float64) (y float64) {\n\t" + name + " := x\n\treturn " + name + "\n}\n"
		if strings.Contains(name, ",") {
			src = "\nfunc F(x float64) (y float64) {\n\tλ, v, ν := 1.0, 2.0, 3.0\n\treturn λ + v + ν // ⚠️ 5 µm – “fine”\n}\n"
		}
		if _, diags := Check("r.md", []byte(src)); len(diags) > 0 {
			t.Errorf("%s: %v", name, diags)
		}
	}
	for _, c := range []struct{ code, want string }{
		{"y = x // \u202e end", "U+202E is a character that turns the direction of the text"},
		{"y = x // \u200b", "U+200B is an invisible character"},
		{"y = x /* \U000e0041 */", "U+E0041 is an invisible character"},
		{"y = x; _ = \"\u2066\"", "U+2066 is a character that turns"},
		{"y = x; _ = \"a\u00ad\"", `write \u00ad within a text`},
		{"y = x; _ = \"a\ufe0f\"", "U+FE0F is an invisible character"},
		{"y = x; _ = `\x1b`", "U+001B is an invisible character"},
		{"y = x; \u3164 := 1; _ = \u3164", "U+3164 is an invisible character"},
		{"flux := x; y = flux; fl\u0443x := 2.0; _ = fl\u0443x", "name flуx mixes letters of several scripts, as у U+0443"},
		{"ρStar := x; y = ρStar; pStar := 1.0; _ = pStar", "name pStar looks like name ρStar in line 3, and differs from it in ρ U+03C1"},
		{"\u0430\u0440 := x; y = \u0430\u0440; ap := 1.0; _ = ap", "name ap looks like name ар in line 3"},
		{"fl\u03bfw := x; y = fl\u03bfw", "ο U+03BF in name flοw looks like the Latin letter o"},
		{"\u0391 := x; A := x; y = A + \u0391", "name A looks like name Α in line 3, and differs from it in Α U+0391"},
		{"\u00b5 := x; \u03bc := x; y = \u00b5 + \u03bc", "name μ looks like name µ in line 3"},
		{"\u212b := x; y = \u212b", "\u212b U+212B in name \u212b is a form of \u00c5; write \u00c5 U+00C5"},
		{"\U0001d431 := x; y = \U0001d431", "is a form of x"},
		{"\uff46 := x; y = \uff46", "is a form of f"},
		{"\u0441\u0430\u0440 := x; y = \u0441\u0430\u0440", "name сар looks like name cap"},
	} {
		_, diags := Check("r.md", []byte("\nfunc F(x float64) (y float64) {\n"+c.code+"\nreturn\n}\n"))
		if !strings.Contains(diags.Error(), c.want) {
			t.Errorf("%q: %v; want %s", c.code, diags, c.want)
		}
	}
}
