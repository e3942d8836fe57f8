package pages

import (
	"errors"
	"net/http"

	"jointledger/service"
)

type partContent struct {
	*service.Part
	From, To string
	Changes  *service.Changes
	Release  *service.Decision
	Judged   string // the revision that the gate was asked about
	Refused  string // why the gate gave no decision
}

func (p *Pages) part(v *visit) error {
	query := v.r.URL.Query()
	found, err := p.service.Part(v.r.Context(), query.Get("part"))
	if err != nil {
		return err
	}
	c := partContent{Part: found, From: query.Get("from"), To: query.Get("to"), Judged: found.Revisions[0].Revision}
	if c.From == "" && c.To == "" && len(found.Revisions) > 1 {
		c.From, c.To = found.Revisions[1].Revision, found.Revisions[0].Revision
	}
	if c.From != "" && c.To != "" {
		if c.Changes, err = p.service.Changes(v.r.Context(), found.Part, c.From, c.To); err != nil {
			return err
		}
	}
	if revision := query.Get("revision"); revision != "" {
		c.Judged = revision
	}
	c.Release, err = p.service.GateAsRecorded(v.r.Context(), v.caller, found.Part, c.Judged)
	var problem *service.Problem
	if errors.As(err, &problem) && problem.Code == service.Invalid {
		c.Refused = problem.Error()
	} else if err != nil {
		return err
	}
	p.show(v, http.StatusOK, "part", "Part "+found.Part, c)
	return nil
}
