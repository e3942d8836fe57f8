package service

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"slices"
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
	for name, chart := range c.Charts {
		for i, curve := range chart.Curves {
			at := pointer("charts", name, "curves", i, "at")
			switch {
			case chart.Between == nil && curve.At != nil:
				f.add(at, "must be left out, as there is nothing between the curves")
			case chart.Between != nil && curve.At == nil:
				f.add(at, "is required: the value of %s", *chart.Between)
			}
		}
	}
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
// reference with its digest, or a whole set. What is wrong with it is noted
// under at.
func readCurveSet(raw strictjson.Raw, look lookup, at string, f *faults) (lug.Value, bool) {
	var none lug.Value
	switch raw.Kind() {
	case strictjson.String:
		var name string
		if err := strictjson.Decode(raw, &name); err != nil {
			f.malformed(err, at)
			return none, false
		}
		v, err := lookUpCurveSet(name, look)
		if err != nil {
			f.lookedUp(at, err)
		}
		return v, err == nil
	case strictjson.Object:
	default:
		f.add(at, "must be the name of a curve set or a whole one")
		return none, false
	}
	var probe struct {
		Digest strictjson.Raw `json:"digest"`
	}
	if err := strictjson.DecodeLoosely(raw, &probe); err == nil && probe.Digest != nil {
		var ref curveSetRef
		if err := strictjson.Decode(raw, &ref); err != nil {
			f.malformed(err, at)
			return none, false
		}
		v, err := lookUpCurveSet(ref.ID+"@"+ref.Version, look)
		if err != nil {
			f.lookedUp(at, err)
			return none, false
		}
		if digest, err := curveSetDocument(v.Set).digest(); err != nil || digest != ref.Digest {
			f.add(at+"/digest", "the curve set %s has the digest %s, not %.80q", v.Set.Name(), digest, ref.Digest)
			return none, false
		}
		return v, true
	}
	var set CurveSet
	if err := strictjson.Decode(raw, &set); err != nil {
		f.malformed(err, at)
		return none, false
	}
	var own faults
	set.check(&own)
	f.join(at, own.list)
	return lug.Value{Set: set.lug()}, len(own.list) == 0
}

// readOption reads the value of a method's option. What is wrong with it is
// noted under at.
func readOption(o lug.Option, raw strictjson.Raw, look lookup, at string, f *faults) (lug.Value, bool) {
	var v lug.Value
	var wrong string
	switch o.Kind {
	case lug.Number:
		if raw.Kind() != strictjson.Number || strictjson.Decode(raw, &v.Number) != nil {
			wrong = "must be a number"
		} else if strength.Less(v.Number, o.Least) || strength.More(v.Number, o.Most) {
			wrong = fmt.Sprintf("must be from %g to %g, not %g", o.Least, o.Most, v.Number)
		}
	case lug.Word:
		if raw.Kind() != strictjson.String || strictjson.Decode(raw, &v.Word) != nil {
			wrong = "must be a string"
		} else if len(o.Words) > 0 && !slices.Contains(o.Words, v.Word) {
			wrong = fmt.Sprintf("must be one of %s, not %.80q", strings.Join(o.Words, ", "), v.Word)
		}
	case lug.Flag:
		if strictjson.Decode(raw, &v.Flag) != nil {
			wrong = "must be true or false"
		}
	case lug.CurveSetRef:
		return readCurveSet(raw, look, at, f)
	}
	if wrong != "" {
		f.add(at, "%s", wrong)
	}
	return v, wrong == ""
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
