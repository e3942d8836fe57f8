package service_test

import (
	"fmt"
	"testing"

	"jointledger/service"
	"jointledger/service/strictjson"
)

// What the catalogues hand out is sound: sent back in the place of its name it
// passes every rule of a document, and is the same input.
func TestCataloguesCanBeSentBack(t *testing.T) {
	same := func(kind service.Kind, document, id string, object any) {
		t.Helper()
		whole, err := strictjson.Encode(object)
		if err != nil {
			t.Fatal(err)
		}
		named, err := service.Calculate(kind, fmt.Appendf(nil, document, fmt.Sprintf("%q", id)), service.View{})
		if err != nil {
			t.Fatalf("%s: %v", id, err)
		}
		sent, err := service.Calculate(kind, fmt.Appendf(nil, document, whole), service.View{})
		if err != nil {
			t.Errorf("%s, sent back as %s: %v", id, whole, err)
		} else if sent.InputDigest != named.InputDigest {
			t.Errorf("%s, sent back as %s, is another input", id, whole)
		}
	}
	for _, units := range []string{"SI", "US"} {
		materials, err := service.Materials(units)
		if err != nil {
			t.Fatal(err)
		}
		for _, m := range materials.Items {
			same(service.Lug, `{"units": "`+units+`", "methods": ["elementary"],
  "lug": {"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125, "material": %s},
  "factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [{"id": "LC1", "level": "limit", "force": 1, "angle": 0}]}`, m.ID, m.Material)
		}
		types, err := service.FastenerTypes(units)
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range types.Items {
			same(service.FastenerGroup, `{"units": "`+units+`", "stiffness": "equal",
  "fasteners": [{"id": "1", "x": 0, "y": 0, "diameter": `+fmt.Sprint(*f.Type.Diameter)+`, "type": %s}],
  "factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [{"id": "LC1", "level": "limit", "point": [0, 0, 0], "force": [1, 0, 0], "moment": [0, 0, 0]}]}`, f.ID, f.Type)
		}
		if len(materials.Items) < 5 || len(types.Items) < 100 {
			t.Errorf("%s: %d materials and %d fastener types", units, len(materials.Items), len(types.Items))
		}
	}
}
