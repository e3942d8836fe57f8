package fastener

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"jointledger/strength"
)

// wireSplice is the request of a splice as it comes over the wire.
type wireSplice struct {
	Units, Title string
	Members      []struct {
		ID           string
		E            float64
		FirstRow     int       `json:"first_row"`
		LastRow      int       `json:"last_row"`
		RowThickness []float64 `json:"row_thickness"`
		Bays         []Bay
		Expansion    float64
		Material     *wireMaterial
		EdgeDistance float64 `json:"edge_distance"`
	}
	Pitches []float64
	Rows    []struct {
		Count                       int
		Diameter, E, Nu, Compliance float64
		Installation                string
		Clearance                   float64
		Type                        *wireType
		ShearPlanes                 int `json:"shear_planes"`
	}
	Compliance        string
	CompareCompliance []string `json:"compare_compliance"`
	Symmetric         bool
	Factors           struct{ Ultimate, Fitting float64 }
	LoadCases         []struct {
		ID, Level    string
		Ends         []End
		Temperatures []TemperatureChange
	} `json:"load_cases"`
}

// unitsOf is the size of a system's units of force and length in N and mm.
func unitsOf(t *testing.T, units string) (force, length float64) {
	s, ok := scales[units]
	if !ok {
		t.Fatalf("units %q", units)
	}
	return s.force, s.length
}

// decode turns a request into the types of this package.
func (w *wireSplice) decode(t *testing.T) (Splice, strength.Factors, []SpliceCase) {
	force, length := unitsOf(t, w.Units)
	stress := force / (length * length)
	s := Splice{Compliance: w.Compliance, CompareCompliance: w.CompareCompliance, Symmetric: w.Symmetric}
	for _, m := range w.Members {
		member := Member{
			ID: m.ID, E: m.E * stress, FirstRow: m.FirstRow, LastRow: m.LastRow, Expansion: m.Expansion,
			Material: m.Material.decode(scales[w.Units]), EdgeDistance: m.EdgeDistance * length,
		}
		for _, thickness := range m.RowThickness {
			member.RowThickness = append(member.RowThickness, thickness*length)
		}
		for _, b := range m.Bays {
			member.Bays = append(member.Bays, Bay{b.Thickness * length, b.Width * length})
		}
		s.Members = append(s.Members, member)
	}
	for _, p := range w.Pitches {
		s.Pitches = append(s.Pitches, p*length)
	}
	for _, r := range w.Rows {
		s.Rows = append(s.Rows, Row{
			Count: r.Count, Diameter: r.Diameter * length, E: r.E * stress, Nu: r.Nu, Installation: r.Installation,
			Compliance: r.Compliance * length / force, Clearance: r.Clearance * length,
			Type: r.Type.decode(scales[w.Units]), ShearPlanes: r.ShearPlanes,
		})
	}
	var cases []SpliceCase
	for _, c := range w.LoadCases {
		level := levels[c.Level]
		if level == 0 {
			t.Fatalf("level %q", c.Level)
		}
		made := SpliceCase{ID: c.ID, Level: level, Temperatures: c.Temperatures}
		for _, e := range c.Ends {
			made.Ends = append(made.Ends, End{e.Member, e.Left * force, e.Right * force})
		}
		cases = append(cases, made)
	}
	return s, strength.Factors{Ultimate: w.Factors.Ultimate, Fitting: w.Factors.Fitting}, cases
}

// printedDigits reads a value and the half unit of its last digit.
func printedDigits(t *testing.T, text string) (value, half float64) {
	value, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	mantissa, exponent, _ := strings.Cut(strings.ToLower(text), "e")
	power := 0
	if exponent != "" {
		if power, err = strconv.Atoi(exponent); err != nil {
			t.Fatal(err)
		}
	}
	if _, decimals, ok := strings.Cut(mantissa, "."); ok {
		power -= len(decimals)
	}
	return value, 0.5 * math.Pow(10, float64(power))
}

func assertPrinted(t *testing.T, what string, got float64, text string) {
	t.Helper()
	if want, half := printedDigits(t, text); !(math.Abs(got-want) <= half*(1+1e-9)) {
		t.Errorf("%s: %.9g, printed %s", what, got, text)
	}
}

// TestPublishedSplices holds every case of the data against its source.
func TestPublishedSplices(t *testing.T) {
	type expected struct {
		LoadCase string `json:"load_case"`
		Row      int
		Between  []string
		Share    string
		Load     string
		Symbol   string
		Value    string
	}
	type expectedCheck struct {
		LoadCase                  string `json:"load_case"`
		Row                       int
		Member, Mode, Level       string
		Method                    string
		Demand, Allowable, Margin string
	}
	var files []string
	for _, pattern := range []string{"splice-*.json", "compliance-*.json"} {
		found, err := filepath.Glob(filepath.Join("..", "testdata", "published", pattern))
		if err != nil || len(found) == 0 {
			t.Fatalf("no data %s: %v", pattern, err)
		}
		files = append(files, found...)
	}
	compared := 0
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		var published struct {
			About string
			Cases []struct {
				Title, Source, Mark string
				Hand                []string
				Input               wireSplice
				Expect              struct {
					Transfers, Workings []expected
					Checks              []expectedCheck
				}
			}
		}
		decoder := json.NewDecoder(bytes.NewReader(data))
		decoder.DisallowUnknownFields()
		if err := decoder.Decode(&published); err != nil {
			t.Fatalf("%s: %v", file, err)
		}
		for _, c := range published.Cases {
			t.Run(c.Title, func(t *testing.T) {
				if _, ok := strength.ParseMark(c.Mark); !ok || c.Source == "" || len(c.Expect.Transfers)+len(c.Expect.Workings) == 0 {
					t.Fatalf("mark %q, source %q, or nothing expected", c.Mark, c.Source)
				}
				s, f, cases := c.Input.decode(t)
				p, faults := PrepareSplice(s, f, cases)
				if len(faults) > 0 {
					t.Fatalf("faults: %v", faults)
				}
				force, length := unitsOf(t, c.Input.Units)
				out := p.NewTransfers()
				for _, e := range c.Expect.Transfers {
					i := slices.IndexFunc(cases, func(c SpliceCase) bool { return c.ID == e.LoadCase })
					p.Transfers(i, &out)
					k := slices.IndexFunc(out.Interfaces, func(l InterfaceLoad) bool {
						return l.Row == e.Row && s.Members[l.First].ID == e.Between[0] && s.Members[l.Second].ID == e.Between[1]
					})
					if k < 0 {
						t.Fatalf("no interface %v at row %d", e.Between, e.Row)
					}
					if e.Share != "" {
						assertPrinted(t, fmt.Sprintf("row %d share", e.Row), out.Interfaces[k].Share, e.Share)
					}
					if e.Load != "" {
						assertPrinted(t, fmt.Sprintf("row %d load", e.Row), out.Interfaces[k].Load/force, e.Load)
					}
					compared++
				}
				margins := make([]strength.Margin, len(p.Checks()))
				for _, e := range c.Expect.Checks {
					i := slices.IndexFunc(cases, func(c SpliceCase) bool { return c.ID == e.LoadCase })
					p.Margins(i, margins)
					k := slices.IndexFunc(p.Checks(), func(c strength.Check) bool {
						return c.Row == e.Row && c.Member == e.Member && c.Mode.String() == e.Mode && c.Level.String() == e.Level && (e.Method == "" || c.Method == e.Method)
					})
					if k < 0 {
						t.Fatalf("no check %+v", e)
					}
					what := fmt.Sprintf("row %d %s %s %s", e.Row, e.Member, e.Mode, e.Level)
					assertPrinted(t, what+" demand", margins[k].Demand/force, e.Demand)
					assertPrinted(t, what+" allowable", margins[k].Allowable/force, e.Allowable)
					assertPrinted(t, what+" margin", margins[k].Margin, e.Margin)
					compared++
				}
				for _, e := range c.Expect.Workings {
					workings := p.ComplianceWorkings(e.Row)
					k := slices.IndexFunc(workings, func(w strength.Working) bool { return w.Symbol == e.Symbol })
					if k < 0 {
						t.Fatalf("no working %s at row %d", e.Symbol, e.Row)
					}
					unit := math.Pow(force, float64(workings[k].Unit.Force)) * math.Pow(length, float64(workings[k].Unit.Length))
					assertPrinted(t, fmt.Sprintf("row %d %s", e.Row, e.Symbol), workings[k].Value/unit, e.Value)
					compared++
				}
			})
		}
	}
	if compared < 80 {
		t.Errorf("only %d values were compared", compared)
	}
}
