// Generate writes the two tables that recipe code is checked and run against:
// the export data of every available package, and the interpreter's symbols of
// the same packages. Run it with
//
//	go generate ./runner/program/...
//
// With -check it writes nothing and fails when a file on disk is out of date.
// Its output depends on the packages' exported declarations alone.
package main

import (
	"bytes"
	"encoding/json"
	"flag"
	"fmt"
	"go/token"
	"go/types"
	"io"
	"log"
	"os"
	"os/exec"
	"path/filepath"
	"sort"
	"strings"

	"golang.org/x/tools/go/gcexportdata"

	"rimlight/runner/program/available"
)

func main() {
	log.SetFlags(0)
	log.SetPrefix("generate: ")
	check := flag.Bool("check", false, "write nothing; fail when a file is out of date")
	root := flag.String("C", ".", "folder of package program")
	flag.Parse()
	if err := run(*root, *check); err != nil {
		log.Fatal(err)
	}
}

// run writes or checks everything below root.
func run(root string, check bool) error {
	pkgs, err := load(root)
	if err != nil {
		return err
	}
	files := map[string][]byte{}
	for _, p := range pkgs {
		stem := strings.ReplaceAll(p.Path(), "/", "_")
		data, err := exportData(p)
		if err != nil {
			return fmt.Errorf("export data of %s: %w", p.Path(), err)
		}
		files[filepath.Join("exportdata", "data", stem+".x")] = data
		source, err := symbolFile(p)
		if err != nil {
			return fmt.Errorf("symbols of %s: %w", p.Path(), err)
		}
		files[filepath.Join("symbols", "table_"+stem+".go")] = source
	}
	return settle(root, files, check)
}

// load reads the declarations of the available packages from what the compiler
// wrote about them. A package that is missing or does not compile is named on
// standard error and left out.
func load(root string) ([]*types.Package, error) {
	args := []string{"list", "-e", "-export", "-json=ImportPath,Export,Error,DepsErrors", "--"}
	for _, p := range available.Packages {
		args = append(args, p.Path)
	}
	command := exec.Command("go", args...)
	command.Dir = root
	command.Stderr = os.Stderr
	out, err := command.Output()
	if err != nil {
		return nil, fmt.Errorf("go list: %w", err)
	}
	var good []*types.Package
	for d := json.NewDecoder(bytes.NewReader(out)); ; {
		var p struct {
			ImportPath, Export string
			Error              *struct{ Err string }
			DepsErrors         []struct{ Err string }
		}
		if err := d.Decode(&p); err == io.EOF {
			break
		} else if err != nil {
			return nil, fmt.Errorf("go list: %w", err)
		}
		if p.Export == "" || p.Error != nil || len(p.DepsErrors) > 0 {
			log.Printf("left out %s: it does not exist or does not compile", p.ImportPath)
			continue
		}
		pkg, err := readExport(p.ImportPath, p.Export)
		if err != nil {
			return nil, err
		}
		good = append(good, pkg)
	}
	sort.Slice(good, func(i, j int) bool { return good[i].Path() < good[j].Path() })
	return good, nil
}

func readExport(path, name string) (*types.Package, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	//lint:ignore SA1019 the toolchain that go.mod names still writes such archives; until Go 1.29
	r, err := gcexportdata.NewReader(f)
	if err != nil {
		return nil, err
	}
	return gcexportdata.Read(r, token.NewFileSet(), map[string]*types.Package{}, path)
}

// settle makes the generated files under root those given, or with check
// reports how they differ.
func settle(root string, files map[string][]byte, check bool) error {
	var stale []string
	for _, pattern := range []string{"exportdata/data/*.x", "symbols/table_*.go"} {
		found, err := filepath.Glob(filepath.Join(root, filepath.FromSlash(pattern)))
		if err != nil {
			return err
		}
		for _, name := range found {
			rel, err := filepath.Rel(root, name)
			if err != nil {
				return err
			}
			if _, wanted := files[rel]; wanted {
				continue
			}
			stale = append(stale, rel)
			if !check {
				if err := os.Remove(name); err != nil {
					return err
				}
			}
		}
	}
	for rel, content := range files {
		name := filepath.Join(root, rel)
		if old, err := os.ReadFile(name); err == nil && bytes.Equal(old, content) {
			continue
		}
		stale = append(stale, rel)
		if !check {
			if err := os.WriteFile(name, content, 0o644); err != nil {
				return err
			}
		}
	}
	if check && len(stale) > 0 {
		sort.Strings(stale)
		return fmt.Errorf("%s: out of date, to be written anew by go generate", strings.Join(stale, ", "))
	}
	return nil
}
