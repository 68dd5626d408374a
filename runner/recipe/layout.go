package recipe

// A Layout is a way in which a raw file is laid out, and what a step gets that
// names the input.
type Layout struct {
	Name  string // as in the layout cell of an input table
	Type  string // Go type of what is read, with its full import path
	Files int    // most files that one input of this layout is read from
	About string
}

// Layouts lists the layouts that an input may have.
var Layouts = []Layout{
	{"light-curve table", "rimlight/steps/lightcurve.Cube", 2, "spectroscopic light curves: one FITS file, or a CSV file and one of its channels"},
	{"comparison table", "rimlight/steps/lightcurve.Cube", 2, "a comparison star on the same channels, in the same layout or as the COMPARISON table of a FITS file"},
	{"limb-darkening table", "rimlight/steps/limbtable.Table", 1, "limb-darkening coefficients by wavelength"},
	{"intensity table", "rimlight/steps/limbtable.Intensities", 1, "intensities of a stellar model by wavelength and mu"},
	{"throughput curve", "rimlight/steps/limbtable.Throughput", 1, "throughput of telescope and instrument by wavelength"},
	{"text", "string", 1, "any other text file, whole"},
}

// TypeOf gives the Go type of what is read from an input of the named layout,
// "" for a name that is not in [Layouts].
func TypeOf(layout string) string {
	l, _ := layoutOf(layout)
	return l.Type
}

// FilesOf gives the most files that one input of the named layout is read from, 0
// for a name that is not in [Layouts].
func FilesOf(layout string) int {
	l, _ := layoutOf(layout)
	return l.Files
}

func layoutOf(name string) (Layout, bool) {
	for _, l := range Layouts {
		if l.Name == name {
			return l, true
		}
	}
	return Layout{}, false
}

func layoutNames() []string {
	names := make([]string, len(Layouts))
	for i, l := range Layouts {
		names[i] = l.Name
	}
	return names
}

// hasColumns reports whether a column table can speak of inputs of a layout.
func hasColumns(layout string) bool {
	return layout == "light-curve table" || layout == "comparison table"
}
