package lug_test

import (
	"bytes"
	"encoding/json"
	"maps"
	"os"
	"slices"
	"strings"
	"testing"

	"jointledger/lug"
	"jointledger/strength"
)

// The wire form of a lug request, as far as published cases use it, turned
// into a joint in N, mm and MPa.

type wireMaterial struct {
	Name       string  `json:"name"`
	Direction  string  `json:"direction"`
	Basis      string  `json:"basis"`
	Source     string  `json:"source"`
	Ftu        float64 `json:"ftu"`
	Fty        float64 `json:"fty"`
	FtuCross   float64 `json:"ftu_cross"`
	FtyCross   float64 `json:"fty_cross"`
	Fcy        float64 `json:"fcy"`
	Fsu        float64 `json:"fsu"`
	E          float64 `json:"e"`
	Ec         float64 `json:"ec"`
	Nu         float64 `json:"nu"`
	Elongation float64 `json:"elongation"`
	Bearing    []struct {
		EOverD float64 `json:"e_over_d"`
		Fbru   float64 `json:"fbru"`
		Fbry   float64 `json:"fbry"`
	} `json:"bearing"`
}

type wireHead struct {
	Shape          string       `json:"shape"`
	Width          float64      `json:"width"`
	Thickness      float64      `json:"thickness"`
	HoleDiameter   float64      `json:"hole_diameter"`
	EdgeDistance   float64      `json:"edge_distance"`
	EndRadius      float64      `json:"end_radius"`
	TaperAngle     float64      `json:"taper_angle"`
	Offset         float64      `json:"offset"`
	SectionDepths  *[4]float64  `json:"section_depths"`
	BodyWidth      float64      `json:"body_width"`
	BodyLength     float64      `json:"body_length"`
	BodyRestrained bool         `json:"body_restrained"`
	Material       wireMaterial `json:"material"`
}

type wireBushing struct {
	Material     wireMaterial `json:"material"`
	Interference float64      `json:"interference"`
	Length       float64      `json:"length"`
}

type wireRequest struct {
	Units   string       `json:"units"`
	Title   string       `json:"title"`
	Joint   string       `json:"joint"`
	Methods []string     `json:"methods"`
	Compare []string     `json:"compare"`
	Lug     wireHead     `json:"lug"`
	Bushing *wireBushing `json:"bushing"`
	Pin     *struct {
		Diameter      float64      `json:"diameter"`
		InnerDiameter float64      `json:"inner_diameter"`
		Material      wireMaterial `json:"material"`
	} `json:"pin"`
	Clevis *struct {
		wireHead
		Gap         float64      `json:"gap"`
		Bushing     *wireBushing `json:"bushing"`
		LegShare    float64      `json:"leg_share"`
		MomentShare *float64     `json:"moment_share"`
	} `json:"clevis"`
	Factors struct {
		Ultimate float64 `json:"ultimate"`
		Fitting  float64 `json:"fitting"`
	} `json:"factors"`
	MethodOptions map[string]map[string]any `json:"method_options"`
	LoadCases     []struct {
		ID    string  `json:"id"`
		Level string  `json:"level"`
		Force float64 `json:"force"`
		Angle float64 `json:"angle"`
	} `json:"load_cases"`
}

// scale is N, mm and MPa for one unit of the request.
type scale struct{ force, length float64 }

func scaleOf(units string) scale {
	if units == "US" {
		return scale{4.4482216152605, 25.4}
	}
	return scale{1, 1}
}

func (u scale) stress() float64 { return u.force / (u.length * u.length) }

// of is what one of the caller's units of a quantity is inside.
func (u scale) of(unit strength.Unit) float64 {
	f := 1.0
	for range abs(int(unit.Force)) {
		f *= u.force
	}
	if unit.Force < 0 {
		f = 1 / f
	}
	for range abs(int(unit.Length)) {
		if unit.Length > 0 {
			f *= u.length
		} else {
			f /= u.length
		}
	}
	return f
}

func abs(i int) int { return max(i, -i) }

func (u scale) material(w wireMaterial) strength.Material {
	s := u.stress()
	m := strength.Material{
		Name: w.Name, Direction: w.Direction, Basis: w.Basis, Source: w.Source,
		Ftu: w.Ftu * s, Fty: w.Fty * s, FtuCross: w.FtuCross * s, FtyCross: w.FtyCross * s,
		Fcy: w.Fcy * s, Fsu: w.Fsu * s, E: w.E * s, Ec: w.Ec * s, Nu: w.Nu, Elongation: w.Elongation,
	}
	for _, b := range w.Bearing {
		m.Bearing = append(m.Bearing, strength.BearingStrength{EOverD: b.EOverD, Fbru: b.Fbru * s, Fbry: b.Fbry * s})
	}
	return m
}

func (u scale) head(w wireHead) lug.Head {
	h := lug.Head{
		Shape: map[string]lug.Shape{"round": lug.Round, "square": lug.Square, "tapered": lug.Tapered}[w.Shape],
		Width: w.Width * u.length, Thickness: w.Thickness * u.length, HoleDiameter: w.HoleDiameter * u.length,
		EdgeDistance: w.EdgeDistance * u.length, EndRadius: w.EndRadius * u.length, TaperAngle: w.TaperAngle,
		Offset: w.Offset * u.length, BodyWidth: w.BodyWidth * u.length, BodyLength: w.BodyLength * u.length,
		BodyRestrained: w.BodyRestrained, Material: u.material(w.Material),
	}
	if w.SectionDepths != nil {
		depths := *w.SectionDepths
		for i := range depths {
			depths[i] *= u.length
		}
		h.SectionDepths = &depths
	}
	return h
}

func (u scale) bushing(w *wireBushing) *lug.Bushing {
	if w == nil {
		return nil
	}
	return &lug.Bushing{Material: u.material(w.Material), Interference: w.Interference * u.length, Length: w.Length * u.length}
}

// request is a request in the words of package lug.
type request struct {
	joint   lug.Joint
	choices []lug.Choice
	factors strength.Factors
	cases   []lug.LoadCase
	units   scale
}

func decodeRequest(t *testing.T, raw []byte) request {
	t.Helper()
	var w wireRequest
	d := json.NewDecoder(bytes.NewReader(raw))
	d.DisallowUnknownFields()
	if err := d.Decode(&w); err != nil {
		t.Fatalf("request: %v", err)
	}
	u := scaleOf(w.Units)
	r := request{units: u, factors: strength.Factors{Ultimate: w.Factors.Ultimate, Fitting: w.Factors.Fitting}}
	r.joint = lug.Joint{SingleShear: w.Joint == "single-shear", Lug: u.head(w.Lug), Bushing: u.bushing(w.Bushing)}
	if w.Pin != nil {
		r.joint.Pin = &lug.Pin{Diameter: w.Pin.Diameter * u.length, InnerDiameter: w.Pin.InnerDiameter * u.length, Material: u.material(w.Pin.Material)}
	}
	if c := w.Clevis; c != nil {
		r.joint.Clevis = &lug.Clevis{
			Head: u.head(c.wireHead), Gap: c.Gap * u.length, Bushing: u.bushing(c.Bushing), LegShare: c.LegShare, MomentShare: c.MomentShare,
		}
	}
	for _, name := range w.Methods {
		r.choices = append(r.choices, lug.Choice{Method: name, Options: decodeOptions(t, name, w.MethodOptions)})
	}
	for _, name := range w.Compare {
		r.choices = append(r.choices, lug.Choice{Method: name, Compared: true, Options: decodeOptions(t, name, w.MethodOptions)})
	}
	for _, c := range w.LoadCases {
		level := map[string]strength.Level{"limit": strength.Limit, "ultimate": strength.Ultimate}[c.Level]
		r.cases = append(r.cases, lug.LoadCase{ID: c.ID, Level: level, Force: c.Force * u.force, Angle: c.Angle})
	}
	return r
}

func decodeOptions(t *testing.T, method string, all map[string]map[string]any) lug.Options {
	t.Helper()
	id, _, _ := strings.Cut(method, "@")
	options := lug.Options{}
	for name, v := range all[id] {
		if name == "curve_set" {
			options[name] = lug.Value{Set: decodeSet(t, v)}
			continue
		}
		switch v := v.(type) {
		case float64:
			options[name] = lug.Value{Number: v}
		case string:
			options[name] = lug.Value{Word: v}
		case bool:
			options[name] = lug.Value{Flag: v}
		default:
			t.Fatalf("option %s.%s has the value %v", id, name, v)
		}
	}
	return options
}

func (r request) prepare(t *testing.T) *lug.Prepared {
	t.Helper()
	p, wrong := lug.Prepare(r.joint, r.choices, r.factors, r.cases)
	for _, f := range wrong {
		t.Errorf("%s: %s", f.Pointer, render(f.Message))
	}
	if len(wrong) > 0 {
		t.FailNow()
	}
	return p
}

// publishedFiles are the published cases of lugs by file name.
func publishedFiles(t *testing.T) map[string][]byte {
	t.Helper()
	files := map[string][]byte{}
	entries, err := os.ReadDir("../testdata/published")
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), "lug-") {
			continue
		}
		raw, err := os.ReadFile("../testdata/published/" + e.Name())
		if err != nil {
			t.Fatal(err)
		}
		files[e.Name()] = raw
	}
	if len(files) == 0 {
		t.Fatal("no published cases")
	}
	return files
}

func sortedKeys[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }

// decodeSet takes a curve set by the name of a built-in one, or as it is.
func decodeSet(t *testing.T, v any) *lug.CurveSet {
	t.Helper()
	if name, ok := v.(string); ok {
		for _, set := range lug.BuiltInCurveSets() {
			if name == set.ID || name == set.Name() {
				return &set
			}
		}
		t.Fatalf("no built-in curve set %q", name)
	}
	raw, err := json.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	var w struct {
		ID        string  `json:"id"`
		Version   string  `json:"version"`
		Method    string  `json:"method"`
		Document  string  `json:"document"`
		Reader    string  `json:"reader"`
		Tolerance float64 `json:"tolerance"`
		Charts    map[string]struct {
			Figure  string  `json:"figure"`
			Along   string  `json:"along"`
			Between *string `json:"between"`
			Curves  []struct {
				At     float64      `json:"at"`
				Points [][2]float64 `json:"points"`
			} `json:"curves"`
		} `json:"charts"`
	}
	d := json.NewDecoder(bytes.NewReader(raw))
	d.DisallowUnknownFields()
	if err := d.Decode(&w); err != nil {
		t.Fatalf("curve set: %v", err)
	}
	set := &lug.CurveSet{
		ID: w.ID, Version: w.Version, Method: w.Method, Document: w.Document, Reader: w.Reader, Tolerance: w.Tolerance,
		Charts: map[string]lug.Chart{},
	}
	for name, c := range w.Charts {
		chart := lug.Chart{Figure: c.Figure, Along: c.Along}
		if c.Between != nil {
			chart.Between = *c.Between
		}
		for _, curve := range c.Curves {
			chart.Curves = append(chart.Curves, lug.Curve{At: curve.At, Points: curve.Points})
		}
		set.Charts[name] = chart
	}
	return set
}
