package service

import (
	"context"
	"fmt"
	"time"

	"jointledger/service/strictjson"
	"jointledger/strength"
)

// The types of notices.
const (
	noticeWithdrawn = "record.withdrawn"
	noticeNegative  = "record.negative"
)

// notice is the body of a notice.
type notice struct {
	Type      string     `json:"type"`
	Timestamp string     `json:"timestamp"`
	Data      noticeData `json:"data"`
}

// noticeData says which record does not hold any more, and which releases rest
// on it.
type noticeData struct {
	Record  string  `json:"record"`
	Subject subject `json:"subject"`
	// Reason is that of the withdrawal, or what the record gives now.
	Reason   string          `json:"reason"`
	Releases []noticeRelease `json:"releases"`
}

type noticeRelease struct {
	ID       string `json:"id"`
	Index    int64  `json:"index"`
	At       string `json:"at"`
	Part     string `json:"part"`
	Revision string `json:"revision"`
}

// notices makes what is to be told of a record: one for each target, none
// where no release rests on it. The id is that of all attempts.
func (s *Service) notices(ctx context.Context, kind, id, at, reason string, record Entry) ([]Notice, error) {
	if len(s.notify) == 0 {
		return nil, nil
	}
	resting, err := s.store.Decisions(ctx, []string{record.ID})
	if err != nil {
		return nil, err
	}
	n := notice{Type: kind, Timestamp: at, Data: noticeData{Record: record.ID, Subject: subject(record.Subject), Reason: reason}}
	for _, r := range resting {
		if d := r.Decision; d.Verdict == Release {
			n.Data.Releases = append(n.Data.Releases, noticeRelease{d.ID, d.Index, d.At, d.Part, d.Revision})
		}
	}
	if len(n.Data.Releases) == 0 {
		return nil, nil
	}
	body, err := strictjson.Encode(n)
	if err != nil {
		return nil, err
	}
	var list []Notice
	for _, target := range s.notify {
		list = append(list, Notice{ID: id, Target: target, Body: body, Due: at})
	}
	return list, nil
}

// tellReplay notes, once for each version of the program, that an adequate
// record under a release is not adequate by today's methods or cannot be
// computed by them.
func (s *Service) tellReplay(ctx context.Context, record Entry, r *Replay) error {
	adequate, now := strength.Adequate.String(), r.Current
	if record.Verdict != adequate || now.Verdict == adequate {
		return nil
	}
	reason := "by the methods of today it is " + now.Verdict
	if r.refused != nil {
		reason = "by the methods of today it cannot be computed"
	}
	if m := now.Margin; m != nil {
		reason += fmt.Sprintf(", with the least margin %g", *m)
	}
	list, err := s.notices(ctx, noticeNegative, "replay-"+Engine+"-"+record.ID, stamp(s.clock.Now()), reason, record)
	if err != nil || len(list) == 0 {
		return err
	}
	return s.store.Notify(ctx, list)
}

// Sender delivers a notice to a system.
type Sender interface {
	// Send returns nil when the system has taken the notice.
	Send(ctx context.Context, n Notice) error
}

// Pauses of delivery.
const (
	noticeLook  = time.Second      // between looks into the outbox
	noticeLease = 2 * time.Minute  // of a notice that is being sent
	noticeFirst = 5 * time.Second  // before the second attempt; doubles
	noticeMost  = time.Hour        // at most
	noticeCount = 15 * time.Second // between counts of those that wait
	noticeBatch = 20
)

// Deliver sends the notices that are due until the context ends. Every replica
// may deliver; each attempt is made by one. A notice is sent at least once, and
// tried for as long as it takes.
func (s *Service) Deliver(ctx context.Context, sender Sender) {
	look := time.NewTicker(noticeLook)
	defer look.Stop()
	var counted time.Time
	for {
		if now := s.clock.Now(); now.Sub(counted) >= noticeCount {
			if n, err := s.store.NoticesWaiting(ctx); err == nil {
				s.watch.NoticesWait(n)
				counted = now
			}
		}
		sent := s.deliver(ctx, sender)
		if sent == noticeBatch && ctx.Err() == nil {
			continue
		}
		select {
		case <-look.C:
		case <-ctx.Done():
			return
		}
	}
}

// deliver makes one attempt for each of the notices that are due, up to a
// batch, and returns how many there were.
func (s *Service) deliver(ctx context.Context, sender Sender) int {
	now := s.clock.Now()
	list, err := s.store.TakeNotices(ctx, stamp(now), stamp(now.Add(noticeLease)), noticeBatch)
	if err != nil {
		return 0 // the store says so elsewhere
	}
	for _, n := range list {
		err := sender.Send(ctx, n)
		s.watch.NoticeSent(n, err)
		at := s.clock.Now()
		sent, due := stamp(at), stamp(at)
		if err != nil {
			sent, due = "", stamp(at.Add(noticePause(n.Attempts)))
		}
		// Unsettled it is sent again, which its id tells the other side.
		_ = s.store.SettleNotice(ctx, n.ID, n.Target, sent, due)
	}
	return len(list)
}

// noticePause is what is waited after so many attempts.
func noticePause(attempts int) time.Duration {
	pause := noticeFirst
	for i := 1; i < attempts && pause < noticeMost; i++ {
		pause *= 2
	}
	return min(pause, noticeMost)
}
