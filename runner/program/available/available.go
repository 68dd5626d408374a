// Package available lists what recipe code can reach by name: a few packages
// of the standard library and the step library. It is the one table that the
// type check, the interpreter's symbols and their generator share.
package available

import "strings"

// stepLibrary is the import path under which the step packages lie.
const stepLibrary = "rimlight/steps/"

// A Package is one package that recipes can use without importing it.
type Package struct {
	Name string // the name recipes write, "cmplx"
	Path string // the import path, "math/cmplx"
}

// Packages lists every such package, in order of name within the standard
// library and within the step library. A package of the step library that does
// not exist or does not compile when the tables are generated is left out of
// them.
var Packages = []Package{
	{"bits", "math/bits"},
	{"cmplx", "math/cmplx"},
	{"errors", "errors"},
	{"fmt", "fmt"},
	{"math", "math"},
	{"sort", "sort"},
	{"strconv", "strconv"},
	{"strings", "strings"},
	{"utf8", "unicode/utf8"},

	{"chain", stepLibrary + "chain"},
	{"check", stepLibrary + "check"},
	{"diagnose", stepLibrary + "diagnose"},
	{"figure", stepLibrary + "figure"},
	{"fit", stepLibrary + "fit"},
	{"lightcurve", stepLibrary + "lightcurve"},
	{"limb", stepLibrary + "limb"},
	{"limbtable", stepLibrary + "limbtable"},
	{"noise", stepLibrary + "noise"},
	{"orbit", stepLibrary + "orbit"},
	{"sample", stepLibrary + "sample"},
	{"simulate", stepLibrary + "simulate"},
	{"spectrum", stepLibrary + "spectrum"},
	{"systematics", stepLibrary + "systematics"},
	{"table", stepLibrary + "table"},
	{"transit", stepLibrary + "transit"},
	{"vector", stepLibrary + "vector"},
}

var (
	byName = map[string]string{}
	byPath = map[string]string{}
)

func init() {
	for _, p := range Packages {
		byName[p.Name] = p.Path
		byPath[p.Path] = p.Name
	}
}

// Path gives the import path of the package that recipes call name, "" when
// there is none.
func Path(name string) string { return byName[name] }

// Name gives the name under which recipes know the package of that import
// path, "" when they do not know it.
func Name(path string) string { return byPath[path] }

// IsStep reports whether path is a package of the step library.
func IsStep(path string) bool { return strings.HasPrefix(path, stepLibrary) }

// Names gives the names of all packages, in table order.
func Names() []string {
	names := make([]string, len(Packages))
	for i, p := range Packages {
		names[i] = p.Name
	}
	return names
}

// withheld holds the functions of available packages that a recipe must not
// call, with the reason or what to write instead.
var withheld = map[string]string{
	"rimlight/steps/lightcurve.OpenCSV":            "recipes open no files; declare an input",
	"rimlight/steps/lightcurve.OpenFITS":           "recipes open no files; declare an input",
	"rimlight/steps/lightcurve.OpenFITSComparison": "recipes open no files; declare an input",
	"fmt.Print":              "a step has no output but its results; return the text",
	"fmt.Printf":             "a step has no output but its results; return the text",
	"fmt.Println":            "a step has no output but its results; return the text",
	"fmt.Fprint":             "a step writes to no stream; use fmt.Sprint",
	"fmt.Fprintf":            "a step writes to no stream; use fmt.Sprintf",
	"fmt.Fprintln":           "a step writes to no stream; use fmt.Sprintln",
	"fmt.Scan":               "a step reads nothing but its parameters",
	"fmt.Scanf":              "a step reads nothing but its parameters",
	"fmt.Scanln":             "a step reads nothing but its parameters",
	"fmt.Fscan":              "a step reads nothing but its parameters",
	"fmt.Fscanf":             "a step reads nothing but its parameters",
	"fmt.Fscanln":            "a step reads nothing but its parameters",
	"fmt.Sscan":              "use the functions of package strconv",
	"fmt.Sscanf":             "use the functions of package strconv",
	"fmt.Sscanln":            "use the functions of package strconv",
	"sort.Slice":             "it leaves the order of equal elements open; use sort.SliceStable",
	"sort.Sort":              "it leaves the order of equal elements open; use sort.Stable",
	"(*strings.Builder).Cap": "it depends on the allocator; use Len",
	"strings.Clone":          "it does nothing here; use the string itself",
	"strings.Title":          "it is deprecated; use strings.ToUpper on the first letter",
}

// Withheld says why recipes may not use the object of that full name, such as
// "fmt.Println"; "" when they may.
func Withheld(fullName string) string { return withheld[fullName] }
