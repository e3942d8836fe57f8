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

// Value returns the bearing allowable p, Fbru or Fbry.
func (b BearingStrength) Value(p Property) float64 {
	if p == Fbry {
		return b.Fbry
	}
	return b.Fbru
}

// BearingBetween returns the two given bearing values between which p (Fbru or
// Fbry) at an edge distance ratio e/D lies, the same one twice where it stands
// alone: at a given ratio and above the last of them. The message says why
// there is none: nothing given, or an e/D below the least one given, where
// tests are needed.
func (m *Material) BearingBetween(p Property, eOverD float64) (lo, hi BearingStrength, why Message) {
	eOverD = min(eOverD, BearingFull)
	below, above := -1, -1
	for i, b := range m.Bearing {
		if b.Value(p) == 0 {
			continue
		}
		if AtMost(b.EOverD, eOverD) && (below < 0 || b.EOverD > m.Bearing[below].EOverD) {
			below = i
		}
		if AtLeast(b.EOverD, eOverD) && (above < 0 || b.EOverD < m.Bearing[above].EOverD) {
			above = i
		}
	}
	switch {
	case below < 0 && above < 0:
		return lo, hi, Say("the material %q has no %s", m.Name, p)
	case below < 0:
		return lo, hi, Say("e/D %.4g is below %.4g, the least for which %s is given; below it only tests count", eOverD, m.Bearing[above].EOverD, p)
	case above < 0 || m.Bearing[above].EOverD <= m.Bearing[below].EOverD:
		above = below
	}
	return m.Bearing[below], m.Bearing[above], Message{}
}

// BearingAt returns the bearing allowable p (Fbru or Fbry) in MPa at an edge
// distance ratio e/D: by straight line between the given ratios and flat above
// the last of them, or the message of BearingBetween.
func (m *Material) BearingAt(p Property, eOverD float64) (float64, Message) {
	lo, hi, why := m.BearingBetween(p, eOverD)
	if !why.Empty() || lo == hi {
		return lo.Value(p), why
	}
	share := (min(eOverD, BearingFull) - lo.EOverD) / (hi.EOverD - lo.EOverD)
	return lo.Value(p) + float64(share*(hi.Value(p)-lo.Value(p))), Message{}
}
