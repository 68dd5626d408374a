// Package recipes holds the shipped recipes. Each is a Markdown file that runs
// on simulated raw data, and on anyone's data in the same layout.
package recipes

import "embed"

//go:embed *.md
var files embed.FS

// Continuous is the recipe for one long, uninterrupted stare: continuous.md.
func Continuous() []byte {
	b, err := files.ReadFile("continuous.md")
	if err != nil {
		panic("recipes: continuous.md is not embedded") // the embedding is checked at build time
	}
	return b
}
