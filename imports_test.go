package main_test

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const module = "jointledger"

// Libraries, by the name under which the rules below know them.
const (
	json       = "github.com/go-json-experiment/json"
	xmod       = "golang.org/x/mod"
	gonum      = "gonum.org/v1/gonum"
	validator  = "github.com/go-playground/validator/v10"
	uuid       = "github.com/google/uuid"
	pgx        = "github.com/jackc/pgx/v5"
	sqlite     = "modernc.org/sqlite"
	echo       = "github.com/labstack/echo/v4"
	prometheus = "github.com/prometheus/client_golang"
	rate       = "golang.org/x/time/rate"
	kong       = "github.com/alecthomas/kong"
	yaml       = "github.com/pb33f/go-yaml"
	netutil    = "golang.org/x/net/netutil"
)

// mayImport says for each package of this module which others it may import
// beside the standard library: packages of this module exactly, libraries with
// all their packages. A package that does not stand here may not exist.
var mayImport = map[string][]string{
	"strength":           {},
	"lug":                {"strength", gonum},
	"fastener":           {"strength", gonum},
	"service/strictjson": {json},
	"service/ledger":     {"service/strictjson", xmod},
	"service":            {"lug", "fastener", "strength", "service/ledger", "service/strictjson", validator, uuid},
	"store":              {"service", "service/ledger", pgx, sqlite},
	"store/storetest":    {"service", "service/ledger", "store", pgx, sqlite},
	"store/throwaway":    {"store/storetest"},
	"api":                {"service", "service/strictjson", "api/pages", echo, prometheus, rate},
	"api/pages":          {"service", "strength", yaml},
	"api/client":         {"service/strictjson"},
	"notice":             {"service", "service/strictjson"},
	"deploy/bench":       {"lug", "fastener", "strength", "service", "service/ledger", "service/strictjson", "store", "store/storetest", json, echo, sqlite},
	".": {
		"strength", "lug", "fastener", "service", "service/ledger", "service/strictjson", "store", "api", "api/client", "notice", kong, netutil,
	},
}

// pure packages take numbers and give numbers: nothing of the world may reach
// them. Each name stands for its subpackages too.
var (
	worldly = []string{"os", "net", "time", "log", "database", "context", "syscall", "testing"}
	pure    = map[string][]string{
		"strength": append(slices.Clone(worldly), "encoding"),
		"lug":      append(slices.Clone(worldly), "encoding"),
		"fastener": append(slices.Clone(worldly), "encoding"),
		// The ledger's business is bytes, and their base64 and hex.
		"service/ledger": append(slices.Clone(worldly), "encoding/json", "encoding/xml", "encoding/gob", "encoding/csv"),
	}
)

// nowhere are packages with a stricter replacement in this module: the JSON of
// the standard library folds case and takes duplicate members.
var nowhere = []string{"encoding/json", "unsafe", "math/rand"}

func TestImports(t *testing.T) {
	seen := map[string]bool{}
	for dir, imports := range importsOf(t) {
		seen[dir] = true
		allowed, known := mayImport[dir]
		if !known {
			t.Errorf("the package %s has no rule that says what it may import", dir)
			continue
		}
		for imported, file := range imports {
			if fault := breaks(dir, imported, allowed); fault != "" {
				t.Errorf("%s imports %s: %s", file, imported, fault)
			}
		}
	}
	for _, dir := range []string{"strength", "lug", "fastener", "service"} {
		if !seen[dir] {
			t.Errorf("the package %s was not found: the test looks in the wrong place", dir)
		}
	}
}

// TestImportRules holds the rules themselves against imports that they must
// refuse and take.
func TestImportRules(t *testing.T) {
	for _, c := range []struct {
		dir, imported string
		ok            bool
	}{
		{"lug", "math", true},
		{"lug", module + "/strength", true},
		{"lug", gonum + "/interp", true},
		{"lug", module + "/fastener", false},
		{"lug", "os/exec", false},
		{"lug", "encoding/hex", false},
		{"strength", gonum + "/mat", false},
		{"service", echo, false},
		{"service", module + "/store", false},
		{"service", "encoding/json", false},
		{"service", json, false},
		{"service/ledger", "encoding/base64", true},
		{"service/ledger", "time", false},
		{"store", module + "/api", false},
		{"store", pgx + "/pgxpool", true},
		{"store", pgx + "extra", false},
		{"api", module + "/lug", false},
		{"api", echo + "/middleware", true},
		{"api/pages", echo, false},
		{".", echo, false},
		{".", module + "/api", true},
	} {
		if fault := breaks(c.dir, c.imported, mayImport[c.dir]); (fault == "") != c.ok {
			t.Errorf("%s importing %s: found %q, want allowed %t", c.dir, c.imported, fault, c.ok)
		}
	}
}

// breaks says what is wrong with an import, empty for nothing.
func breaks(dir, imported string, allowed []string) string {
	own, ours := strings.CutPrefix(imported, module+"/")
	switch {
	case slices.Contains(nowhere, imported):
		return "nothing here may"
	case ours && !slices.Contains(allowed, own):
		return dir + " may import of this module only " + strings.Join(allowed, ", ")
	case ours:
		return ""
	case isStandard(imported):
		for _, refused := range pure[dir] {
			if under(imported, refused) {
				return dir + " is pure"
			}
		}
		return ""
	case !slices.ContainsFunc(allowed, func(a string) bool { return under(imported, a) }):
		return dir + " may use only the libraries " + strings.Join(allowed, ", ")
	}
	return ""
}

// isStandard reports whether a path is of the standard library, whose first
// element has no dot.
func isStandard(imported string) bool {
	first, _, _ := strings.Cut(imported, "/")
	return !strings.Contains(first, ".")
}

// under reports whether a path is a package or below it.
func under(imported, top string) bool {
	return imported == top || strings.HasPrefix(imported, top+"/")
}

// importsOf reads what the files of each folder import, whatever their build
// tags, each import with one file that has it. Test files may import more.
func importsOf(t *testing.T) map[string]map[string]string {
	t.Helper()
	found := map[string]map[string]string{}
	err := filepath.WalkDir(".", func(file string, entry fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name := entry.Name()
		if entry.IsDir() {
			if name == "testdata" || name != "." && strings.HasPrefix(name, ".") {
				return filepath.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(name, ".go") || strings.HasSuffix(name, "_test.go") {
			return nil
		}
		parsed, err := parser.ParseFile(token.NewFileSet(), file, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		dir := path.Dir(filepath.ToSlash(file))
		if found[dir] == nil {
			found[dir] = map[string]string{}
		}
		for _, spec := range parsed.Imports {
			imported, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				return err
			}
			found[dir][imported] = file
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return found
}
