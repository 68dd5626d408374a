// Package figure draws the pictures of a report, as SVG for a journal column.
//
// Every figure is drawn from the data alone: the caption, the text alternative
// and the table of numbers behind it are written from what is shown. A figure is
// one or two journal columns wide, its type is 6.5 to 8 points at that size, and
// its text is text. Much data is thinned, averaged or drawn as an embedded image,
// and the caption says so. Values that are not finite are left out; input of which
// nothing is left to draw is an error. The same input gives the same bytes.
//
// Panels are drawn on the SVG canvas of gonum.org/v1/plot: a page has panels in
// fixed places, a panel has two axes ([Spectrum], [WhiteFit] and the others put
// them together).
package figure

import "rimlight/steps/table"

// A Figure is one picture, self-contained.
type Figure struct {
	Title   string      // a short noun phrase
	Caption string      // sentences written from the data shown
	Alt     string      // what the picture shows, for those who cannot see it
	SVG     string      // an SVG document without external references or scripts
	Data    table.Table // the numbers behind the picture
}
