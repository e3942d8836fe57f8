package api_test

import (
	"encoding/json"
	"fmt"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"testing"

	"jointledger/api"
	"jointledger/service"
	"jointledger/store/storetest"
)

// edited is a JSON document with some members changed, each named by a pointer
// without escapes; a value of removed takes the member away.
func edited(t testing.TB, document []byte, changes map[string]any) []byte {
	t.Helper()
	var root any
	if err := json.Unmarshal(document, &root); err != nil {
		t.Fatal(err)
	}
	// Parents before what is below them.
	for _, pointer := range sortedKeys(changes) {
		value := changes[pointer]
		tokens := strings.Split(pointer, "/")[1:]
		at := root
		for i, token := range tokens {
			last := i == len(tokens)-1
			switch parent := at.(type) {
			case map[string]any:
				switch {
				case last && value == removed:
					delete(parent, token)
				case last:
					parent[token] = value
				}
				at = parent[token]
			case []any:
				index, err := strconv.Atoi(token)
				if err != nil {
					t.Fatal(err)
				}
				if last {
					parent[index] = value
				}
				at = parent[index]
			default:
				t.Fatalf("there is nothing at %s", pointer)
			}
		}
	}
	out, err := json.Marshal(root)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

type nothing struct{}

var removed = nothing{}

// example is a named body of an operation.
func example(t testing.TB, operationID, name string) []byte {
	t.Helper()
	body, ok := theDocument(t).operation(t, operationID).examples(t)[name]
	if !ok {
		t.Fatalf("%s has no example %s", operationID, name)
	}
	return body
}

// accepts reports whether a schema of the document lets a body pass.
func (d *document) accepts(t testing.TB, schema string, body []byte) bool {
	t.Helper()
	ok, _ := d.schemas.ValidateSchemaString(d.model.Components.Schemas.GetOrZero(schema).Schema(), string(body))
	return ok
}

// TestMalformed: what is not the JSON that is asked for is 400, at the first
// place that shows it, and the document's schema refuses it too.
func TestMalformed(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	lug, group, record := example(t, "calculateLug", "lugSI"), example(t, "calculateFastenerGroup", "boltPattern"), example(t, "addRecord", "record")
	for _, kind := range []struct {
		target, schema string
		body           []byte
		changes        map[string]map[string]any // by the pointer that is expected
	}{
		{"/v1/lugs", "LugInput", lug, map[string]map[string]any{
			"/colour":              {"/colour": "red"},
			"/lug/colour":          {"/lug/colour": "red"},
			"/lug/Width":           {"/lug/Width": 60, "/lug/width": removed},
			"/Units":               {"/Units": "SI", "/units": removed},
			"/units":               {"/units": removed},
			"/lug/width":           {"/lug/width": removed},
			"/load_cases/0/angle":  {"/load_cases/0/angle": removed},
			"/factors":             {"/factors": removed},
			"/lug/thickness":       {"/lug/thickness": "12"},
			"/methods":             {"/methods": "elementary"},
			"/methods/0":           {"/methods/0": 1},
			"/lug/material":        {"/lug/material": 7},
			"/lug/material/ftu":    {"/lug/material/ftu": "strong"},
			"/lug/shape":           {"/lug/shape": "oval"},
			"/load_cases/0/level":  {"/load_cases/0/level": "proof"},
			"/title":               {"/title": nil},
			"/lug/offset":          {"/lug/offset": nil},
			"/lug/body_restrained": {"/lug/body_restrained": 1},
			"/load_cases":          {"/load_cases": map[string]any{}},
			"/lug/section_depths":  {"/lug/section_depths": []int{1, 2, 3}},
		}},
		{"/v1/fastener-groups", "FastenerGroupInput", group, map[string]map[string]any{
			"/units":                         {"/units": "us"},
			"/fasteners/0/x":                 {"/fasteners/0/x": removed},
			"/fasteners/3/head":              {"/fasteners/3/head": "hexagonal"},
			"/fasteners/1/type/fsu":          {"/fasteners/1/type/fsu": true},
			"/fasteners/0/shear_planes":      {"/fasteners/0/shear_planes": 1.5},
			"/plates/0/outline/1":            {"/plates/0/outline/1": []any{2.5}},
			"/plates/0/outline/1/0":          {"/plates/0/outline/1/0": "2.5"},
			"/load_cases/0/force":            {"/load_cases/0/force": []any{0, -1600}},
			"/load_cases/0/moment":           {"/load_cases/0/moment": nil},
			"/factors/special/0/Modes":       {"/factors/special": []any{map[string]any{"name": "x", "value": 2, "Modes": []any{}}}},
			"/factors/special/0/value":       {"/factors/special": []any{map[string]any{"name": "x"}}},
			"/fasteners/0/type/thread/pitch": {"/fasteners/0/type": map[string]any{"thread": map[string]any{"form": "iso"}}},
		}},
		{"/v1/records", "RecordRequest", record, map[string]map[string]any{
			"/subject":              {"/subject": removed},
			"/subject/part":         {"/subject/part": removed},
			"/subject/Aspect":       {"/subject/Aspect": "x"},
			"/kind":                 {"/kind": "bolt"},
			"/input":                {"/input": removed},
			"/input/units":          {"/input/units": removed},
			"/input/lug/width":      {"/input/lug/width": "60"},
			"/input/load_cases/0/x": {"/input/load_cases/0/x": 1},
		}},
	} {
		for _, pointer := range sortedKeys(kind.changes) {
			body := edited(t, kind.body, kind.changes[pointer])
			if theDocument(t).accepts(t, kind.schema, body) {
				t.Errorf("%s %s: the document lets it pass", kind.target, pointer)
			}
			a := c.do(t, post(kind.target, body)).want(t, http.StatusBadRequest)
			if found := a.pointers(); !slices.Equal(found, []string{pointer}) {
				t.Errorf("%s: found %q (%s), want %q", kind.target, found, a.body, pointer)
			}
		}
	}
	text := string(lug)
	deep := func(n int) string { return strings.Repeat(`[`, n) + strings.Repeat(`]`, n) }
	for name, bad := range map[string]struct{ body, pointer string }{
		"a duplicate member":       {strings.Replace(text, `"units":"SI"`, `"units":"SI","units":"SI"`, 1), "/units"},
		"a duplicate by escape":    {strings.Replace(text, `"units":"SI"`, `"units":"SI","\u0075nits":"SI"`, 1), "/units"},
		"trailing text":            {text + "x", ""},
		"two documents":            {text + text, ""},
		"a number beyond float64":  {strings.Replace(text, `"width":60`, `"width":1e999`, 1), "/lug/width"},
		"one beyond it below zero": {strings.Replace(text, `"force":45000`, `"force":-1e400`, 1), "/load_cases/0/force"},
		"NaN":                      {strings.Replace(text, `"width":60`, `"width":NaN`, 1), "/lug/width"},
		"a leading plus":           {strings.Replace(text, `"width":60`, `"width":+60`, 1), "/lug/width"},
		"a leading zero":           {strings.Replace(text, `"width":60`, `"width":060`, 1), "/lug"},
		"a comment":                {"// a lug\n" + text, ""},
		"a byte order mark":        {"\uFEFF" + text, ""},
		"an array":                 {"[]", ""},
		"a string":                 {`"SI"`, ""},
		"null":                     {"null", ""},
		"half of it":               {text[:len(text)/2], ""},
		"white space":              {" \n", ""},
		"no UTF-8":                 {strings.Replace(text, "lower lug", "lower \xff lug", 1), "/title"},
		"half a surrogate":         {strings.Replace(text, "lower lug", `lower \ud83d lug`, 1), "/title"},
		"nesting 33 deep":          {strings.Replace(text, `"methods":["elementary"]`, `"methods":["elementary"],"method_options":{"elementary":{"pin_bending_factor":`+deep(30)+`}}`, 1), "/method_options/elementary/pin_bending_factor" + strings.Repeat("/0", 29)},
		"nesting without end":      {deep(100_000), ""},
	} {
		if bad.body == text {
			t.Fatalf("%s: the body is not changed", name)
		}
		a := c.do(t, post("/v1/lugs", []byte(bad.body))).want(t, http.StatusBadRequest)
		switch found := a.pointers(); {
		case name == "half of it" || name == "nesting without end":
			if len(found) != 1 {
				t.Errorf("%s: %s", name, a.body)
			}
		case !slices.Equal(found, []string{bad.pointer}):
			t.Errorf("%s: found %q, want %q: %s", name, found, bad.pointer, a.body)
		}
	}
	for target, pointer := range map[string]string{
		"/v1/lugs?workings=all": "/workings", "/v1/lugs?workings=": "/workings", "/v1/lugs?checks=some": "/checks", "/v1/lugs?checks=": "/checks",
		"/v1/lugs?checks=all&checks=all": "/checks", "/v1/lugs?Checks=all": "/Checks",
	} {
		a := c.do(t, post(target, lug))
		if a.status != http.StatusBadRequest || !slices.Equal(a.pointers(), []string{pointer}) {
			t.Errorf("%s: %d: %s", target, a.status, a.body)
		}
	}
	for target, pointer := range map[string]string{
		"/v1/materials?units=metric": "/units", "/v1/methods?kind=glue": "/kind", "/v1/materials?units=SI&units=US": "/units",
	} {
		a := c.do(t, get(target)).want(t, http.StatusBadRequest)
		if !slices.Equal(a.pointers(), []string{pointer}) {
			t.Errorf("%s: %s", target, a.body)
		}
	}
}

// TestInvalid: what can be read and not used is 422, with every place at once.
func TestInvalid(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	lug, clevis := example(t, "calculateLug", "lugSI"), example(t, "calculateLug", "clevisJoint")
	group, record := example(t, "calculateFastenerGroup", "boltPattern"), example(t, "addRecord", "record")
	splice, steps := example(t, "calculateSplice", "capSplice"), example(t, "findSpliceSteps", "evenCap")
	sizes := example(t, "sizeFastenerGroup", "boltsOfBracket")
	type changes = map[string]any
	type at = []string
	cases := func(ids ...string) []any {
		var list []any
		for _, id := range ids {
			list = append(list, changes{"id": id, "level": "limit", "force": 1000, "angle": 0})
		}
		return list
	}
	bolt := func(id string, x, y float64) changes { return changes{"id": id, "x": x, "y": y, "diameter": 0.25} }
	load := func(point, force, moment [3]float64) []any {
		return []any{changes{"id": "L", "level": "limit", "point": point, "force": force, "moment": moment}}
	}
	bare := func(c changes) changes {
		c["/plates"], c["/rules"] = []any{}, []any{}
		return c
	}
	for _, k := range []struct {
		name, target string
		body         []byte
		changes      changes
		pointers     at
	}{
		{"hole as wide as the lug", "/v1/lugs", lug, changes{"/lug/hole_diameter": 60, "/lug/edge_distance": 70}, at{"/lug/hole_diameter"}},
		{"hole wider than the lug", "/v1/lugs", lug, changes{"/lug/hole_diameter": 80, "/lug/edge_distance": 70}, at{"/lug/hole_diameter"}},
		{"edge distance of half the hole", "/v1/lugs", lug, changes{"/lug/shape": "square", "/lug/edge_distance": 10}, at{"/lug/edge_distance"}},
		{"round end shorter than half the width", "/v1/lugs", lug, changes{"/lug/edge_distance": 29}, at{"/lug/edge_distance"}},
		{"zero sizes", "/v1/lugs", lug, changes{"/lug/thickness": 0}, at{"/lug/thickness"}},
		{"negative size", "/v1/lugs", lug, changes{"/lug/thickness": -12}, at{"/lug/thickness"}},
		{"size too small", "/v1/lugs", lug, changes{"/lug/thickness": 1e-10}, at{"/lug/thickness"}},
		{"size too large", "/v1/lugs", lug, changes{"/lug/thickness": 2e9}, at{"/lug/thickness"}},
		{"negative force", "/v1/lugs", lug, changes{"/load_cases/0/force": -1}, at{"/load_cases/0/force"}},
		{"force beyond all", "/v1/lugs", lug, changes{"/load_cases/0/force": 1e300}, at{"/load_cases/0/force"}},
		{"angle beyond all", "/v1/lugs", lug, changes{"/load_cases/0/angle": 1e6}, at{"/load_cases/0/angle"}},
		{"factors below 1", "/v1/lugs", lug, changes{"/factors/ultimate": 0.99, "/factors/fitting": 0}, at{"/factors/fitting", "/factors/ultimate"}},
		{"no load case", "/v1/lugs", lug, changes{"/load_cases": []any{}}, at{"/load_cases"}},
		{"no method", "/v1/lugs", lug, changes{"/methods": []any{}}, at{"/methods"}},
		{"an unknown method", "/v1/lugs", lug, changes{"/methods": []any{"elementary", "guesswork"}}, at{"/methods/1"}},
		{"an unknown revision", "/v1/lugs", lug, changes{"/methods": []any{"elementary@99"}}, at{"/methods/0"}},
		{"a method twice", "/v1/lugs", lug, changes{"/methods": []any{"elementary", "elementary@1"}}, at{"/methods/1"}},
		{"an unknown material", "/v1/lugs", lug, changes{"/lug/material": "unobtainium"}, at{"/lug/material"}},
		{"a stress of zero", "/v1/lugs", lug, changes{"/lug/material/ftu": 0}, at{"/lug/material/ftu"}},
		{"no bearing ratios", "/v1/lugs", lug, changes{"/lug/material/bearing": []any{}}, at{"/lug/material/bearing"}},
		{"a bearing ratio of zero", "/v1/lugs", lug, changes{"/lug/material/bearing/0/e_over_d": 0}, at{"/lug/material/bearing/0/e_over_d"}},
		{"a mark of its own", "/v1/lugs", lug, changes{"/lug/material/mark": "certain"}, at{"/lug/material/mark"}},
		{"ids twice", "/v1/lugs", lug, changes{"/load_cases": cases("a", "b", "a")}, at{"/load_cases/2/id"}},
		{"no id", "/v1/lugs", lug, changes{"/load_cases": cases("")}, at{"/load_cases/0/id"}},
		{"a long id", "/v1/lugs", lug, changes{"/load_cases": cases(strings.Repeat("é", 201))}, at{"/load_cases/0/id"}},
		{"an id with a line break", "/v1/lugs", lug, changes{"/load_cases": cases("a\nb")}, at{"/load_cases/0/id"}},
		{"an id with a zero", "/v1/lugs", lug, changes{"/load_cases": cases("a\x00b")}, at{"/load_cases/0/id"}},
		{"a long title", "/v1/lugs", lug, changes{"/title": strings.Repeat("é", 2001)}, at{"/title"}},
		{"an option of another method", "/v1/lugs", lug, changes{"/method_options": changes{"guesswork": changes{}}}, at{"/method_options/guesswork"}},
		{"an unknown option", "/v1/lugs", lug, changes{"/method_options": changes{"elementary": changes{"a/b~c": 1}}}, at{"/method_options/elementary/a~1b~0c"}},
		{"an option beyond its range", "/v1/lugs", clevis, changes{"/method_options/elementary/pin_bending_factor": 1.8}, at{"/method_options/elementary/pin_bending_factor"}},
		{"an option of another type", "/v1/lugs", clevis, changes{"/method_options/elementary/pin_bending_factor": "plastic"}, at{"/method_options/elementary/pin_bending_factor"}},
		{"a factor for nobody", "/v1/lugs", lug, changes{"/factors/special": []any{changes{"name": "casting", "value": 2, "members": []any{"wing"}}}}, at{"/factors/special/0/members/0"}},
		{"a factor for an unknown mode", "/v1/lugs", lug, changes{"/factors/special": []any{changes{"name": "casting", "value": 2, "modes": []any{"melting"}}}}, at{"/factors/special/0/modes/0"}},
		{"an unknown joint", "/v1/lugs", lug, changes{"/joint": "triple-shear"}, at{"/joint"}},
		{"single shear without its mate", "/v1/lugs", lug, changes{"/joint": "single-shear"}, at{"/clevis"}},
		{"a taper on a round lug", "/v1/lugs", lug, changes{"/lug/taper_angle": 10}, at{"/lug/taper_angle"}},
		{"a pin wider than its hole", "/v1/lugs", clevis, changes{"/bushing": removed, "/clevis/bushing": removed, "/pin/diameter": 26}, at{"/pin/diameter"}},
		{"a bushing without wall", "/v1/lugs", clevis, changes{"/pin/diameter": 25}, at{"/bushing", "/clevis/bushing"}},
		{"a bore as wide as the pin", "/v1/lugs", clevis, changes{"/pin/inner_diameter": 20}, at{"/pin/inner_diameter"}},
		{"an offset without material beside it", "/v1/lugs", lug, changes{"/lug/offset": -20}, at{"/lug/offset"}},
		{
			"everything at once", "/v1/lugs", lug,
			changes{"/lug/thickness": 0, "/lug/material": "unobtainium", "/methods/0": "guesswork", "/factors/ultimate": 0, "/load_cases/0/force": -5},
			at{"/factors/ultimate", "/load_cases/0/force", "/lug/material", "/lug/thickness", "/methods/0"},
		},

		{"no fastener", "/v1/fastener-groups", group, changes{"/fasteners": []any{}}, at{"/fasteners"}},
		{"a fastener of no size", "/v1/fastener-groups", group, changes{"/fasteners/2/diameter": 0}, at{"/fasteners/2/diameter"}},
		{"fastener ids twice", "/v1/fastener-groups", group, changes{"/fasteners/2/id": "1"}, at{"/fasteners/2/id"}},
		{"fasteners in one place", "/v1/fastener-groups", group, changes{"/fasteners/1/x": 0}, at{"/fasteners/1/x"}},
		{"three shear planes", "/v1/fastener-groups", group, changes{"/fasteners/1/shear_planes": 3}, at{"/fasteners/1/shear_planes"}},
		{"an unknown stiffness", "/v1/fastener-groups", group, changes{"/stiffness": "soft"}, at{"/stiffness"}},
		{"an unknown interaction", "/v1/fastener-groups", group, changes{"/interaction": "9-9"}, at{"/interaction"}},
		{"an unknown set of rules", "/v1/fastener-groups", group, changes{"/rules": []any{"whim"}}, at{"/rules/0"}},
		{"an unknown fastener type", "/v1/fastener-groups", group, changes{"/fasteners/0/type": "nail"}, at{"/fasteners/0/type"}},
		{"a thread deeper than its bolt", "/v1/fastener-groups", group, changes{"/fasteners/0/type": changes{"ftu": 1, "thread": changes{"form": "iso", "pitch": 3}}}, at{"/fasteners/0/type/thread/pitch"}},
		{"stiffness given by none", "/v1/fastener-groups", group, bare(changes{"/stiffness": "given", "/fasteners": []any{bolt("a", 0, 0)}, "/load_cases": load([3]float64{}, [3]float64{1, 0, 0}, [3]float64{})}), at{"/fasteners/0/shear_stiffness", "/fasteners/0/tension_stiffness"}},
		{"one fastener under a moment of its force", "/v1/fastener-groups", group, bare(changes{"/fasteners": []any{bolt("a", 0, 0)}, "/load_cases": load([3]float64{1, 0, 0}, [3]float64{0, 1, 0}, [3]float64{})}), at{"/load_cases/0/point"}},
		{"one fastener under a moment", "/v1/fastener-groups", group, bare(changes{"/fasteners": []any{bolt("a", 0, 0)}, "/load_cases": load([3]float64{}, [3]float64{}, [3]float64{1, 0, 0})}), at{"/load_cases/0/moment"}},
		{"fasteners in line under a moment about it", "/v1/fastener-groups", group, bare(changes{"/fasteners": []any{bolt("a", 0, 0), bolt("b", 1, 1), bolt("c", 3, 3)}, "/load_cases": load([3]float64{}, [3]float64{}, [3]float64{1, 1, 0})}), at{"/load_cases/0/moment"}},
		{"an outline that crosses itself", "/v1/fastener-groups", group, changes{"/plates/0/outline": [][2]float64{{-0.5, -0.5}, {2.5, 3.5}, {2.5, -0.5}, {-0.5, 3.5}}}, at{"/plates/0/outline"}},
		{"an outline that leaves a hole outside", "/v1/fastener-groups", group, changes{"/plates/0/outline": [][2]float64{{-0.5, -0.5}, {1.5, -0.5}, {1.5, 3.5}, {-0.5, 3.5}}}, at{"/plates/0/outline"}},
		{"an outline of two corners", "/v1/fastener-groups", group, changes{"/plates/0/outline": [][2]float64{{-0.5, -0.5}, {1.5, -0.5}}}, at{"/plates/0/outline"}},
		{"a countersink deeper than its plate", "/v1/fastener-groups", group, changes{"/plates/0/countersink_depth": 0.3}, at{"/plates/0/countersink_depth"}},
		{"a share above 1", "/v1/fastener-groups", group, changes{"/plates/0/load_share": 1.1}, at{"/plates/0/load_share"}},
		{"a force beyond all", "/v1/fastener-groups", group, changes{"/load_cases/0/force": []any{0, 1e13, 0}}, at{"/load_cases/0/force/1"}},

		{"members that do not balance", "/v1/splices", splice, changes{"/load_cases/0/ends/1/right": 900}, at{"/load_cases/0/ends"}},
		{"a pitch too few", "/v1/splices", splice, changes{"/pitches": []any{1, 1}}, at{"/pitches"}},
		{"a bay too few", "/v1/splices", splice, changes{"/members/0/bays": []any{changes{"thickness": 0.1, "width": 1}}}, at{"/members/0/bays"}},
		{"no compliance where it is given", "/v1/splices", splice, changes{"/rows/2/compliance": removed}, at{"/rows/2/compliance"}},
		{"a negative compliance", "/v1/splices", splice, changes{"/rows/2/compliance": -1e-6}, at{"/rows/2/compliance"}},
		{"an unknown formula", "/v1/splices", splice, changes{"/compliance": "soft"}, at{"/compliance"}},
		{
			"a formula twice, once by its revision", "/v1/splices", splice,
			changes{"/compare_compliance": []any{"swift", "swift@1"}},
			at{"/compare_compliance/1", "/members/0/row_thickness", "/members/1/row_thickness", "/rows/0/e", "/rows/1/e", "/rows/2/e", "/rows/3/e"},
		},
		{"member ids twice", "/v1/splices", splice, changes{"/members/1/id": "cap", "/load_cases/0/ends/1/member": "cap"}, at{"/load_cases/0/ends/1/member", "/members/1/id"}},
		{"a row outside the splice", "/v1/splices", splice, changes{"/members/0/last_row": 9}, at{"/members/0/last_row"}},
		{"no diameters to choose from", "/v1/fastener-groups/sizing", sizes, changes{"/diameters": []any{}, "/types": removed}, at{"/diameters"}},
		{"a diameter of zero", "/v1/fastener-groups/sizing", sizes, changes{"/diameters/0": 0, "/types": removed}, at{"/diameters/0"}},
		{"a size for a pattern that is none", "/v1/fastener-groups/sizing", sizes, changes{"/input/fasteners/1/id": "1"}, at{"/input/fasteners/1/id"}},
		{"steps of a member that is none", "/v1/splices/steps", steps, changes{"/bounds/0/member": "wing"}, at{"/bounds/0/member"}},
		{"steps of a splice that is none", "/v1/splices/steps", steps, changes{"/input/pitches/0": 0}, at{"/input/pitches/0"}},
		{"bounds upside down", "/v1/splices/steps", steps, changes{"/bounds/0/least": 0.3}, at{"/bounds/0/most"}},
		{"an unknown goal", "/v1/splices/steps", steps, changes{"/goal": "lightest"}, at{"/goal"}},

		{"a record of nothing", "/v1/records", record, changes{"/subject/part": "", "/geometry_digest": "", "/input/lug/thickness": 0}, at{"/geometry_digest", "/input/lug/thickness", "/subject/part"}},
		{"a long note", "/v1/records", record, changes{"/note": strings.Repeat("x", 2001)}, at{"/note"}},

		{"the impact of nothing", "/v1/impact", example(t, "findImpact", "method"), changes{"/withdrawn": map[string]any{}}, at{"/withdrawn"}},
		{"the impact of two things", "/v1/impact", example(t, "findImpact", "method"), changes{"/withdrawn/material": "SM plate"}, at{"/withdrawn"}},
		{"the impact from a cursor of another kind", "/v1/impact", example(t, "findImpact", "method"), changes{"/cursor": "x"}, at{"/cursor"}},
		{"a release of no joints", "/v1/release-checks", example(t, "checkRelease", "checkIn"), changes{"/joints": []any{}}, at{"/joints"}},
		{"a release of a joint twice", "/v1/release-checks", example(t, "checkRelease", "checkIn"), changes{"/joints/1/joint": "boom hinge lower"}, at{"/joints/1/joint"}},
		{"an unknown policy", "/v1/release-checks", example(t, "checkRelease", "checkIn"), changes{"/policy": "lenient"}, at{"/policy"}},
		{"a curve set without a name", "/v1/curve-sets", example(t, "addCurveSet", "invented"), changes{"/id": "a@b"}, at{"/id"}},
		{"points that do not ascend", "/v1/curve-sets", example(t, "addCurveSet", "invented"), changes{"/charts/Kt/curves/0/points/1/0": 1.5}, at{"/charts/Kt/curves/0/points/1"}},
		{"replays of an unknown kind", "/v1/replays", example(t, "replayRecords", "correctedAllowable"), changes{"/filter/kind": "glue", "/filter/since": "yesterday"}, at{"/filter/kind", "/filter/since"}},
	} {
		a := c.do(t, post(k.target, edited(t, k.body, k.changes)))
		if a.status != http.StatusUnprocessableEntity {
			t.Errorf("%s: %d: %.1000s", k.name, a.status, a.body)
		} else if !slices.Equal(a.pointers(), k.pointers) {
			t.Errorf("%s: found %q, want %q: %s", k.name, a.pointers(), k.pointers, a.body)
		}
	}
	for target, pointers := range map[string]at{
		"/v1/records?limit=0": {"/limit"}, "/v1/records?limit=501": {"/limit"}, "/v1/records?limit=ten": {"/limit"},
		"/v1/records?cursor=x": {"/cursor"}, "/v1/records?since=now&until=then": {"/since", "/until"}, "/v1/records?latest=yes": {"/latest"},
		"/v1/records?kind=glue&state=lost&verdict=fine": {"/kind", "/state", "/verdict"},
		"/v1/export?from=-1":                            {"/from"}, "/v1/export?from=1": {"/from"}, "/v1/export?from=x": {"/from"},
		"/v1/parts": {"/part"}, "/v1/parts/changes?part=SM-214": {"/from", "/to"},
		"/v1/checkpoint/consistency": {"/from"}, "/v1/checkpoint/consistency?from=1": {"/from"}, "/v1/checkpoint/consistency?from=0&to=1": {"/to"},
	} {
		a := c.do(t, get(target))
		if a.status != http.StatusUnprocessableEntity || !slices.Equal(a.pointers(), pointers) {
			t.Errorf("%s: %d: %s", target, a.status, a.body)
		}
	}
	w := newWorld(t, storetest.SQLite(t))
	for target, body := range map[string]string{
		"sign-offs":  `{"role":"admired","statement":""}`,
		"withdrawal": `{"reason":""}`,
	} {
		a := w.callers[service.Approver].do(t, post("/v1/records/"+w.record+"/"+target, []byte(body))).want(t, http.StatusUnprocessableEntity)
		if want := map[string]at{"sign-offs": {"/role", "/statement"}, "withdrawal": {"/reason"}}[target]; !slices.Equal(a.pointers(), want) {
			t.Errorf("%s: %s", target, a.body)
		}
	}
}

// TestMessagesAreInTheUnitsOfTheQuestion: a refusal speaks of inches to who
// speaks of inches.
func TestMessagesAreInTheUnitsOfTheQuestion(t *testing.T) {
	c := serve(t, storetest.SQLite(t))
	a := c.do(t, post("/v1/lugs", edited(t, example(t, "calculateLug", "lugUS"), map[string]any{"/lug/hole_diameter": 2.75, "/lug/edge_distance": 3}))).want(t, 422)
	if detail := fmt.Sprint(a.problem.Errors); !strings.Contains(detail, "2.75 in") || !strings.Contains(detail, "2.5 in") {
		t.Error(detail)
	}
}

// TestRateLimit: with a rate each caller has its own, and who has used it up
// is told when to come back.
func TestRateLimit(t *testing.T) {
	c := serveWith(t, storetest.SQLite(t), api.Options{RateLimit: 0.001})
	w := world{record: "0198f3a4-7a2c-7000-8000-000000000000", curves: "none@1"}
	a := c.do(t, get("/v1/rules")).want(t, http.StatusOK)
	if a.header.Get("RateLimit") != `"caller";r=0;t=1000` || a.header.Get("RateLimit-Policy") != `"caller";q=1;w=1` {
		t.Errorf("RateLimit %q, RateLimit-Policy %q", a.header.Get("RateLimit"), a.header.Get("RateLimit-Policy"))
	}
	for _, op := range theDocument(t).operations() {
		a := c.do(t, w.sample(t, op, first(t, op)))
		if asks := op.least() != ""; asks != (a.status == http.StatusTooManyRequests) {
			t.Errorf("%s: %d", op.OperationId, a.status)
		}
	}
}
