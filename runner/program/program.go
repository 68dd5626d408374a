package program

import (
	"bytes"
	"fmt"
	"go/ast"
	"go/token"
	"go/types"

	"rimlight/runner/diag"
)

// Version names the rules of the check, of the normal form and of the
// rewriting for the interpreter. It changes whenever the same source could give
// another normal form or another result, and belongs into every key.
const Version = "4"

// firstPos is below the positions of every source: the interpreter has files of
// its own in its file set, and the tree must come after them.
const firstPos = 1 << 20

// A Program is the checked Go code of a recipe.
type Program struct {
	Steps []Step // in order of position

	file  string
	given []byte    // the source that was checked
	src   []byte    // the same with the package clause and the imports
	tree  *ast.File // rewritten for the interpreter; nil in an outline
}

// A Step is an exported function of a recipe.
type Step struct {
	Name      string
	Doc       string // the comment's text, without marks and directives
	Signature string // "func Clean(raw lightcurve.Cube) (clean lightcurve.Cube, err error)"
	Pos       diag.Pos
	Params    []Var
	Results   []Var // without the trailing err
	Err       bool  // the last result is err error
	Each      *Each // nil when the step runs once
	Code      string
	CodeHash  string   // SHA-256 of Code, in hex
	Packages  []string // import paths of the step packages that the step and its helpers name, sorted
}

// A Var is a parameter or a result of a step. Type is its Go type with full
// import paths, as in "[]rimlight/steps/lightcurve.Curve"; a type of the recipe
// itself has its bare name.
type Var struct {
	Name string
	Type string
	Pos  diag.Pos
}

// Each is the directive //each:element in collection: the step runs once per
// element of Collection, which fills the parameter Element.
type Each struct {
	Element    string
	Collection string
	Pos        diag.Pos
}

// A Fence is the range of lines between the marks of one Go block, both ends
// included, counted from 1. Blocks are parsed one by one first, so that an
// unclosed brace in one is not reported in all that follow.
type Fence struct {
	Start int
	End   int
}

// Check parses and checks the Go code of a recipe. In src every byte that is
// not code is blank, and line 1 is not code; positions in src are positions in
// file. Without fences the source is parsed as a whole. All faults are
// reported that can be found at once: syntax first, then types and the rules of
// steps, then what a recipe may not use. When the list is not empty the
// program is an outline: as far as they could be made out, its steps have
// names, parameters and results, so that the wiring can be looked at too, but
// no code, and the program cannot be compiled.
func Check(file string, src []byte, fences ...Fence) (*Program, diag.List) {
	c := check(file, src, fences)
	if len(c.diags) > 0 {
		p := &Program{file: file}
		for _, d := range c.steps {
			s := c.step(d)
			if c.faulty(d) { // what it takes is not known for sure
				s.Params, s.Each = nil, nil
			}
			p.Steps = append(p.Steps, s)
		}
		return p, c.diags
	}
	p := &Program{file: file, given: bytes.Clone(src), src: c.src}
	closure := newClosure(c)
	total := 0
	for _, d := range c.steps {
		s := c.step(d)
		s.Code, s.Packages = closure.text(d)
		s.CodeHash = hash(s.Code)
		p.Steps = append(p.Steps, s)
		if total += len(s.Code); total > maxCode {
			c.refuse(d.Name, "split the recipe", "the steps reach more than %d bytes of code", maxCode)
			return &Program{file: file}, c.diags
		}
	}
	normalise(c)
	p.tree = c.tree
	return p, nil
}

// faulty reports whether the comment or the signature of a step has a fault.
func (c *checker) faulty(d *ast.FuncDecl) bool {
	first, last := c.at(d.Pos()).Line, c.at(d.Type.End()).Line
	if d.Doc != nil {
		first = c.at(d.Doc.Pos()).Line
	}
	for _, fault := range c.diags {
		if fault.Pos.Line >= first && fault.Pos.Line <= last {
			return true
		}
	}
	return false
}

// A checker carries one source through the check.
type checker struct {
	file  string
	fset  *token.FileSet
	src   []byte // with the package clause and the imports on line 1
	tree  *ast.File
	pkg   *types.Package
	info  *types.Info
	steps []*ast.FuncDecl

	// copies holds the function literals that must be given copies of variables
	// of the loop around them.
	copies map[*ast.FuncLit][]*types.Var

	// calls holds the loops, with their labels, whose bodies must become calls,
	// so that the variables of the body are new in each iteration.
	calls map[ast.Node]string

	diags diag.List
}

// check gives the checker that has been through the source.
func check(file string, src []byte, fences []Fence) *checker {
	c := &checker{file: file, fset: token.NewFileSet()}
	c.fset.AddFile("", -1, firstPos) // see Compile
	c.check(src, fences)
	c.diags.Sort()
	c.diags = shorten(c.diags)
	return c
}

func (c *checker) check(src []byte, fences []Fence) {
	if len(src) > maxSource {
		c.diags.Add(diag.Pos{File: c.file}, fmt.Sprintf("the recipe is %d bytes long", len(src)), fmt.Sprintf("at most %d are read", maxSource), "")
		return
	}
	c.src = bytes.Clone(src)
	if c.scan(); len(c.diags) > 0 {
		return
	}
	if c.syntax(fences); len(c.diags) > 0 {
		return
	}
	if c.bounds(); len(c.diags) > 0 {
		return
	}
	c.typeCheck()
	faults := len(c.diags)
	if c.boundSizes(); len(c.diags) > faults {
		return
	}
	c.stepRules()
	c.directives()
	if faults == 0 {
		c.lint()
	}
}

// at is the position in the Markdown, whatever line directives say.
func (c *checker) at(pos token.Pos) diag.Pos {
	p := c.fset.PositionFor(pos, false)
	return diag.Pos{File: c.file, Line: p.Line, Col: p.Column}
}

// refuse reports a fault at the start of n: what is wrong and what to write
// instead.
func (c *checker) refuse(n ast.Node, instead, format string, args ...any) {
	c.diags.Add(c.at(n.Pos()), fmt.Sprintf(format, args...), instead, "")
}
