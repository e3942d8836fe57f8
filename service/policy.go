package service

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"path"
	"slices"
	"strconv"
	"strings"

	"jointledger/service/strictjson"
)

// Policy says what a release asks of the latest records of a joint. What every
// policy asks cannot be turned off: a record, not withdrawn, adequate, for the
// geometry that is released.
type Policy struct {
	Name string `json:"name" validate:"id"`
	// SignOffs are the signatures that each record needs.
	SignOffs *[]string `json:"sign_offs,omitzero" validate:"omitnil,unique,dive,oneof=checked approved"`
	// LeastMargins ask for more than zero, by patterns of joints; the first
	// that matches a joint holds.
	LeastMargins []LeastMargin `json:"least_margins,omitzero" validate:"omitempty,max=1000,dive"`
	// Methods and CurveSets name those that may be, or may not be, rested on:
	// by id, or id@revision (id@version).
	Methods   *Choice `json:"methods,omitzero"`
	CurveSets *Choice `json:"curve_sets,omitzero"`
	// BarFindings are codes of findings that hold a release, such as
	// derived-curves.
	BarFindings []string `json:"bar_findings,omitzero" validate:"omitempty,unique,dive,id"`
	// Violations says whether findings of the severity violation hold.
	Violations *string `json:"violations,omitzero" validate:"omitnil,oneof=hold allow"`
	// GreatestAgeDays is how old a record may be.
	GreatestAgeDays *float64 `json:"greatest_age_days,omitzero" validate:"omitnil,size"`
	// LeastEngine is the oldest version of this program that may have
	// computed a record.
	LeastEngine *string `json:"least_engine,omitzero" validate:"omitnil,version"`
}

// LeastMargin asks for a margin at joints whose name matches a pattern with
// * for any characters and ? for one.
type LeastMargin struct {
	Joints string  `json:"joints" validate:"id"`
	Margin float64 `json:"margin" validate:"amount"`
}

// Choice allows only some names, or bars some.
type Choice struct {
	Allow []string `json:"allow,omitzero" validate:"omitempty,min=1,unique,dive,id"`
	Bar   []string `json:"bar,omitzero" validate:"omitempty,min=1,unique,dive,id"`
}

// DefaultPolicy is the one that every server has.
const DefaultPolicy = "default"

// policyFile is a file of named policies.
type policyFile struct {
	Policies []Policy `json:"policies" validate:"min=1,max=100,dive"`
}

// Policies are those that a server knows, by name.
type Policies map[string]Policy

// NewPolicies reads a file of policies; nil is none. The error names every
// field that cannot be used, with its line.
func NewPolicies(text []byte) (Policies, error) {
	known := Policies{DefaultPolicy: {Name: DefaultPolicy}}
	if text != nil {
		var file policyFile
		var f faults
		if err := strictjson.Decode(text, &file); err != nil {
			var e *strictjson.Error
			if !errors.As(err, &e) {
				return nil, err
			}
			f.add(e.Pointer, "%s", e.Detail)
		} else {
			f.check(&file)
			for i, p := range file.Policies {
				if _, twice := known[p.Name]; twice {
					f.add(pointer("policies", i, "name"), "the name %.80q is taken", p.Name)
				}
				for _, name := range unknownMethods(p.Methods) {
					f.add(pointer("policies", i, "methods"), "there is no method %.80q", name)
				}
				known[p.Name] = p
			}
		}
		if len(f.list) > 0 {
			line := strictjson.Lines(text)
			var found []string
			for _, e := range f.list {
				found = append(found, fmt.Sprintf("line %d: %s %s", line(e.Pointer), e.Pointer, e.Detail))
			}
			return nil, errors.New(strings.Join(found, "\n"))
		}
	}
	for name, p := range known {
		setDefault(&p.SignOffs, []string{string(Checked), string(Approved)})
		setDefault(&p.Violations, "allow")
		known[name] = p
	}
	return known, nil
}

// unknownMethods finds what a choice names in vain: barring a misspelt method
// would bar nothing.
func unknownMethods(c *Choice) (unknown []string) {
	if c == nil {
		return nil
	}
	known := map[string]bool{}
	for _, m := range append(lugMethods(), fastenerMethods()...) {
		known[m.ID], known[m.Method] = true, true
	}
	for _, name := range slices.Concat(c.Allow, c.Bar) {
		if !known[name] {
			unknown = append(unknown, name)
		}
	}
	return unknown
}

// digest is SHA-256 over the canonical form with the defaults written out.
func (p Policy) digest() (string, error) {
	canonical, err := strictjson.Canonical(p)
	if err != nil {
		return "", err
	}
	sum := sha256.Sum256(canonical)
	return "sha256:" + hex.EncodeToString(sum[:]), nil
}

// leastMargin is what the policy asks at a joint, 0 when nothing more.
func (p Policy) leastMargin(joint string) float64 {
	for _, l := range p.LeastMargins {
		if matches(l.Joints, joint) {
			return l.Margin
		}
	}
	return 0
}

// plainPattern leaves * and ? alone their meaning: they stand for a slash too,
// and a bracket stands for itself.
var plainPattern = strings.NewReplacer("/", "\x00", `\`, `\\`, "[", `\[`, "]", `\]`)

// matches reports whether a whole name is of a pattern.
func matches(pattern, name string) bool {
	ok, err := path.Match(plainPattern.Replace(pattern), strings.ReplaceAll(name, "/", "\x00"))
	return ok && err == nil
}

// refuses says why the choice does not let a name pass, empty when it does.
func (c *Choice) refuses(name string) string {
	if c == nil {
		return ""
	}
	id, _, _ := strings.Cut(name, "@")
	named := func(list []string) bool { return slices.Contains(list, name) || slices.Contains(list, id) }
	switch {
	case named(c.Bar):
		return "is barred"
	case len(c.Allow) > 0 && !named(c.Allow):
		return "is not among those allowed"
	}
	return ""
}

// readVersion reads major.minor.patch.
func readVersion(text string) (v [3]int, ok bool) {
	parts := strings.Split(text, ".")
	if len(parts) != 3 {
		return v, false
	}
	for i, part := range parts {
		n, err := strconv.Atoi(part)
		if err != nil || n < 0 || strconv.Itoa(n) != part {
			return v, false
		}
		v[i] = n
	}
	return v, true
}

// olderThan reports whether one version came before another.
func olderThan(version, least string) bool {
	a, okA := readVersion(version)
	b, okB := readVersion(least)
	return !okA || !okB || slices.Compare(a[:], b[:]) < 0
}
