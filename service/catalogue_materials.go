package service

import (
	"fmt"

	"jointledger/strength"
)

// CatalogueMaterial is a built-in material, its values in ksi as published.
type CatalogueMaterial struct {
	ID       string
	Thick    string // the range of thickness that it holds for
	Revision int
	ksi      Material
}

// in writes the material in a document's units.
func (c CatalogueMaterial) in(u Units) Material {
	// ksi to psi is exact; from there through the program's own units.
	return c.ksi.stresses(func(x float64) float64 {
		if u == US {
			return x * 1000
		}
		return x * 1000 * US.scale(strength.Stress)
	})
}

// materials are the built-in ones. Values in ksi; only A-basis values are
// taken, the published B values of 7050 being doubtful in the copy that was
// read. Bearing values of steels, titanium and 7075-T7351 are left out: not
// known well enough.
var materials = append(plate7050(),
	CatalogueMaterial{
		ID: "2024-T351-plate-0.250-0.499", Thick: "0.250-0.499 in", Revision: 1,
		ksi: Material{
			Name: "2024-T351 plate, 0.250-0.499 in", Direction: "L", Basis: "A", Source: "MIL-HDBK-5J, from memory: verify against a controlled copy",
			Ftu: ksi(64), Fty: ksi(48), FtyCross: ksi(42), Fcy: ksi(39), Fsu: ksi(38), E: ksi(10700), Elongation: ksi(0.12),
			Bearing: bearing(97, 72, 119, 86), Mark: memory(85), Marks: map[string]string{"elongation": memory(80)},
		},
	},
	CatalogueMaterial{
		ID: "6061-T651-plate", Thick: "plate; the thickness range was not noted", Revision: 1,
		ksi: Material{
			Name: "6061-T651 plate", Direction: "L", Basis: "A", Source: "MIL-HDBK-5J, from memory: verify against a controlled copy",
			Ftu: ksi(42), Fty: ksi(36), FtyCross: ksi(35), Fcy: ksi(35), Fsu: ksi(27), E: ksi(9900), Elongation: ksi(0.10),
			Bearing: bearing(67, 50, 88, 58), Mark: memory(85), Marks: map[string]string{"elongation": memory(80)},
		},
	},
	CatalogueMaterial{
		ID: "7075-T651-plate-0.250-0.499", Thick: "0.250-0.499 in", Revision: 1,
		ksi: Material{
			Name: "7075-T651 plate, 0.250-0.499 in", Direction: "L", Basis: "A", Source: "MIL-HDBK-5J, from memory: verify against a controlled copy",
			Ftu: ksi(77), FtuCross: ksi(78), Fty: ksi(69), FtyCross: ksi(67), Fcy: ksi(67), Fsu: ksi(43), E: ksi(10300), Elongation: ksi(0.09),
			Bearing: bearing(117, 97, 145, 114), Mark: memory(85), Marks: map[string]string{"elongation": memory(80)},
		},
	},
	steel(125, 103, 75, 0.17), steel(150, 132, 90, 0.15), steel(180, 163, 108, 0.12),
)

func ksi(x float64) *float64 { return &x }

func memory(percent int) string { return strength.FromMemory(percent).String() }

func bearing(fbru15, fbry15, fbru20, fbry20 float64) []Bearing {
	return []Bearing{
		{EOverD: 1.5, Fbru: ksi(fbru15), Fbry: ksi(fbry15)},
		{EOverD: 2.0, Fbru: ksi(fbru20), Fbry: ksi(fbry20)},
	}
}

// plate7050 is 7050-T7451 plate, MIL-HDBK-5J table 3.7.4.0(b1), A values,
// along (L) and across (LT) the grain; the elongations are from memory.
func plate7050() []CatalogueMaterial {
	var list []CatalogueMaterial
	for _, p := range []struct {
		from, to                                   string
		ftuL, ftuLT, ftyL, ftyLT, fcyL, fcyLT, fsu float64
		fbru15, fbru20, fbry15, fbry20, elongation float64
		elongationMark                             int
	}{
		{"0.250", "1.500", 74, 74, 64, 64, 63, 66, 42, 107, 140, 86, 101, 0.09, 70},
		{"1.501", "2.000", 74, 74, 64, 64, 62, 67, 43, 109, 142, 89, 104, 0.09, 70},
		{"2.001", "3.000", 73, 73, 63, 63, 61, 66, 43, 108, 141, 89, 104, 0.08, 60},
		{"3.001", "4.000", 72, 72, 62, 62, 60, 65, 43, 107, 140, 90, 104, 0.08, 60},
	} {
		thick := p.from + "-" + p.to
		common := Material{
			Name: fmt.Sprintf("7050-T7451 plate, %s in", thick), Basis: "A", Source: "MIL-HDBK-5J table 3.7.4.0(b1)",
			Fsu: ksi(p.fsu), E: ksi(10300), Ec: ksi(10600), Nu: ksi(0.33), Elongation: ksi(p.elongation),
			Bearing: bearing(p.fbru15, p.fbry15, p.fbru20, p.fbry20),
			Mark:    strength.Seen.String(), Marks: map[string]string{"elongation": memory(p.elongationMark)},
		}
		along, across := common, common
		along.Direction, along.Ftu, along.FtuCross = "L", ksi(p.ftuL), ksi(p.ftuLT)
		along.Fty, along.FtyCross, along.Fcy = ksi(p.ftyL), ksi(p.ftyLT), ksi(p.fcyL)
		across.Direction, across.Ftu, across.FtuCross = "LT", ksi(p.ftuLT), ksi(p.ftuL)
		across.Fty, across.FtyCross, across.Fcy = ksi(p.ftyLT), ksi(p.ftyL), ksi(p.fcyLT)
		list = append(list,
			CatalogueMaterial{ID: "7050-T7451-plate-" + thick + "-L", Thick: thick + " in", Revision: 1, ksi: along},
			CatalogueMaterial{ID: "7050-T7451-plate-" + thick + "-LT", Thick: thick + " in", Revision: 1, ksi: across})
	}
	return list
}

// steel is low-alloy steel heat treated to an ultimate strength; MIL-HDBK-5J,
// from memory, without bearing values.
func steel(ftu, fty, fsu, elongation float64) CatalogueMaterial {
	return CatalogueMaterial{
		ID: fmt.Sprintf("alloy-steel-%g-ksi", ftu), Thick: "bar and forging", Revision: 1,
		ksi: Material{
			Name: fmt.Sprintf("alloy steel, heat treated to %g ksi", ftu), Direction: "L", Source: "MIL-HDBK-5J, from memory: verify against a controlled copy",
			Ftu: ksi(ftu), Fty: ksi(fty), Fsu: ksi(fsu), E: ksi(29000), Elongation: ksi(elongation),
			Mark: memory(85), Marks: map[string]string{"elongation": memory(60)},
		},
	}
}
