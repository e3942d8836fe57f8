package fastener

import (
	"fmt"
	"strings"

	"jointledger/strength"
)

// CatalogueType is a generic bolt of one size and strength, by its id.
type CatalogueType struct {
	ID string
	Type
}

// threads are the sizes of the catalogue: inch sizes with threads an inch.
//
// Source: ASME B1.1 and ISO 261 coarse, 97 % from memory.
var (
	unifiedSizes = []struct {
		name   string
		inches float64
		fine   float64 // threads an inch, UNF
		coarse float64 // UNC
	}{
		{"10", 0.190, 32, 24},
		{"1/4", 0.25, 28, 20},
		{"5/16", 0.3125, 24, 18},
		{"3/8", 0.375, 24, 16},
		{"7/16", 0.4375, 20, 14},
		{"1/2", 0.5, 20, 13},
		{"9/16", 0.5625, 18, 12},
		{"5/8", 0.625, 18, 11},
		{"3/4", 0.75, 16, 10},
		{"7/8", 0.875, 14, 9},
		{"1", 1, 12, 8},
	}
	metricSizes = []struct{ d, pitch float64 }{
		{5, 0.8}, {6, 1}, {8, 1.25}, {10, 1.5}, {12, 1.75}, {14, 2}, {16, 2}, {20, 2.5}, {24, 3}, {30, 3.5},
	}
	// Strength levels of alloy steel in ksi, 85 % from memory.
	unifiedLevels = []struct{ fsu, ftu float64 }{{75, 125}, {95, 160}, {108, 180}, {125, 220}}
	// Property classes, with their nominal strength in MPa.
	metricClasses = []struct {
		class string
		ftu   float64
	}{{"8.8", 800}, {"10.9", 1000}, {"12.9", 1200}}
)

const ksi = 6.894757293168361 // MPa

// Types returns the generic bolts: unified fine and coarse by shear strength,
// metric coarse by property class, each with threads in the shear plane and,
// with the suffix -shank, with its shank there. No maker's part is meant.
func Types() []CatalogueType {
	var all []CatalogueType
	add := func(id string, t Type) {
		threads, shank := *t.Thread, *t.Thread
		threads.InShearPlane = true
		t.Name, t.Thread = id+", threads in the shear plane", &threads
		all = append(all, CatalogueType{id, t})
		t.Name, t.Thread = id+", shank in the shear plane", &shank
		all = append(all, CatalogueType{id + "-shank", t})
	}
	for _, series := range []string{"unf", "unc"} {
		for _, size := range unifiedSizes {
			perInch := size.fine
			if series == "unc" {
				perInch = size.coarse
			}
			for _, level := range unifiedLevels {
				add(fmt.Sprintf("%s-%s-fsu%g", series, size.name, level.fsu), Type{
					Source: "generic alloy steel bolt, threads of ASME B1.1", Mark: strength.FromMemory(85),
					Diameter: size.inches * 25.4, Fsu: level.fsu * ksi, Ftu: level.ftu * ksi,
					Thread: &Thread{Form: "unified", Pitch: 25.4 / perInch},
				})
			}
		}
	}
	for _, size := range metricSizes {
		for _, class := range metricClasses {
			add(fmt.Sprintf("m%g-%s", size.d, class.class), Type{
				Source: "generic bolt of ISO 898-1, F_su taken as 0.6 F_tu", Mark: strength.FromMemory(85),
				Diameter: size.d, Fsu: 0.6 * class.ftu, Ftu: class.ftu, Class: class.class,
				Thread: &Thread{Form: "iso", Pitch: size.pitch},
			})
		}
	}
	return all
}

// FindType finds a bolt of the catalogue.
func FindType(id string) (Type, bool) {
	for _, t := range Types() {
		if strings.EqualFold(t.ID, id) {
			return t.Type, true
		}
	}
	return Type{}, false
}
