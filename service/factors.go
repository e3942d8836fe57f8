package service

import (
	"slices"
	"strings"

	"jointledger/strength"
)

// Factors is the wire form of the factors of safety.
type Factors struct {
	Ultimate float64         `json:"ultimate" validate:"factor"`
	Fitting  float64         `json:"fitting" validate:"factor"`
	Special  []SpecialFactor `json:"special,omitzero" validate:"omitempty,max=100,dive"`
}

// SpecialFactor is one factor that takes the place of the fitting factor
// where it is larger.
type SpecialFactor struct {
	Name    string   `json:"name" validate:"id"`
	Value   float64  `json:"value" validate:"factor"`
	Basis   string   `json:"basis,omitzero" validate:"text"`
	Modes   []string `json:"modes,omitzero" validate:"omitempty,unique,dive,mode"`
	Members []string `json:"members,omitzero" validate:"omitempty,unique"`
	Level   *string  `json:"level,omitzero" validate:"omitnil,oneof=both ultimate"`
}

// resolve writes the defaults out and refuses names of members that the joint
// does not have: a factor that names nobody would silently not act.
func (d *Factors) resolve(members []string, f *faults) {
	for i := range d.Special {
		s := &d.Special[i]
		setDefault(&s.Level, "both")
		for j, name := range s.Members {
			if !slices.Contains(members, name) {
				f.add(pointer("factors", "special", i, "members", j), "must be one of this joint's members (%s), not %.80q",
					strings.Join(members, ", "), name)
			}
		}
	}
}

// strength turns the wire form into the program's.
func (d *Factors) strength() strength.Factors {
	s := strength.Factors{Ultimate: d.Ultimate, Fitting: d.Fitting}
	for _, special := range d.Special {
		var modes []strength.Mode
		for _, word := range special.Modes {
			modes = append(modes, modeByWord[word])
		}
		s.Special = append(s.Special, strength.SpecialFactor{
			Name: special.Name, Basis: special.Basis, Value: special.Value, Modes: modes,
			Members: special.Members, UltimateOnly: *special.Level == "ultimate",
		})
	}
	return s
}

// setDefault writes a default out.
func setDefault[T any](field **T, value T) {
	if *field == nil {
		*field = &value
	}
}

// Level is the wire's word for the level of a load.
type Level string

// Words implements strictjson.Words.
func (Level) Words() []string {
	return []string{strength.Limit.String(), strength.Ultimate.String()}
}

func (l Level) strength() strength.Level {
	if string(l) == strength.Limit.String() {
		return strength.Limit
	}
	return strength.Ultimate
}
