package service

import (
	"fmt"

	"jointledger/service/strictjson"
)

// Content is what a record says, decoded: its result, and its input in the
// document of its kind, the others nil.
type Content struct {
	Result *Result
	Lug    *LugDocument
	Group  *GroupDocument
	Splice *SpliceDocument
}

// Content decodes input and result of a record.
func (d *RecordDocument) Content() (*Content, error) {
	c := &Content{Result: new(Result)}
	if err := strictjson.Decode(d.Result, c.Result); err != nil {
		return nil, fmt.Errorf("the result of record %s: %w", d.ID, err)
	}
	var input any
	switch d.Kind {
	case Lug:
		c.Lug = new(LugDocument)
		input = c.Lug
	case FastenerGroup:
		c.Group = new(GroupDocument)
		input = c.Group
	case Splice:
		c.Splice = new(SpliceDocument)
		input = c.Splice
	default:
		return nil, fmt.Errorf("record %s is of the kind %q", d.ID, d.Kind)
	}
	if err := strictjson.Decode(d.Input, input); err != nil {
		return nil, fmt.Errorf("the input of record %s: %w", d.ID, err)
	}
	return c, nil
}

// Spread writes a document, an input or a result as JSON that people can read.
func Spread(document any) (string, error) {
	text, err := strictjson.Spread(document)
	return string(text), err
}
