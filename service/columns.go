package service

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"

	"jointledger/service/ledger"
	"jointledger/service/strictjson"
)

// The kinds of terms.
const (
	termMethod     = "method"
	termMaterial   = "material"
	termCurveSet   = "curve-set"
	termInline     = "inline-curve-set"
	termCurveSetID = "curve-set-id"
	termRecord     = "record"
)

// EntryOf makes what is stored of an entry from its canonical bytes alone, but
// for its index. The columns repeat what the bytes say, for finding it.
func EntryOf(canonical []byte) (Entry, error) {
	envelope, err := ledger.Parse(canonical)
	if err != nil {
		return Entry{}, err
	}
	e, _, err := entryOf(canonical, envelope)
	return e, err
}

// sealedEntry is EntryOf for bytes whose hash was signed, and which need no
// second look at their form. The record is nil of an entry of another type.
func sealedEntry(canonical []byte) (Entry, *recordHead, error) {
	envelope, err := ledger.Split(canonical)
	if err != nil {
		return Entry{}, nil, err
	}
	return entryOf(canonical, envelope)
}

func entryOf(canonical []byte, envelope ledger.Envelope) (Entry, *recordHead, error) {
	e := Entry{
		ID: envelope.ID, Type: envelope.Type, At: envelope.At, Author: envelope.Author,
		Bytes: canonical, Leaf: ledger.Leaf(canonical),
	}
	var record *recordHead
	var err error
	read := func(into any) { err = strictjson.DecodeSealed(envelope.Body, into) }
	switch envelope.Type {
	case entryRecord:
		record = new(recordHead)
		if read(record); err == nil {
			e.Columns, err = record.columns()
		}
	case entrySignOff:
		var b signOffBody
		read(&b)
		e.Columns = Columns{Target: b.Record, Role: b.Role}
	case entryWithdrawal:
		var b withdrawalBody
		read(&b)
		e.Columns = Columns{Target: b.Record}
	case entryCurveSet:
		var b CurveSet
		read(&b)
		e.Columns = Columns{Terms: []Term{{termCurveSet, b.ID + "@" + b.Version}, {termCurveSetID, b.ID}}}
	case entryDecision:
		var b decisionBody
		read(&b)
		e.Columns = Columns{Subject: Subject{Part: b.Part, Revision: b.Revision}, Verdict: b.Decision}
		for _, r := range b.Records {
			e.Terms = append(e.Terms, Term{termRecord, r.ID})
		}
	}
	if err != nil {
		return Entry{}, nil, fmt.Errorf("the entry %s: %w", envelope.ID, err)
	}
	return e, record, nil
}

// recordHead is what is read of a record's body without the rest.
type recordHead struct {
	Subject        subject        `json:"subject"`
	GeometryDigest string         `json:"geometry_digest"`
	Kind           Kind           `json:"kind"`
	Input          strictjson.Raw `json:"input"`
	Result         resultHead     `json:"result"`
}

// resultHead is what is read of a record's result without the rest.
type resultHead struct {
	Verdict   string         `json:"verdict"`
	Governing *governingHead `json:"governing"`
	ByMethod  []methodHead   `json:"by_method"`
	Findings  []struct {
		Severity string `json:"severity"`
		Code     string `json:"code"`
		Message  string `json:"message"`
	} `json:"findings"`
	Engine string `json:"engine"`
}

type governingHead struct {
	Margin *float64 `json:"margin"`
}

type methodHead struct {
	Method   string `json:"method"`
	Compared bool   `json:"compared"`
}

// margin is the governing margin, nil where there is none.
func (r *resultHead) margin() *float64 {
	if r.Governing == nil {
		return nil
	}
	return r.Governing.Margin
}

// columns repeats what a record says, for finding it.
func (r *recordHead) columns() (Columns, error) {
	c := Columns{
		Subject: Subject(r.Subject), GeometryDigest: r.GeometryDigest, Kind: string(r.Kind),
		Verdict: r.Result.Verdict, Margin: r.Result.margin(),
	}
	for _, m := range r.Result.ByMethod {
		c.Terms = append(c.Terms, Term{termMethod, m.Method})
	}
	found, err := inputTerms(r.Input)
	if err != nil {
		return Columns{}, err
	}
	slices.SortFunc(found, func(a, b Term) int { return cmp.Or(cmp.Compare(a.Kind, b.Kind), cmp.Compare(a.Value, b.Value)) })
	c.Terms = append(c.Terms, slices.Compact(found)...)
	return c, nil
}

// inputTerms collects the materials and curve sets that an input names,
// wherever they stand. What is no object names none.
func inputTerms(input strictjson.Raw) (found []Term, _ error) {
	err := strictjson.Members(input, func(name string, value strictjson.Raw) {
		var is struct {
			Name    string `json:"name"`
			ID      string `json:"id"`
			Version string `json:"version"`
			Digest  string `json:"digest"`
		}
		if strictjson.DecodeSealed(value, &is) != nil {
			return
		}
		switch {
		case name == "material" && is.Name != "":
			found = append(found, Term{termMaterial, is.Name})
		case name == "curve_set" && is.ID != "":
			set := is.ID + "@" + is.Version
			found = append(found, Term{termCurveSet, set})
			if is.Digest == "" {
				// A whole set, which can have any name.
				found = append(found, Term{termInline, set})
			}
		}
	}, "material", "curve_set")
	return found, err
}

// unaltered compares what is stored of an entry with what its bytes say.
func unaltered(stored Entry) error {
	is, _, err := sealedEntry(stored.Bytes)
	if err != nil {
		return fmt.Errorf("%w: entry %d: %w", errAltered, stored.Index, err)
	}
	return sameColumns(stored, is)
}

func sameColumns(stored, is Entry) error {
	margin := func(m *float64) string {
		if m == nil {
			return "none"
		}
		return strconv.FormatFloat(*m, 'g', -1, 64)
	}
	for _, column := range []struct{ name, stored, says string }{
		{"leaf", string(stored.Leaf[:]), string(is.Leaf[:])},
		{"id", stored.ID, is.ID},
		{"type", stored.Type, is.Type},
		{"at", stored.At, is.At},
		{"author", stored.Author, is.Author},
		{"part", stored.Part, is.Part},
		{"revision", stored.Revision, is.Revision},
		{"joint", stored.Joint, is.Joint},
		{"aspect", stored.Aspect, is.Aspect},
		{"kind", stored.Kind, is.Kind},
		{"geometry digest", stored.GeometryDigest, is.GeometryDigest},
		{"verdict", stored.Verdict, is.Verdict},
		{"margin", margin(stored.Margin), margin(is.Margin)},
		{"target", stored.Target, is.Target},
		{"role", stored.Role, is.Role},
	} {
		if column.stored != column.says {
			return fmt.Errorf("%w: entry %d (%s): its column %s has %.80q and its bytes say %.80q", errAltered, stored.Index, is.ID, column.name, column.stored, column.says)
		}
	}
	return nil
}
