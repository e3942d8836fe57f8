package service

import (
	"context"

	"jointledger/service/strictjson"
)

// signOffRequest puts a signature under a record.
type signOffRequest struct {
	Role      string `json:"role" validate:"oneof=checked approved"`
	Statement string `json:"statement" validate:"statement"`
}

// withdrawalRequest takes a record back.
type withdrawalRequest struct {
	Reason string `json:"reason" validate:"statement"`
}

// Appended is what became of an entry about a record.
type Appended struct {
	ID    string `json:"id"`
	Index int64  `json:"index"`
	At    string `json:"at"`
	State State  `json:"state"`
}

// SignOff appends a signature. Approval needs a check first, a role is signed
// once, nothing follows a withdrawal; nobody signs their own record or
// approves what they checked.
func (s *Service) SignOff(ctx context.Context, caller Caller, id string, body []byte, idempotency Idempotency) (*Appended, bool, error) {
	var request signOffRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, false, malformed(err, "")
	}
	if request.Role == string(Approved) && !caller.Role.May(Approver) {
		return nil, false, problem(Forbidden, "Approving needs the role approver, and %s has the role %s.", caller.Name, caller.Role)
	}
	var f faults
	f.check(&request)
	if found := f.problem(); found != nil {
		return nil, false, found
	}
	record, err := s.record(ctx, id)
	if err != nil {
		return nil, false, err
	}
	signed := signOffBody{id, digestOf(record), request.Role, request.Statement}
	return s.appendAbout(ctx, caller, record, entrySignOff, signed, idempotency, func(about []Entry) error {
		return maySign(caller, record, about, State(request.Role))
	})
}

// maySign judges a signature on what the log says about a record.
func maySign(caller Caller, record Entry, about []Entry, role State) error {
	var checker string
	for _, e := range about {
		switch {
		case e.Type == entryWithdrawal:
			return problem(Conflict, "The record was withdrawn on %s; nothing can be signed under it.", e.At)
		case e.Role == string(role):
			return problem(Conflict, "The record was %s on %s by %s; each role signs once.", role, e.At, e.Author)
		case e.Role == string(Checked):
			checker = e.Author
		}
	}
	if caller.Name == record.Author {
		detail := "The author of a record signs nothing under it; somebody else must."
		if caller.Role == Local {
			detail += " Everybody is the same author here while the server has no keys: make one for each person with jointledger key add NAME --role ROLE."
		}
		return &Problem{Code: SeparationOfDuties, Detail: detail}
	}
	if role == Approved && checker == "" {
		return problem(Conflict, "The record is not checked yet; a check comes before an approval.")
	}
	if role == Approved && checker == caller.Name {
		return problem(SeparationOfDuties, "%s checked this record; somebody else must approve it.", caller.Name)
	}
	return nil
}

// Withdraw appends the withdrawal of a record: one's own with Analyst, any
// with Approver.
func (s *Service) Withdraw(ctx context.Context, caller Caller, id string, body []byte, idempotency Idempotency) (*Appended, bool, error) {
	var request withdrawalRequest
	if err := strictjson.Decode(body, &request); err != nil {
		return nil, false, malformed(err, "")
	}
	var f faults
	f.check(&request)
	if found := f.problem(); found != nil {
		return nil, false, found
	}
	record, err := s.record(ctx, id)
	if err != nil {
		return nil, false, err
	}
	if caller.Name != record.Author && !caller.Role.May(Approver) {
		return nil, false, problem(Forbidden, "Withdrawing the record of %s needs the role approver, and %s has the role %s.", record.Author, caller.Name, caller.Role)
	}
	signed := withdrawalBody{id, digestOf(record), request.Reason}
	return s.appendAbout(ctx, caller, record, entryWithdrawal, signed, idempotency, func(about []Entry) error {
		for _, e := range about {
			if e.Type == entryWithdrawal {
				return problem(Conflict, "The record was withdrawn on %s by %s already.", e.At, e.Author)
			}
		}
		return nil
	})
}

// appendAbout appends an entry about a record if may allows it on what the log
// says at that moment.
func (s *Service) appendAbout(ctx context.Context, caller Caller, record Entry, kind string, body any, idempotency Idempotency, may func(about []Entry) error) (*Appended, bool, error) {
	entry, err := s.seal(kind, caller, body)
	if err != nil {
		return nil, false, err
	}
	p := &pending{ctx: ctx, entry: entry, answer: idempotency.answer(caller)}
	p.admit = func(ctx context.Context) (State, error) {
		found, err := s.store.About(ctx, []string{record.ID})
		if err != nil {
			return "", err
		}
		about := found[record.ID]
		if err := may(about); err != nil {
			return "", err
		}
		if w, ok := body.(withdrawalBody); ok {
			if p.notices, err = s.notices(ctx, noticeWithdrawn, entry.ID, entry.At, w.Reason, record); err != nil {
				return "", err
			}
		}
		return stateOf(append(about, entry)), nil
	}
	done := s.log.append(p)
	switch {
	case done.err != nil:
		return nil, false, s.fail(done.err)
	case done.earlier != nil:
		if err := idempotency.replay(done.earlier); err != nil {
			return nil, false, err
		}
		if entry, err = s.store.Entry(ctx, done.earlier.Index); err != nil {
			return nil, false, s.fail(err)
		}
		return &Appended{entry.ID, entry.Index, entry.At, done.earlier.State}, true, nil
	}
	return &Appended{entry.ID, done.index, entry.At, done.state}, false, nil
}
