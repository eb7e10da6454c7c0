package main

import (
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"tarnlight/eem"
)

// checkers are the functions that panic on a code that is not on the list.
var checkers = map[string]bool{"NewFlag": true, "Accept": true, "accept": true}

// No code is ever written that is not on the list: every Flag of the sources is
// built within a call of a function that checks its code, and every code that the
// sources spell out is on the list.
func TestCodesAreOnTheList(t *testing.T) {
	flags, codes := 0, 0
	for _, f := range sources(t) {
		var within []ast.Node
		ast.Inspect(f.tree, func(n ast.Node) bool {
			if n == nil {
				within = within[:len(within)-1]
				return true
			}
			if lit, ok := n.(*ast.CompositeLit); ok && nameOf(lit.Type) == "Flag" && len(lit.Elts) > 0 {
				flags++
				if !checked(within) {
					t.Errorf("%s: a Flag that nothing checks; wrap it in eem.NewFlag", f.at(n))
				}
			}
			for _, code := range spelled(n) {
				if codes++; !onList(code) {
					t.Errorf("%s: test code %q is not on the list of eem/tests.go", f.at(n), code)
				}
			}
			within = append(within, n)
			return true
		})
	}
	if flags < 5 || codes < 30 {
		t.Errorf("only %d flags and %d codes were looked at: the test no longer sees the sources", flags, codes)
	}
}

func onList(code string) bool { _, ok := eem.FindTest(code); return ok }

// checked says whether one of the enclosing nodes is a call that checks.
func checked(within []ast.Node) bool {
	for _, n := range within {
		if c, ok := n.(*ast.CallExpr); ok && checkers[nameOf(c.Fun)] {
			return true
		}
	}
	return false
}

// spelled lists the codes that a node spells out: a field Test, an argument of a
// function that takes a code first or second.
func spelled(n ast.Node) []string {
	switch n := n.(type) {
	case *ast.KeyValueExpr:
		if id, ok := n.Key.(*ast.Ident); ok && id.Name == "Test" {
			return texts(n.Value)
		}
	case *ast.CallExpr:
		switch nameOf(n.Fun) {
		case "FindTest", "Limit", "limit", "defaultLimit":
			if len(n.Args) > 0 {
				return texts(n.Args[0])
			}
		case "finding": // (code, …) in eem/scatter, (step, code, …) in eem/correct
			for _, a := range n.Args[:2] {
				if c := texts(a); c != nil {
					return c
				}
			}
		}
	}
	return nil
}

func texts(e ast.Expr) []string {
	if b, ok := e.(*ast.BasicLit); ok && b.Kind == token.STRING {
		if s, err := strconv.Unquote(b.Value); err == nil && s != "" {
			return []string{s}
		}
	}
	return nil
}

// nameOf is the last name of an expression such as eem.Flag.
func nameOf(e ast.Expr) string {
	switch e := e.(type) {
	case *ast.Ident:
		return e.Name
	case *ast.SelectorExpr:
		return e.Sel.Name
	}
	return ""
}

// source is a parsed file.
type source struct {
	set  *token.FileSet
	tree *ast.File
}

func (s source) at(n ast.Node) string { return s.set.Position(n.Pos()).String() }

// sources parses every Go file that is no test, except package eem, whose
// constructors they are.
func sources(t *testing.T) []source {
	t.Helper()
	var out []source
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() && strings.HasPrefix(d.Name(), ".") && d.Name() != ".." {
			return filepath.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") || filepath.ToSlash(path) == root+"/eem/note.go" {
			return nil
		}
		set := token.NewFileSet()
		f, err := parser.ParseFile(set, path, nil, parser.SkipObjectResolution)
		if err != nil {
			return err
		}
		out = append(out, source{set, f})
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// A code that is not on the list stops the program where it is written.
func TestUnlistedCodePanics(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("a code that is not on the list was taken")
		}
	}()
	eem.NewFlag(eem.Flag{Test: "no such test"})
}
