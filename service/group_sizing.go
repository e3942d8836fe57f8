package service

import (
	"fmt"
	"slices"

	"jointledger/fastener"
	"jointledger/service/strictjson"
	"jointledger/strength"
)

// GroupSizingRequest asks for the least diameter of a list with which every
// check of a pattern holds.
type GroupSizingRequest struct {
	Input        strictjson.Raw     `json:"input"`
	Diameters    []float64          `json:"diameters" validate:"min=1,max=50,dive,size"`
	Types        *[]FastenerTypeRef `json:"types,omitzero" validate:"omitnil,dive"`
	TargetMargin *float64           `json:"target_margin,omitzero" validate:"omitnil,amount"`
}

// GroupSizingAnswer is the diameter found, with the answer for the pattern that
// has it; without one all but the trials is null and the reason says why.
type GroupSizingAnswer struct {
	Value     *float64     `json:"value"`
	Trials    []GroupTrial `json:"trials"`
	Governing *Check       `json:"governing"`
	Result    *Result      `json:"result"`
	Reason    *string      `json:"reason"`
}

// GroupTrial is how the pattern did with one diameter.
type GroupTrial struct {
	Diameter  float64  `json:"diameter"`
	Type      *string  `json:"type"` // its name, null where each fastener kept its own
	Holds     bool     `json:"holds"`
	Verdict   string   `json:"verdict"`
	Margin    *float64 `json:"margin"`
	Governing *Check   `json:"governing"`
	Reason    *string  `json:"reason"` // it does not hold
}

// SizeGroup tries the diameters from the least up.
func SizeGroup(body []byte, view View) (*GroupSizingAnswer, error) {
	var request GroupSizingRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, malformed(err, "")
	}
	var d GroupDocument
	var f faults
	if err := f.input(request.Input, &d); err != nil {
		return nil, err
	}
	candidates := request.resolve(d.Units, &f)
	f.check(&request)
	if p := f.problem(); p != nil {
		return nil, p
	}
	target := value(request.TargetMargin)
	trials, found := fastener.SizeDiameter(d.pattern(), d.Factors.strength(), d.cases(), candidates, target)
	if f.takeUnder("/input", found, d.Units); len(f.list) == 0 && !slices.ContainsFunc(trials, func(t fastener.Trial) bool { return t.Prepared != nil }) {
		// No diameter can be calculated: the rest of the input may be why.
		_, found = fastener.PreparePattern(d.pattern(), d.Factors.strength(), d.cases())
		f.takeUnder("/input", found, d.Units)
	}
	if p := f.problem(); p != nil {
		return nil, p
	}
	answer := &GroupSizingAnswer{}
	for i := range trials {
		answer.Trials = append(answer.Trials, d.trial(&trials[i], target))
	}
	last := trials[len(trials)-1]
	if !last.Holds {
		answer.Reason = text("no diameter of the list holds every check with the margin asked for; the trials say why")
		return answer, nil
	}
	d.take(last.Candidate, request.typeOf(last.Candidate, candidates))
	sized, err := strictjson.Encode(&d)
	if err != nil {
		return nil, err
	}
	c, err := calculate(FastenerGroup, sized, view, noRegistry{})
	if err != nil {
		return nil, err
	}
	answer.Value, answer.Result, answer.Governing = &answer.Trials[len(trials)-1].Diameter, &c.result, c.result.Governing
	return answer, nil
}

// resolve puts objects in the place of types' names and pairs them with the
// diameters.
func (r *GroupSizingRequest) resolve(u Units, f *faults) []fastener.Candidate {
	mm := u.scale(strength.Length)
	candidates := make([]fastener.Candidate, len(r.Diameters))
	for i, diameter := range r.Diameters {
		candidates[i].Diameter = diameter * mm
	}
	if r.Types == nil {
		return candidates
	}
	if len(*r.Types) != len(r.Diameters) {
		f.add("/types", "must be one for each of the %d diameters, not %d", len(r.Diameters), len(*r.Types))
		return candidates
	}
	for i := range *r.Types {
		ref := &(*r.Types)[i]
		resolveFastenerType(ref, u, pointer("types", i), f)
		t := u.fastenerType(ref)
		if t.Diameter > 0 && (strength.Less(t.Diameter, candidates[i].Diameter) || strength.More(t.Diameter, candidates[i].Diameter)) {
			f.add(pointer("types", i), "is of the diameter %s, and the one beside it is %s",
				u.write(strength.Length.Of(t.Diameter)), u.write(strength.Length.Of(candidates[i].Diameter)))
		}
		candidates[i].Type = t
	}
	return candidates
}

// typeOf is the type of a candidate as it was asked for, nil for none.
func (r *GroupSizingRequest) typeOf(c fastener.Candidate, candidates []fastener.Candidate) *FastenerTypeRef {
	if c.Type == nil {
		return nil
	}
	return &(*r.Types)[slices.Index(candidates, c)]
}

// take gives every fastener the candidate's diameter, with the clearance of its
// hole kept, and its type.
func (d *GroupDocument) take(c fastener.Candidate, t *FastenerTypeRef) {
	for i := range d.Fasteners {
		one := &d.Fasteners[i]
		diameter := d.Units.out(c.Diameter, strength.Length)
		if one.HoleDiameter != nil {
			hole := (*one.HoleDiameter + (diameter - one.Diameter)) * d.Units.scale(strength.Length)
			hole = d.Units.out(hole, strength.Length)
			one.HoleDiameter = &hole
		}
		if one.Diameter = diameter; t != nil {
			one.Type = t
		}
	}
}

// trial writes one trial in the caller's units.
func (d *GroupDocument) trial(t *fastener.Trial, target float64) GroupTrial {
	out := GroupTrial{
		Diameter: d.Units.out(t.Candidate.Diameter, strength.Length), Holds: t.Holds,
		Verdict: strength.Undetermined.String(), Reason: text(d.Units.say(t.Why)),
	}
	if t.Candidate.Type != nil {
		out.Type = &t.Candidate.Type.Name
	}
	if t.Prepared == nil {
		return out
	}
	a := assembly{calculation: t.Prepared, units: d.Units, methods: methodsOf(t.Prepared), cases: d.caseIDs()}
	r, _ := a.assemble(View{NoWorkings: true}, true)
	out.Verdict, out.Governing = r.Verdict, r.Governing
	if r.Governing != nil {
		out.Margin = r.Governing.Margin
	}
	if !t.Holds && out.Reason == nil {
		out.Reason = text(fmt.Sprintf("the least margin is %.4g, and %.4g is asked for", t.Margin, target))
	}
	return out
}
