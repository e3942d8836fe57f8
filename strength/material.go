package strength

// Property names one value of a material, in the trade's symbols.
type Property string

// The properties that checks read.
const (
	Ftu        Property = "F_tu"
	Fty        Property = "F_ty"
	FtuCross   Property = "F_tu,cross"
	FtyCross   Property = "F_ty,cross"
	Fcy        Property = "F_cy"
	Fsu        Property = "F_su"
	E          Property = "E"
	Ec         Property = "E_c"
	Nu         Property = "ν"
	Elongation Property = "elongation"
	Fbru       Property = "F_bru"
	Fbry       Property = "F_bry"
)

// Material holds allowable stresses and moduli in MPa. A value of zero was not
// given: the check that needs it is undetermined and names it.
type Material struct {
	Name, Direction, Basis, Source string

	Ftu, Fty           float64 // along the lug's axis
	FtuCross, FtyCross float64 // across it, in the plane of the lug
	Fcy, Fsu           float64
	E, Ec, Nu          float64
	Elongation         float64 // a fraction: 0.10 is 10 %
	Bearing            []BearingStrength

	// Mark says how the values are known, Marks those known otherwise.
	Mark  Mark
	Marks map[Property]Mark
}

// BearingStrength is a pair of bearing allowables at an edge distance ratio.
type BearingStrength struct {
	EOverD     float64
	Fbru, Fbry float64 // MPa; zero was not given
}

// Value returns a property other than bearing, zero when it was not given.
func (m *Material) Value(p Property) float64 {
	switch p {
	case Ftu:
		return m.Ftu
	case Fty:
		return m.Fty
	case FtuCross:
		return m.FtuCross
	case FtyCross:
		return m.FtyCross
	case Fcy:
		return m.Fcy
	case Fsu:
		return m.Fsu
	case E:
		return m.E
	case Ec:
		return m.Ec
	case Nu:
		return m.Nu
	case Elongation:
		return m.Elongation
	}
	return 0
}

// MarkOf says how a property is known.
func (m *Material) MarkOf(p Property) Mark {
	if mark, ok := m.Marks[p]; ok {
		return mark
	}
	return m.Mark
}

// Limits of the edge distance ratio between which handbook bearing values hold.
//
// Source: MIL-HDBK-5J section 1.4.7 and its tables (values at e/D 1.5 and 2.0);
// above 2.0 the value of 2.0 is used, below 1.5 only tests count.
const (
	BearingFrom = 1.5
	BearingFull = 2.0
)

// BearingAt returns the bearing allowable p (Fbru or Fbry) in MPa at an edge
// distance ratio e/D: by straight line between the given ratios and flat above
// the last of them. The message says why there is none: nothing given, or an
// e/D below the least one given, where tests are needed.
func (m *Material) BearingAt(p Property, eOverD float64) (float64, Message) {
	pick := func(b BearingStrength) float64 {
		if p == Fbry {
			return b.Fbry
		}
		return b.Fbru
	}
	eOverD = min(eOverD, BearingFull)
	var lo, hi *BearingStrength
	for i := range m.Bearing {
		b := &m.Bearing[i]
		if pick(*b) == 0 {
			continue
		}
		if AtMost(b.EOverD, eOverD) && (lo == nil || b.EOverD > lo.EOverD) {
			lo = b
		}
		if AtLeast(b.EOverD, eOverD) && (hi == nil || b.EOverD < hi.EOverD) {
			hi = b
		}
	}
	switch {
	case lo == nil && hi == nil:
		return 0, Say("the material %q has no %s", m.Name, p)
	case lo == nil:
		return 0, Say("e/D %.4g is below %.4g, the least for which %s is given; below it only tests count", eOverD, hi.EOverD, p)
	case hi == nil || hi == lo || hi.EOverD <= lo.EOverD:
		return pick(*lo), Message{}
	}
	share := (eOverD - lo.EOverD) / (hi.EOverD - lo.EOverD)
	return pick(*lo) + float64(share*(pick(*hi)-pick(*lo))), Message{}
}
