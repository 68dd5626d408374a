// Package exportdata serves the declarations of the packages that recipes can
// use to the type checker, from data embedded in the program: no Go toolchain
// is needed to check a recipe. The data is written by go generate.
package exportdata

import (
	"bytes"
	"embed"
	"fmt"
	"go/token"
	"go/types"
	"strings"

	"golang.org/x/tools/go/gcexportdata"

	"rimlight/runner/program/available"
)

//go:embed data
var files embed.FS

// An Importer gives the packages of the allow-list to one type check. Packages
// of one Importer share their types.
type Importer struct {
	files    *token.FileSet
	packages map[string]*types.Package
	done     map[string]bool
}

// NewImporter returns an Importer without packages.
func NewImporter() *Importer {
	return &Importer{token.NewFileSet(), map[string]*types.Package{}, map[string]bool{}}
}

// Import gives the package at path. It fails for a package that recipes cannot
// use or that has no data.
func (im *Importer) Import(path string) (*types.Package, error) {
	if im.done[path] {
		return im.packages[path], nil
	}
	if !Has(path) {
		return nil, fmt.Errorf("package %s is not available to recipes", path)
	}
	data, err := files.ReadFile(file(path))
	if err != nil {
		return nil, err
	}
	p, err := gcexportdata.Read(bytes.NewReader(data), im.files, im.packages, path)
	if err != nil {
		return nil, fmt.Errorf("export data of %s: %w", path, err)
	}
	im.done[path] = true
	return p, nil
}

// Has reports whether the package at path is available and has data.
func Has(path string) bool {
	if available.Name(path) == "" {
		return false
	}
	_, err := files.Open(file(path))
	return err == nil
}

func file(path string) string {
	return "data/" + strings.ReplaceAll(path, "/", "_") + ".x"
}
