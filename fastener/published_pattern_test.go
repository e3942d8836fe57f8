package fastener

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"jointledger/strength"
)

// wire* are the request documents of POST /v1/fastener-groups as far as
// published cases use them.
type wirePattern struct {
	Units       string         `json:"units"`
	Title       string         `json:"title"`
	Stiffness   string         `json:"stiffness"`
	Fasteners   []wireFastener `json:"fasteners"`
	Plates      []wirePlate    `json:"plates"`
	Rules       []string       `json:"rules"`
	Interaction string         `json:"interaction"`
	Methods     []string       `json:"methods"`
	Options     struct {
		AISC struct {
			Basis              string `json:"basis"`
			DeformationAllowed bool   `json:"deformation_allowed"`
			ApplySpecial       bool   `json:"apply_special"`
		} `json:"aisc-360-j3"`
		EN struct {
			GammaM2      float64 `json:"gamma_m2"`
			ApplySpecial bool    `json:"apply_special"`
		} `json:"en-1993-1-8"`
	} `json:"method_options"`
	Packing    float64 `json:"packing_thickness"`
	InPlane    string  `json:"in_plane"`
	OutOfPlane string  `json:"out_of_plane"`
	Factors    struct {
		Ultimate float64 `json:"ultimate"`
		Fitting  float64 `json:"fitting"`
	} `json:"factors"`
	LoadCases []struct {
		ID     string     `json:"id"`
		Level  string     `json:"level"`
		Point  [3]float64 `json:"point"`
		Force  [3]float64 `json:"force"`
		Moment [3]float64 `json:"moment"`
	} `json:"load_cases"`
}

type wireFastener struct {
	ID               string    `json:"id"`
	X                float64   `json:"x"`
	Y                float64   `json:"y"`
	Diameter         float64   `json:"diameter"`
	Type             *wireType `json:"type"`
	HoleDiameter     float64   `json:"hole_diameter"`
	ShearPlanes      int       `json:"shear_planes"`
	ShearStiffness   float64   `json:"shear_stiffness"`
	TensionStiffness float64   `json:"tension_stiffness"`
}

type wireType struct {
	Name            string  `json:"name"`
	Source          string  `json:"source"`
	ShearStrength   float64 `json:"shear_strength"`
	TensionStrength float64 `json:"tension_strength"`
	Fsu             float64 `json:"fsu"`
	Ftu             float64 `json:"ftu"`
	Thread          *struct {
		Form         string  `json:"form"`
		Pitch        float64 `json:"pitch"`
		InShearPlane bool    `json:"in_shear_plane"`
	} `json:"thread"`
	Head                string  `json:"head"`
	HeadDiameter        float64 `json:"head_diameter"`
	PropertyClass       string  `json:"property_class"`
	PullThroughStrength float64 `json:"pull_through_strength"`
}

type wirePlate struct {
	ID               string        `json:"id"`
	Thickness        float64       `json:"thickness"`
	Material         *wireMaterial `json:"material"`
	Outline          [][2]float64  `json:"outline"`
	CountersinkDepth float64       `json:"countersink_depth"`
	LoadShare        float64       `json:"load_share"`
	AxisAngle        *float64      `json:"axis_angle"`
}

type wireMaterial struct {
	Name      string  `json:"name"`
	Direction string  `json:"direction"`
	Basis     string  `json:"basis"`
	Source    string  `json:"source"`
	Ftu       float64 `json:"ftu"`
	Fty       float64 `json:"fty"`
	Fsu       float64 `json:"fsu"`
	Fcy       float64 `json:"fcy"`
	E         float64 `json:"e"`
	Ec        float64 `json:"ec"`
	Bearing   []struct {
		EOverD float64 `json:"e_over_d"`
		Fbru   float64 `json:"fbru"`
		Fbry   float64 `json:"fbry"`
	} `json:"bearing"`
}

// scale is the size of a unit of the request in N and mm.
type scale struct{ force, length float64 }

var scales = map[string]scale{
	"SI": {1, 1},
	"US": {4.4482216152605, 25.4},
}

func (s scale) of(u strength.Unit) float64 {
	return math.Pow(s.force, float64(u.Force)) * math.Pow(s.length, float64(u.Length))
}

var levels = map[string]strength.Level{"limit": strength.Limit, "ultimate": strength.Ultimate}

func (w wirePattern) pattern(t *testing.T) (Pattern, strength.Factors, []PatternCase) {
	t.Helper()
	s, ok := scales[w.Units]
	if !ok {
		t.Fatalf("units %q", w.Units)
	}
	force, length, moment := s.force, s.length, s.of(strength.Moment)
	p := Pattern{
		Stiffness: w.Stiffness, Interaction: w.Interaction, InPlane: w.InPlane, OutOfPlane: w.OutOfPlane,
		Methods: w.Methods, AISC: AISCOptions(w.Options.AISC), EN: ENOptions(w.Options.EN), PackingThickness: w.Packing * length,
	}
	for _, f := range w.Fasteners {
		fastener := Fastener{
			ID: f.ID, HoleDiameter: f.HoleDiameter * length, X: f.X * length, Y: f.Y * length, Diameter: f.Diameter * length,
			ShearPlanes: f.ShearPlanes, ShearStiffness: f.ShearStiffness, TensionStiffness: f.TensionStiffness,
		}
		fastener.Type = f.Type.decode(s)
		p.Fasteners = append(p.Fasteners, fastener)
	}
	for _, k := range w.Plates {
		plate := Plate{ID: k.ID, Thickness: k.Thickness * length, CountersinkDepth: k.CountersinkDepth * length, LoadShare: k.LoadShare, AxisAngle: k.AxisAngle}
		for _, o := range k.Outline {
			plate.Outline = append(plate.Outline, [2]float64{o[0] * length, o[1] * length})
		}
		plate.Material = k.Material.decode(s)
		p.Plates = append(p.Plates, plate)
	}
	for _, name := range w.Rules {
		set, ok := FindRules(name)
		if !ok {
			t.Fatalf("rules %q", name)
		}
		p.Rules = append(p.Rules, set)
	}
	cases := make([]PatternCase, len(w.LoadCases))
	for i, c := range w.LoadCases {
		cases[i] = PatternCase{ID: c.ID, Level: levels[c.Level]}
		for k := range 3 {
			cases[i].Point[k], cases[i].Force[k], cases[i].Moment[k] = c.Point[k]*length, c.Force[k]*force, c.Moment[k]*moment
		}
	}
	return p, strength.Factors{Ultimate: w.Factors.Ultimate, Fitting: w.Factors.Fitting}, cases
}

func (w *wireType) decode(s scale) *Type {
	if w == nil {
		return nil
	}
	stress := s.of(strength.Stress)
	t := &Type{
		Name: w.Name, Source: w.Source,
		ShearStrength: w.ShearStrength * s.force, TensionStrength: w.TensionStrength * s.force,
		Fsu: w.Fsu * stress, Ftu: w.Ftu * stress,
		Head: w.Head, HeadDiameter: w.HeadDiameter * s.length, Class: w.PropertyClass, PullThroughStrength: w.PullThroughStrength * s.force,
	}
	if th := w.Thread; th != nil {
		t.Thread = &Thread{th.Form, th.Pitch * s.length, th.InShearPlane}
	}
	return t
}

func (w *wireMaterial) decode(s scale) *strength.Material {
	if w == nil {
		return nil
	}
	stress := s.of(strength.Stress)
	m := &strength.Material{
		Name: w.Name, Direction: w.Direction, Basis: w.Basis, Source: w.Source, Ftu: w.Ftu * stress, Fty: w.Fty * stress,
		Fsu: w.Fsu * stress, Fcy: w.Fcy * stress, E: w.E * stress, Ec: w.Ec * stress,
	}
	for _, b := range w.Bearing {
		m.Bearing = append(m.Bearing, strength.BearingStrength{EOverD: b.EOverD, Fbru: b.Fbru * stress, Fbry: b.Fbry * stress})
	}
	return m
}

// printed is a value with its digits as printed, and how near to come: half a
// unit of the last digit unless the file gives a tolerance and says why.
type printed struct {
	Scale     float64 `json:"scale"`
	Tolerance float64 `json:"tolerance"`
	Relative  float64 `json:"relative"`
	Why       string  `json:"why"`
}

func (p printed) compare(t *testing.T, what, want string, got float64) {
	t.Helper()
	value, err := strconv.ParseFloat(want, 64)
	if err != nil {
		t.Fatalf("%s: %v", what, err)
	}
	_, decimals, _ := strings.Cut(want, ".")
	tolerance := 0.5 * math.Pow(10, -float64(len(decimals)))
	if p.Tolerance > 0 || p.Relative > 0 {
		if p.Why == "" {
			t.Errorf("%s: a tolerance without its reason", what)
		}
		tolerance = max(p.Tolerance, p.Relative*math.Abs(value))
	}
	if p.Scale != 0 {
		got /= p.Scale
	}
	if !(math.Abs(got-value) <= tolerance*(1+1e-6)) {
		t.Errorf("%s: got %.8g, published %s (within %.3g)", what, got, want, tolerance)
	}
}

type expectedCheck struct {
	printed
	LoadCase  string `json:"load_case"`
	Member    string `json:"member"`
	Fastener  string `json:"fastener"`
	Mode      string `json:"mode"`
	Level     string `json:"level"`
	Method    string `json:"method"`
	Demand    string `json:"demand"`
	Allowable string `json:"allowable"`
	Margin    string `json:"margin"`
	Status    string `json:"status"`
	Symbol    string `json:"symbol"`
	Value     string `json:"value"`
}

type publishedPatterns struct {
	About string `json:"about"`
	Cases []struct {
		Title  string          `json:"title"`
		Source string          `json:"source"`
		Mark   string          `json:"mark"`
		Hand   []string        `json:"hand"`
		Input  json.RawMessage `json:"input"`
		Expect struct {
			Centroid []string `json:"centroid"`
			Shares   []struct {
				printed
				LoadCase  string    `json:"load_case"`
				Fastener  string    `json:"fastener"`
				Shear     [2]string `json:"shear"`
				Resultant string    `json:"shear_resultant"`
				Tension   string    `json:"tension"`
			} `json:"shares"`
			Checks   []expectedCheck `json:"checks"`
			Workings []expectedCheck `json:"workings"`
			Findings []struct {
				Code     string `json:"code"`
				Subject  string `json:"subject"`
				Severity string `json:"severity"`
			} `json:"findings"`
		} `json:"expect"`
	} `json:"cases"`
}

func decodeStrict(t *testing.T, data []byte, into any) {
	t.Helper()
	d := json.NewDecoder(bytes.NewReader(data))
	d.DisallowUnknownFields()
	if err := d.Decode(into); err != nil {
		t.Fatal(err)
	}
}

func TestPublishedPatterns(t *testing.T) {
	files, err := filepath.Glob("../testdata/published/fastener-*.json")
	if err != nil || len(files) == 0 {
		t.Fatalf("no published cases: %v", err)
	}
	for _, name := range files {
		data, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		var file publishedPatterns
		decodeStrict(t, data, &file)
		for _, c := range file.Cases {
			t.Run(filepath.Base(name)+"/"+c.Title, func(t *testing.T) {
				if _, ok := strength.ParseMark(c.Mark); !ok || c.Source == "" {
					t.Fatalf("mark %q, source %q", c.Mark, c.Source)
				}
				var w wirePattern
				decodeStrict(t, c.Input, &w)
				pattern, factors, cases := w.pattern(t)
				p, faults := PreparePattern(pattern, factors, cases)
				if len(faults) > 0 {
					t.Fatal(faultText(faults))
				}
				s := scales[w.Units]
				asserted := 0
				compare := func(q printed, what, want string, got float64) {
					if want != "" {
						asserted++
						q.compare(t, what, want, got)
					}
				}
				for i, want := range c.Expect.Centroid {
					compare(printed{}, "centroid", want, p.Centroid()[i]/s.length)
				}
				caseIndex := func(id string) int {
					for i, c := range cases {
						if c.ID == id {
							return i
						}
					}
					t.Fatalf("load case %q", id)
					return -1
				}
				shares := make([]Share, len(pattern.Fasteners))
				for _, want := range c.Expect.Shares {
					if residual := p.Shares(caseIndex(want.LoadCase), shares); residual > 1e-9 {
						t.Errorf("residual %g", residual)
					}
					for i, f := range pattern.Fasteners {
						if f.ID != want.Fastener {
							continue
						}
						at := "fastener " + f.ID + " "
						compare(want.printed, at+"V_x", want.Shear[0], shares[i].Shear[0]/s.force)
						compare(want.printed, at+"V_y", want.Shear[1], shares[i].Shear[1]/s.force)
						compare(want.printed, at+"V", want.Resultant, shares[i].Resultant/s.force)
						compare(want.printed, at+"T", want.Tension, shares[i].Tension/s.force)
					}
				}
				margins := make([]strength.Margin, len(p.Checks()))
				find := func(want expectedCheck) (int, int) {
					for k, check := range p.Checks() {
						if check.Member == want.Member && check.Fastener == want.Fastener && check.Mode.String() == want.Mode &&
							check.Level.String() == want.Level && (want.Method == "" || check.Method == want.Method) {
							return caseIndex(want.LoadCase), k
						}
					}
					t.Fatalf("no check %+v", want)
					return 0, 0
				}
				for _, want := range c.Expect.Checks {
					i, k := find(want)
					p.Margins(i, margins)
					what, unit := want.Member+" "+want.Fastener+" "+want.Mode+" "+want.Level+" ", s.of(p.Checks()[k].Unit)
					compare(want.printed, what+"demand", want.Demand, margins[k].Demand/unit)
					compare(want.printed, what+"allowable", want.Allowable, margins[k].Allowable/unit)
					compare(want.printed, what+"margin", want.Margin, margins[k].Margin)
					if want.Status != "" {
						asserted++
						if got := margins[k].Status.String(); got != want.Status {
							t.Errorf("%s: status %s, want %s", what, got, want.Status)
						}
					}
				}
				for _, want := range c.Expect.Workings {
					i, k := find(want)
					found := false
					for _, step := range p.CaseWorkings(i, k, p.Workings(k, nil)) {
						if step.Symbol == want.Symbol && (step.Fastener == want.Fastener || step.Fastener == "") {
							found = true
							compare(want.printed, want.Symbol, want.Value, step.Value/s.of(step.Unit))
						}
					}
					if !found {
						t.Errorf("no working %s of %s %s", want.Symbol, want.Member, want.Mode)
					}
				}
				for _, want := range c.Expect.Findings {
					found := false
					for _, f := range p.Findings() {
						found = found || f.Code == want.Code && f.Subject == want.Subject && f.Severity.String() == want.Severity
					}
					asserted++
					if !found {
						t.Errorf("no finding %+v", want)
					}
				}
				if asserted == 0 {
					t.Error("the case expects nothing")
				}
			})
		}
	}
}
