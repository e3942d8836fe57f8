package main_test

import (
	"go/ast"
	"go/constant"
	"go/importer"
	"go/parser"
	"go/token"
	"go/types"
	"math"
	"slices"
	"testing"

	"golang.org/x/tools/go/packages"
)

// TestProductsAreRounded keeps the pure packages' numbers the same on every
// machine. The Go specification lets a compiler fuse x*y + z into one rounding,
// also across statements, unless the product stands in an explicit conversion;
// compilers do so on some architectures and not on others.
func TestProductsAreRounded(t *testing.T) {
	config := &packages.Config{
		Mode: packages.NeedName | packages.NeedSyntax | packages.NeedTypes | packages.NeedTypesInfo | packages.NeedImports | packages.NeedDeps,
		Fset: token.NewFileSet(),
	}
	loaded, err := packages.Load(config, "./strength", "./lug", "./fastener")
	if err != nil {
		t.Fatal(err)
	}
	if len(loaded) != 3 || packages.PrintErrors(loaded) > 0 {
		t.Fatalf("the pure packages could not be read: found %v", loaded)
	}
	for _, p := range loaded {
		for _, at := range fusible(p.Syntax, p.TypesInfo) {
			t.Errorf("%s: a product is added or subtracted without float64( ) around it", config.Fset.Position(at))
		}
	}
}

// TestFusible holds the search against what the specification's section on
// floating-point operators allows and forbids to fuse.
func TestFusible(t *testing.T) {
	for _, c := range []struct {
		body  string
		fuses bool
	}{
		{"return x*y + z", true},
		{"return z - x*y", true},
		{"return z + -(x*y)", true},
		{"return (x * y) + z", true},
		{"z += x * y; return z", true},
		{"z -= (x * y); return z", true},
		{"t := x * y; return t + z", true},
		{"var t = x * y; return z - t", true},
		{"t := x; t *= y; return t + z", true},
		{"p := &z; *p = x * y; return *p + z", true},
		{"return z + product(x, y)", true},
		{"const two = 2; return two*x + z", false}, // a power of two rounds nothing
		{"return z + 3*x", true},
		{"return float64(x*y) + z", false},
		{"z += float64(x * y); return z", false},
		{"t := float64(x * y); return t + z", false},
		{"return x*y/z + z", false},
		{"return x * (y + z)", false},
		{"return z + math.Abs(x*y)", false},
		{"n := 2; return float64(n*n + n)", false},
		{"const a, b = 1.5, 2.5; return a*b + z", false}, // one constant, exact
	} {
		source := "package p\nimport \"math\"\nvar _ = math.Pi\nfunc product(x, y float64) float64 { return x * y }\nfunc f(x, y, z float64) float64 { " + c.body + " }\n"
		fset := token.NewFileSet()
		file, err := parser.ParseFile(fset, "p.go", source, parser.SkipObjectResolution)
		if err != nil {
			t.Fatal(err)
		}
		info := &types.Info{Types: map[ast.Expr]types.TypeAndValue{}, Defs: map[*ast.Ident]types.Object{}, Uses: map[*ast.Ident]types.Object{}}
		if _, err := (&types.Config{Importer: importer.Default()}).Check("p", fset, []*ast.File{file}, info); err != nil {
			t.Fatalf("%s: %v", c.body, err)
		}
		if found := fusible([]*ast.File{file}, info); (len(found) > 0) != c.fuses {
			t.Errorf("%s: found %d places, want some: %t", c.body, len(found), c.fuses)
		}
	}
}

// fusible finds each float + or - with an operand that a compiler may take as
// an unrounded product. It follows a product through parentheses, signs, what
// it is assigned to in the same function, and functions that return one.
func fusible(files []*ast.File, info *types.Info) []token.Pos {
	s := &search{info: info, returns: map[types.Object]bool{}}
	var functions []*ast.FuncDecl
	for _, file := range files {
		for _, d := range file.Decls {
			if f, ok := d.(*ast.FuncDecl); ok && f.Body != nil {
				functions = append(functions, f)
			}
		}
	}
	// A function may return what another returned: repeat until no more is found.
	for before := -1; before != len(s.returns); {
		before = len(s.returns)
		for _, f := range functions {
			s.enter(f)
			ast.Inspect(f.Body, func(n ast.Node) bool {
				switch n := n.(type) {
				case *ast.FuncLit:
					return false // its results are its own
				case *ast.ReturnStmt:
					if slices.ContainsFunc(n.Results, s.product) {
						s.returns[info.Defs[f.Name]] = true
					}
				}
				return true
			})
		}
	}
	var found []token.Pos
	for _, f := range functions {
		s.enter(f)
		ast.Inspect(f.Body, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.BinaryExpr:
				if (n.Op == token.ADD || n.Op == token.SUB) && s.float(n) && (s.product(n.X) || s.product(n.Y)) {
					found = append(found, n.OpPos)
				}
			case *ast.AssignStmt:
				if (n.Tok == token.ADD_ASSIGN || n.Tok == token.SUB_ASSIGN) && s.float(n.Lhs[0]) && (s.product(n.Lhs[0]) || s.product(n.Rhs[0])) {
					found = append(found, n.TokPos)
				}
			}
			return true
		})
	}
	return found
}

// search is what fusible knows while it reads.
type search struct {
	info     *types.Info
	returns  map[types.Object]bool // functions that return a product
	assigned map[string]bool       // what is assigned one in this function, as written
}

// enter notes what a function assigns products to.
func (s *search) enter(f *ast.FuncDecl) {
	s.assigned = map[string]bool{}
	for before := -1; before != len(s.assigned); {
		before = len(s.assigned)
		ast.Inspect(f.Body, func(n ast.Node) bool {
			switch n := n.(type) {
			case *ast.AssignStmt:
				for i, left := range n.Lhs {
					multiplies := n.Tok == token.MUL_ASSIGN && s.float(left) && !s.powerOfTwo(n.Rhs[0])
					copies := (n.Tok == token.ASSIGN || n.Tok == token.DEFINE) && len(n.Lhs) == len(n.Rhs) && s.product(n.Rhs[i])
					if multiplies || copies {
						s.assigned[types.ExprString(left)] = true
					}
				}
			case *ast.ValueSpec:
				for i, value := range n.Values {
					if len(n.Names) == len(n.Values) && s.product(value) {
						s.assigned[n.Names[i].Name] = true
					}
				}
			}
			return true
		})
	}
}

// product reports whether an expression is a float product that nothing has
// rounded.
func (s *search) product(e ast.Expr) bool {
	if !s.float(e) || s.info.Types[e].Value != nil {
		return false
	}
	switch e := e.(type) {
	case *ast.ParenExpr:
		return s.product(e.X)
	case *ast.UnaryExpr:
		return s.product(e.X)
	case *ast.BinaryExpr:
		return e.Op == token.MUL && !s.powerOfTwo(e.X) && !s.powerOfTwo(e.Y)
	case *ast.CallExpr:
		return s.returns[s.callee(e)]
	case *ast.Ident, *ast.SelectorExpr, *ast.StarExpr, *ast.IndexExpr:
		return s.assigned[types.ExprString(e)]
	}
	return false
}

func (s *search) callee(call *ast.CallExpr) types.Object {
	switch f := ast.Unparen(call.Fun).(type) {
	case *ast.Ident:
		return s.info.Uses[f]
	case *ast.SelectorExpr:
		return s.info.Uses[f.Sel]
	}
	return nil
}

func (s *search) float(e ast.Expr) bool {
	t := s.info.TypeOf(e)
	if t == nil {
		return false
	}
	basic, ok := t.Underlying().(*types.Basic)
	return ok && basic.Info()&types.IsFloat != 0
}

// powerOfTwo reports whether an expression is a constant that only moves the
// exponent: a product with it rounds nothing.
func (s *search) powerOfTwo(e ast.Expr) bool {
	value := s.info.Types[e].Value
	if value == nil {
		return false
	}
	x, _ := constant.Float64Val(constant.ToFloat(value))
	fraction, _ := math.Frexp(math.Abs(x))
	return fraction == 0.5
}
