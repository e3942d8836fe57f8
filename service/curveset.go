package service

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"strings"

	"jointledger/lug"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// CurveSet is the wire form of a table of a method's chart factors.
type CurveSet struct {
	ID        string           `json:"id" validate:"id,excludes=@"`
	Version   string           `json:"version" validate:"id,excludes=@"`
	Method    string           `json:"method" validate:"id"`
	Document  string           `json:"document" validate:"required,text"`
	Reader    string           `json:"reader" validate:"required,text"`
	Tolerance float64          `json:"tolerance" validate:"portion"`
	Charts    map[string]Chart `json:"charts" validate:"min=1,max=50,dive"`
}

// Chart is one figure of a curve set.
type Chart struct {
	Figure  string  `json:"figure" validate:"text"`
	Along   string  `json:"along" validate:"id"`
	Between *string `json:"between" validate:"omitnil,id"`
	Curves  []Curve `json:"curves" validate:"min=1,max=1000,dive"`
}

// Curve is one line of a chart.
type Curve struct {
	At     *float64     `json:"at,omitzero" validate:"omitnil,signed"`
	Points [][2]float64 `json:"points" validate:"min=2,max=10000,dive,dive,signed"`
}

// curveSetRef names a registered curve set in a resolved input.
type curveSetRef struct {
	ID      string `json:"id"`
	Version string `json:"version"`
	Digest  string `json:"digest"`
}

// digest is SHA-256 over the canonical form.
func (c *CurveSet) digest() (string, error) {
	canonical, err := strictjson.Canonical(c)
	if err != nil {
		return "", err
	}
	sum := sha256.Sum256(canonical)
	return "sha256:" + hex.EncodeToString(sum[:]), nil
}

// lug turns the wire form into the program's.
func (c *CurveSet) lug() *lug.CurveSet {
	set := &lug.CurveSet{
		ID: c.ID, Version: c.Version, Method: c.Method, Document: c.Document,
		Reader: c.Reader, Tolerance: c.Tolerance, Charts: map[string]lug.Chart{},
	}
	for name, chart := range c.Charts {
		out := lug.Chart{Figure: chart.Figure, Along: chart.Along}
		if chart.Between != nil {
			out.Between = *chart.Between
		}
		for _, curve := range chart.Curves {
			out.Curves = append(out.Curves, lug.Curve{At: value(curve.At), Points: curve.Points})
		}
		set.Charts[name] = out
	}
	return set
}

// curveSetDocument turns a curve set of the program into the wire form.
func curveSetDocument(set *lug.CurveSet) *CurveSet {
	c := &CurveSet{
		ID: set.ID, Version: set.Version, Method: set.Method, Document: set.Document,
		Reader: set.Reader, Tolerance: set.Tolerance, Charts: map[string]Chart{},
	}
	for name, chart := range set.Charts {
		out := Chart{Figure: chart.Figure, Along: chart.Along}
		if chart.Between != "" {
			out.Between = &chart.Between
		}
		for _, curve := range chart.Curves {
			line := Curve{Points: curve.Points}
			if chart.Between != "" {
				line.At = &curve.At
			}
			out.Curves = append(out.Curves, line)
		}
		c.Charts[name] = out
	}
	return c
}

// check notes what is impossible about a curve set, below a pointer.
func (c *CurveSet) check(f *faults) {
	f.check(c)
	f.take(c.lug().Check(), SI)
}

// builtInCurveSet finds a set that comes with the program. It knows more than
// its wire form, which has only points of its curves.
func builtInCurveSet(name string) *lug.CurveSet {
	for _, set := range lug.BuiltInCurveSets() {
		if name == set.ID || name == set.Name() {
			return &set
		}
	}
	return nil
}

// lookUpCurveSet finds a set by id, the latest, or by id@version.
func lookUpCurveSet(name string, look lookup) (lug.Value, error) {
	if set := builtInCurveSet(name); set != nil {
		return lug.Value{Set: set, Word: name}, nil
	}
	set, err := look.curveSet(name)
	if err != nil {
		return lug.Value{}, err
	}
	return lug.Value{Set: set.lug(), Word: name}, nil
}

// noRegistry is a lookup that knows only what is built in.
type noRegistry struct{}

func (noRegistry) curveSet(name string) (*CurveSet, error) {
	return nil, fmt.Errorf("there is no curve set %.80q", name)
}

// readCurveSet reads the three forms of a reference: a name, a resolved
// reference with its digest, or a whole set.
func readCurveSet(raw strictjson.Raw, look lookup) (lug.Value, error) {
	if raw.Kind() == strictjson.String {
		var name string
		if err := strictjson.Decode(raw, &name); err != nil {
			return lug.Value{}, err
		}
		return lookUpCurveSet(name, look)
	}
	var ref curveSetRef
	if strictjson.Decode(raw, &ref) == nil {
		v, err := lookUpCurveSet(ref.ID+"@"+ref.Version, look)
		if err != nil {
			return v, err
		}
		digest, err := curveSetDocument(v.Set).digest()
		if err == nil && digest != ref.Digest {
			err = fmt.Errorf("the curve set %s has the digest %s, not %s", v.Set.Name(), digest, ref.Digest)
		}
		return v, err
	}
	var set CurveSet
	if err := strictjson.Decode(raw, &set); err != nil {
		return lug.Value{}, fmt.Errorf("must be the name of a curve set or a whole one: %w", err)
	}
	var f faults
	set.check(&f)
	if p := f.problem(); p != nil {
		var found []string
		for _, e := range p.Errors {
			found = append(found, e.Pointer+" "+e.Detail)
		}
		return lug.Value{}, fmt.Errorf("the curve set cannot be used: %s", strings.Join(found, "; "))
	}
	return lug.Value{Set: set.lug()}, nil
}

// readOption reads the value of a method's option.
func readOption(o lug.Option, raw strictjson.Raw, look lookup) (lug.Value, error) {
	var v lug.Value
	switch o.Kind {
	case lug.Number:
		if raw.Kind() != strictjson.Number || strictjson.Decode(raw, &v.Number) != nil {
			return v, fmt.Errorf("must be a number")
		}
		if strength.Less(v.Number, o.Least) || strength.More(v.Number, o.Most) {
			return v, fmt.Errorf("must be from %g to %g, not %g", o.Least, o.Most, v.Number)
		}
	case lug.Word:
		if raw.Kind() != strictjson.String || strictjson.Decode(raw, &v.Word) != nil {
			return v, fmt.Errorf("must be a string")
		}
		for _, w := range o.Words {
			if w == v.Word {
				return v, nil
			}
		}
		if len(o.Words) > 0 {
			return v, fmt.Errorf("must be one of %s, not %.80q", strings.Join(o.Words, ", "), v.Word)
		}
	case lug.Flag:
		if strictjson.Decode(raw, &v.Flag) != nil {
			return v, fmt.Errorf("must be true or false")
		}
	case lug.CurveSetRef:
		return readCurveSet(raw, look)
	}
	return v, nil
}

// writeOption writes a value as the resolved input carries it.
func writeOption(o lug.Option, v lug.Value, given strictjson.Raw) strictjson.Raw {
	var plain any
	switch o.Kind {
	case lug.Number:
		plain = v.Number
	case lug.Word:
		plain = v.Word
	case lug.Flag:
		plain = v.Flag
	case lug.CurveSetRef:
		if v.Set == nil {
			return given
		}
		document := curveSetDocument(v.Set)
		if plain = document; v.Word != "" {
			digest, err := document.digest()
			if err != nil {
				return given
			}
			plain = curveSetRef{document.ID, document.Version, digest}
		}
	}
	raw, err := strictjson.Encode(plain)
	if err != nil {
		return given
	}
	return raw
}
