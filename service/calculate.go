package service

import (
	"crypto/sha256"
	"encoding/hex"
	"strings"

	"jointledger/service/strictjson"
)

// Engine is the version of this program that answers carry.
const Engine = "0.1.0"

// Kind says what sort of joint a document describes.
type Kind string

// The kinds of joint.
const (
	Lug           Kind = "lug"
	FastenerGroup Kind = "fastener-group"
	Splice        Kind = "splice"
)

// Words implements strictjson.Words.
func (Kind) Words() []string {
	words := make([]string, len(kinds))
	for i, k := range kinds {
		words[i] = string(k.kind)
	}
	return words
}

// document is the input of one kind of joint, decoded.
type document interface {
	// resolve puts objects in the place of catalogues' names and writes the
	// defaults out, noting what cannot be used.
	resolve(look lookup, f *faults)
	// prepare makes the calculation of a resolved document, noting what
	// cannot be calculated. It may be called on a document with faults and
	// then returns nil.
	prepare(f *faults) *prepared
}

// prepared is a document ready to be calculated.
type prepared struct {
	assembly
	places int // fasteners or rows
	// add fills in what only this kind answers, for the load cases of loads.
	add func(r *Result, loads []int)
}

// extras are the members of an answer that only some kinds have.
type extras struct {
	MethodOptions map[string]map[string]strictjson.Raw `json:"method_options,omitzero"`
	// StressConcentration is the elastic one of each loaded hole.
	StressConcentration []Working           `json:"stress_concentration,omitzero"`
	Centroid            *[2]float64         `json:"centroid,omitzero"`
	Shares              []CaseShares        `json:"shares,omitzero"`
	Transfers           []CaseTransfers     `json:"transfers,omitzero"`
	Compared            []ComparedTransfers `json:"compared_transfers,omitzero"`
}

// kindEntry makes an empty document of a kind.
type kindEntry struct {
	kind Kind
	make func() document
}

// kinds is the registry: a new kind of joint is one line here.
var kinds = []kindEntry{
	{Lug, func() document { return new(LugDocument) }},
	{FastenerGroup, func() document { return new(GroupDocument) }},
	{Splice, func() document { return new(SpliceDocument) }},
}

// lookup finds what is registered at run time rather than built in.
type lookup interface {
	curveSet(name string) (*CurveSet, error)
}

// calculation is an answer with what a record needs beside it.
type calculation struct {
	result      Result
	input       strictjson.Raw // resolved, canonical
	inputDigest string
}

// calculate answers one document. Problems point from the document's root.
func calculate(kind Kind, input []byte, view View, look lookup) (*calculation, error) {
	var doc document
	for _, k := range kinds {
		if k.kind == kind {
			doc = k.make()
		}
	}
	if doc == nil {
		return nil, problem(Malformed, "The kind must be one of %s.", strings.Join(kind.Words(), ", "))
	}
	if err := strictjson.Decode(input, doc); err != nil {
		return nil, malformed(err, "")
	}
	var f faults
	f.settle(doc, look)
	if f.cause != nil {
		return nil, f.cause
	}
	p := doc.prepare(&f)
	if found := f.problem(); found != nil {
		return nil, found
	}
	governingOnly, tooMany := view.governingOnly(p.places, len(p.cases))
	if tooMany != nil {
		return nil, tooMany
	}
	resolved, err := strictjson.Canonical(doc)
	if err != nil {
		return nil, err
	}
	c := &calculation{input: resolved, inputDigest: inputDigest(kind, resolved)}
	var loads []int
	c.result, loads = p.assemble(view, governingOnly)
	if p.add != nil {
		p.add(&c.result, loads)
	}
	c.result.InputDigest = c.inputDigest
	return c, nil
}

// inputDigest is SHA-256 over the canonical {"input", "kind"}.
func inputDigest(kind Kind, canonicalInput []byte) string {
	h := sha256.New()
	h.Write([]byte(`{"input":`))
	h.Write(canonicalInput)
	h.Write([]byte(`,"kind":"` + string(kind) + `"}`))
	return "sha256:" + hex.EncodeToString(h.Sum(nil))
}

// loadCases turns ids into the assembly's list.
func loadCases[T any](cases []T, id func(*T) string) []string {
	ids := make([]string, len(cases))
	for i := range cases {
		ids[i] = id(&cases[i])
	}
	return ids
}
