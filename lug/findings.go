package lug

import (
	"math"
	"slices"
	"strings"

	"jointledger/strength"
)

// findings are what is to be said about a joint, each thing once.
type findings []strength.Finding

func (f *findings) add(severity strength.Severity, code, subject, source, format string, args ...any) {
	f.keep(strength.Finding{
		Severity: severity, Code: code, Subject: subject, Source: source, Message: strength.Say(format, args...),
	})
}

// keep adds a finding unless its code was found of its subject before.
func (f *findings) keep(found strength.Finding) {
	for i := range *f {
		if (*f)[i].Code == found.Code && (*f)[i].Subject == found.Subject {
			return
		}
	}
	*f = append(*f, found)
}

// conclude says what concerns the whole joint, and what is left to the user.
func (p *Prepared) conclude(f *findings, read fieldSet) {
	p.fromUltimate(f)
	for _, part := range p.heads() {
		part.findFit(f)
		p.findBody(f, part)
		part.concentration(&sheet{found: f})
		if part.bushing != nil && !p.checked(part.bushingMember) {
			f.add(strength.Note, "bushing-not-checked", part.bushingMember, "", "none of the methods checks the bushing")
		}
	}
	p.findPin(f)
	p.findUnread(f, read)
	p.findings = *f
	p.cautions = p.leave()
}

// fromUltimate tells how many limit demands rest on loads given at ultimate.
func (p *Prepared) fromUltimate(f *findings) {
	limit := false
	for i := range p.laws {
		limit = limit || p.checks[i].Level == strength.Limit && !p.laws[i].unloaded
	}
	count := 0
	for i := range p.loads {
		if p.loads[i].Level == strength.Ultimate {
			count++
		}
	}
	if limit && count > 0 {
		f.add(strength.Note, "limit-from-ultimate", "load cases", "14 CFR 25.301, 25.303",
			"%d of %d load cases are given at ultimate: their checks at limit take the load divided by the ultimate factor %.6g", count, len(p.loads), p.factors.Ultimate)
	}
}

// findFit tells of an unbushed pin that is loose in its hole.
func (p *part) findFit(f *findings) {
	fit := p.fit()
	switch {
	case strength.Less(fit, slackFit):
		f.add(strength.Warning, "loose-pin", p.member, "common practice, no source",
			"Dp/D is %.4g: below %.4g the bearing strength of a close-fitting pin does not hold", fit, slackFit)
	case strength.Less(fit, looseFit):
		f.add(strength.Warning, "loose-pin", p.member, "common practice, no source",
			"Dp/D is %.4g: below %.4g the pin bears on a narrow strip, and bearing strengths are for clean, close-fitting pins", fit, looseFit)
	}
}

// worst is the load case with the largest value of something, and how many
// have it at all.
type worst struct {
	count int
	value float64
	id    string
}

func (w *worst) meet(value float64, id string) {
	if value > 0 {
		w.count++
		if value > w.value {
			w.value, w.id = value, id
		}
	}
}

// findBody tells what a load does to the body that no check covers.
func (p *Prepared) findBody(f *findings, part *part) {
	h := part.head
	var bending, compression, both worst
	for i := range p.loads {
		l := &p.loads[i]
		own := part.share * l.Force
		bending.meet(own*math.Abs(l.sin)*h.HoleDiameter/2, l.ID)
		if l.sides&push != 0 {
			compression.meet(-own*l.cos, l.ID)
		}
		if h.BodyLength != 0 && h.Material.Ftu > 0 && !l.axial() {
			both.meet(p.factors.Fitting*p.toUltimate(l)*own*part.bodyStress(l)/h.Material.Ftu, l.ID)
		}
	}
	if bending.count > 0 && h.BodyLength == 0 {
		f.add(strength.Warning, "body-bending-not-checked", part.member, "statics",
			"%d load cases have a transverse part and no body_length is given: the bending of the body is not checked; the moment at the back of the hole is up to %v before factors (load case %s)",
			bending.count, strength.Moment.Of(bending.value), bending.id)
	}
	if both.value > 1 {
		f.add(strength.Warning, "body-interaction-not-checked", part.member, "statics, derived",
			"axial load and bending of the body are checked one by one; added up at its support they reach %.4g of F_tu at ultimate (load case %s)", both.value, both.id)
	}
	if compression.count > 0 {
		f.add(strength.Warning, "body-compression-not-checked", part.member, "statics",
			"%d load cases push into the body with up to %v before factors (load case %s): its compression and stability are not checked",
			compression.count, strength.Force.Of(compression.value), compression.id)
	}
}

// toUltimate is the factor from a load as given to ultimate.
func (p *Prepared) toUltimate(l *load) float64 {
	if l.Level == strength.Limit {
		return p.factors.Ultimate
	}
	return 1
}

// bodyStress is the elastic edge stress at the body's support for each N of
// load in the head, in MPa/N: axial, offset and transverse parts added.
func (p *part) bodyStress(l *load) float64 {
	h := p.head
	w := h.Width
	if h.BodyWidth != 0 {
		w = h.BodyWidth
	}
	arm := float64(h.BodyLength * math.Abs(l.sin))
	if !h.BodyRestrained {
		arm += math.Abs(h.Offset * l.cos)
	}
	return (math.Abs(l.cos) + 6*arm/w) / (w * h.Thickness)
}

// findPin tells what of the pin is not checked, and how legs share.
func (p *Prepared) findPin(f *findings) {
	c := p.joint.Clevis
	switch {
	case c == nil && p.joint.Pin != nil:
		f.add(strength.Note, "pin-not-checked", memberPin, "statics", "the pin's shear and bending need what it is carried by: there is no clevis")
	case c != nil && p.joint.Pin == nil:
		f.add(strength.Warning, "pin-not-checked", memberPin, "statics", "there is no pin, so that the shear and bending of the joint's pin are not checked")
	}
	if c != nil && p.joint.Pin != nil && !p.checked(memberPin) {
		f.add(strength.Warning, "pin-not-checked", memberPin, "", "none of the methods checks the pin")
	}
	if c == nil || p.joint.SingleShear {
		return
	}
	if c.Gap > 0 && c.LegShare == 0 {
		f.add(strength.Note, "leg-sharing", memberClevis, "statics",
			"each leg is taken with half the load; the gap of %v a side could go to one side, which loads the nearer leg more: leg_share says by how much", mm(c.Gap))
	}
}

// checked reports whether a member has any check that counts.
func (p *Prepared) checked(member string) bool {
	return slices.ContainsFunc(p.checks, func(c strength.Check) bool { return c.Member == member && !c.Compared })
}

// findUnread lists the optional fields that no method read.
func (p *Prepared) findUnread(f *findings, read fieldSet) {
	var names []string
	given := p.joint.given()
	for i := field(0); i < fieldsInAll; i++ {
		if given.has(i) && !read.has(i) {
			names = append(names, i.path())
		}
	}
	if len(names) > 0 {
		f.add(strength.Note, "not-used", strings.Join(names, ", "), "", "given, and read by none of the methods: %s", strings.Join(names, ", "))
	}
}

// leave lists what the calculation leaves to the user.
func (p *Prepared) leave() []string {
	cautions := []string{
		"Static strength only: no fatigue, no crack growth, no wear.",
		"Loads act in the plane of the lug: side load and misalignment are the user's.",
		"The body and the structure behind it are the user's, but for what the checks and findings say of them.",
		"Temperature, wear and stress corrosion are not taken into account.",
		"Handbook bearing values are for clean dry pins.",
		"Values marked as from memory must be verified against a controlled copy of their source.",
		"A-basis values are for a single load path; the user's certification basis and licensed practice decide.",
	}
	long := false
	for _, part := range p.heads() {
		h := part.head
		if p.joint.Pin != nil && h.Thickness > p.joint.Pin.Diameter || p.joint.Pin == nil && h.Thickness > h.HoleDiameter {
			long = true
		}
		if h.Offset != 0 && h.BodyRestrained {
			cautions = append(cautions, "The bending of the body by the offset hole of the "+part.member+" is left to its support, as the request says.")
		}
	}
	if long {
		cautions = append(cautions, "The lug is longer than its pin is wide (t/Dp > 1): the pin's bending peaks the bearing at the faces, which a check of the lug does not see.")
	}
	return cautions
}
