// Package figure draws the pictures of a report, as SVG for a journal column.
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
