package plan

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"go/parser"
	"go/scanner"
	"go/token"
	"io/fs"
	"maps"
	"path"
	"slices"
	"sort"
	"strconv"
	"strings"

	"rimlight/steps"
)

// libraryPath is the import path under which step packages live.
const libraryPath = "rimlight/steps/"

// A Library knows the sources of the step packages and what they import from
// one another.
type Library struct {
	hash    map[string]string
	imports map[string][]string
}

// OpenLibrary fingerprints the step packages that the program was built from.
func OpenLibrary() (*Library, error) { return readLibrary(steps.Sources) }

func readLibrary(sources fs.FS) (*Library, error) {
	l := &Library{map[string]string{}, map[string][]string{}}
	files, err := fs.Glob(sources, "*/*.go")
	if err != nil {
		return nil, err
	}
	perPackage := map[string][]string{}
	for _, f := range files {
		if !strings.HasSuffix(f, "_test.go") {
			perPackage[path.Dir(f)] = append(perPackage[path.Dir(f)], f)
		}
	}
	for dir, names := range perPackage {
		sort.Strings(names)
		h := sha256.New()
		imported := map[string]bool{}
		for _, name := range names {
			src, err := fs.ReadFile(sources, name)
			if err != nil {
				return nil, err
			}
			fmt.Fprintf(h, "file %q\n", path.Base(name))
			h.Write(essence(src))
			f, err := parser.ParseFile(token.NewFileSet(), name, src, parser.ImportsOnly)
			if err != nil {
				return nil, err
			}
			for _, i := range f.Imports {
				p, err := strconv.Unquote(i.Path.Value)
				if err != nil {
					return nil, err
				}
				if strings.HasPrefix(p, libraryPath) {
					imported[p] = true
				}
			}
		}
		pkg := libraryPath + dir
		l.hash[pkg] = hex.EncodeToString(h.Sum(nil))
		for p := range imported {
			l.imports[pkg] = append(l.imports[pkg], p)
		}
		sort.Strings(l.imports[pkg])
	}
	return l, nil
}

// essence is the source without comments and formatting: its tokens, one per
// line. Directives (//go:build, //go:embed) stay, since they change what is
// built; a semicolon that only ends a line before a closing bracket does not.
func essence(src []byte) []byte {
	var out []byte
	var s scanner.Scanner
	s.Init(token.NewFileSet().AddFile("", -1, len(src)), src, nil, scanner.ScanComments)
	semicolon := false
	for {
		_, tok, lit := s.Scan()
		switch {
		case tok == token.EOF:
			return out
		case tok == token.COMMENT && !strings.HasPrefix(lit, "//go:"):
			continue
		case tok == token.SEMICOLON:
			semicolon = true
			continue
		}
		if semicolon && tok != token.RBRACE && tok != token.RPAREN {
			out = append(out, ";\n"...)
		}
		semicolon = false
		out = append(out, tok.String()...)
		out = append(out, ' ')
		out = append(out, lit...)
		out = append(out, '\n')
	}
}

// Reached returns the given packages and all step packages that they import,
// directly or not, sorted.
func (l *Library) Reached(packages []string) []string {
	seen := map[string]bool{}
	var visit func(p string)
	visit = func(p string) {
		if seen[p] || l.hash[p] == "" {
			return
		}
		seen[p] = true
		for _, q := range l.imports[p] {
			visit(q)
		}
	}
	for _, p := range packages {
		visit(p)
	}
	out := make([]string, 0, len(seen))
	for p := range seen {
		out = append(out, p)
	}
	sort.Strings(out)
	return out
}

// packages lists all step packages.
func (l *Library) packages() []string { return slices.Collect(maps.Keys(l.hash)) }

// Hash is the SHA-256 of a package's sources, in hex, comments and formatting
// left out. It is empty for a package that is not in the library.
func (l *Library) Hash(pkg string) string { return l.hash[pkg] }
