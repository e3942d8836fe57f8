package api_test

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"net/http"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/gowebpki/jcs"

	"jointledger/service"
	"jointledger/store/storetest"
)

// recordView is what these tests read of a record.
type recordView struct {
	ID, State, Author string
	Index             int64
	RecordDigest      string `json:"record_digest"`
	InputDigest       string `json:"input_digest"`
	Kind              string
	Input             json.RawMessage
	Result            struct{ Verdict string }
	SignOffs          []struct{ Role, Author string } `json:"sign_offs"`
	Withdrawal        *struct{ Reason, Author string }
}

// TestRecordFromBirthToWithdrawal follows one record over HTTP.
func TestRecordFromBirthToWithdrawal(t *testing.T) {
	storetest.Each(t, func(t *testing.T, empty service.Store) {
		callers := crew(t, empty)
		analyst, checker, approver := callers[service.Analyst], callers[service.Checker], callers[service.Approver]
		made := analyst.do(t, post("/v1/records", example(t, "addRecord", "record")))
		var record recordView
		made.decode(t, http.StatusCreated, &record)
		where := "/v1/records/" + record.ID
		if made.header.Get("Location") != where || record.State != "recorded" || record.Author != "SM analyst" || record.Result.Verdict != "adequate" {
			t.Fatalf("Location %s of %+v", made.header.Get("Location"), record)
		}

		got := callers[service.Reader].do(t, get(where)).want(t, http.StatusOK)
		if !bytes.Equal(got.body, made.body) {
			t.Errorf("the record is not as answered first:\n%s", cmp.Diff(string(made.body), string(got.body)))
		}
		tag := got.header.Get("ETag")
		if a := analyst.do(t, get(where).with("If-None-Match", tag)); a.status != http.StatusNotModified || a.header.Get("ETag") != tag {
			t.Errorf("with its own ETag: %d, ETag %s", a.status, a.header.Get("ETag"))
		}
		analyst.do(t, get(where).with("If-None-Match", `"other"`)).want(t, http.StatusOK)

		entry := analyst.do(t, get(where+"/entry")).want(t, http.StatusOK)
		leaf := sha256.Sum256(append([]byte{0}, entry.body...))
		if found := "sha256:" + hex.EncodeToString(leaf[:]); found != record.RecordDigest {
			t.Errorf("the entry hashes to %s, and the record_digest is %s", found, record.RecordDigest)
		}
		if canonical, err := jcs.Transform(entry.body); err != nil || !bytes.Equal(canonical, entry.body) {
			t.Errorf("the entry is not in the form of RFC 8785: %v", err)
		}
		if !strings.Contains(entry.header.Get("Cache-Control"), "immutable") {
			t.Errorf("Cache-Control of the entry: %s", entry.header.Get("Cache-Control"))
		}
		hashed, err := jcs.Transform([]byte(`{"input":` + string(record.Input) + `,"kind":"` + record.Kind + `"}`))
		if err != nil {
			t.Fatal(err)
		}
		sum := sha256.Sum256(hashed)
		if found := "sha256:" + hex.EncodeToString(sum[:]); found != record.InputDigest {
			t.Errorf("the input hashes to %s, and the input_digest is %s", found, record.InputDigest)
		}
		// The resolved input asked again gives the same answer.
		var again struct {
			InputDigest string `json:"input_digest"`
		}
		analyst.do(t, post("/v1/lugs", record.Input)).decode(t, http.StatusOK, &again)
		if again.InputDigest != record.InputDigest {
			t.Errorf("the resolved input has the digest %s, and the record %s", again.InputDigest, record.InputDigest)
		}

		sign := func(c client, role string) answer {
			body, err := json.Marshal(map[string]string{"role": role, "statement": "Followed by hand."})
			if err != nil {
				t.Fatal(err)
			}
			return c.do(t, post(where+"/sign-offs", body))
		}
		refuse := func(a answer, status int, kind string) {
			t.Helper()
			if a.want(t, status); a.problem.Type != "/problems/"+kind {
				t.Errorf("%s %s: %s", a.method, a.target, a.problem.Type)
			}
		}
		refuse(sign(analyst, "checked"), http.StatusForbidden, "forbidden")
		refuse(sign(checker, "approved"), http.StatusForbidden, "forbidden")
		refuse(sign(approver, "approved"), http.StatusConflict, "conflict")
		var done struct{ State string }
		if sign(checker, "checked").decode(t, http.StatusCreated, &done); done.State != "checked" {
			t.Errorf("after the check: %s", done.State)
		}
		refuse(sign(checker, "checked"), http.StatusConflict, "conflict")
		if changed := analyst.do(t, get(where).with("If-None-Match", tag)); changed.status != http.StatusOK || changed.header.Get("ETag") == tag {
			t.Errorf("after the check with the old ETag: %d", changed.status)
		}
		if sign(approver, "approved").decode(t, http.StatusCreated, &done); done.State != "approved" {
			t.Errorf("after the approval: %s", done.State)
		}

		// A checker's own record is checked by somebody else.
		var own recordView
		checker.do(t, post("/v1/records", example(t, "addRecord", "patternRecord"))).decode(t, http.StatusCreated, &own)
		refuse(checker.do(t, post("/v1/records/"+own.ID+"/sign-offs", []byte(`{"role":"checked","statement":"Mine."}`))), http.StatusForbidden, "separation-of-duties")
		refuse(analyst.do(t, post("/v1/records/"+own.ID+"/withdrawal", []byte(`{"reason":"Not mine."}`))), http.StatusForbidden, "forbidden")

		reason := []byte(`{"reason":"Loads of LR-08."}`)
		if analyst.do(t, post(where+"/withdrawal", reason)).decode(t, http.StatusCreated, &done); done.State != "withdrawn" {
			t.Errorf("after the withdrawal: %s", done.State)
		}
		refuse(analyst.do(t, post(where+"/withdrawal", reason)), http.StatusConflict, "conflict")
		analyst.do(t, get(where)).decode(t, http.StatusOK, &record)
		if record.State != "withdrawn" || len(record.SignOffs) != 2 || record.SignOffs[0].Author != "SM checker" || record.Withdrawal.Author != "SM analyst" {
			t.Errorf("at the end: %+v", record)
		}
		analyst.do(t, get("/v1/export")).want(t, http.StatusOK)
	})
}

// TestListsArePaged follows Link through pages of one.
func TestListsArePaged(t *testing.T) {
	storetest.Each(t, func(t *testing.T, empty service.Store) {
		c := serve(t, empty)
		var made []string
		for _, name := range []string{"record", "patternRecord", "record"} {
			var record recordView
			c.do(t, post("/v1/records", example(t, "addRecord", name))).decode(t, http.StatusCreated, &record)
			made = append(made, record.ID)
		}
		slices.Reverse(made)
		type page struct {
			Items      []struct{ ID, Kind string }
			NextCursor *string `json:"next_cursor"`
		}
		ids := func(p page) (list []string) {
			for _, item := range p.Items {
				list = append(list, item.ID)
			}
			return list
		}
		var found []string
		for target := "/v1/records?limit=1"; target != ""; {
			var p page
			a := c.do(t, get(target))
			a.decode(t, http.StatusOK, &p)
			found = append(found, ids(p)...)
			target = ""
			if link := a.header.Get("Link"); link != "" {
				target = strings.TrimSuffix(strings.TrimPrefix(link, "<"), `>; rel="next"`)
			}
			if (target == "") != (p.NextCursor == nil) || len(p.Items) > 1 {
				t.Fatalf("Link %q and next_cursor contradict each other: %s", a.header.Get("Link"), a.body)
			}
		}
		if !slices.Equal(found, made) {
			t.Errorf("pages of one give %v, want %v", found, made)
		}
		for filter, want := range map[string][]string{
			"part=SM-214": {made[0], made[2]}, "part=SM-214&latest=true": {made[0]}, "kind=fastener-group": {made[1]},
			"joint=cap%20to%20bracket": {made[1]}, "part=sm-214": nil, "state=checked": nil, "author=local&verdict=adequate&revision=C": {made[0], made[2]},
			"method=elementary@1": {made[0], made[2]}, "material=SM%20plate,%20invented": {made[0], made[2]},
			"until=2026-05-04T09:30:00Z": nil, "since=2026-05-04T11:30:00%2B02:00": made,
		} {
			var p page
			if c.do(t, get("/v1/records?"+filter)).decode(t, http.StatusOK, &p); !slices.Equal(ids(p), want) {
				t.Errorf("%s gives %v, want %v", filter, ids(p), want)
			}
		}
	})
}

// TestIdempotencyKey: of every operation that appends the same request with the
// same key is answered as the first time, and another with it is refused.
func TestIdempotencyKey(t *testing.T) {
	storetest.Each(t, func(t *testing.T, empty service.Store) {
		w := newWorld(t, empty)
		appends := 0
		for _, op := range theDocument(t).operations() {
			if !op.takes("Idempotency-Key") {
				continue
			}
			appends++
			c := w.caller(op)
			const key = `SM retry "7" ~`
			body := first(t, op)
			if op.OperationId == "addCurveSet" { // that of the example stands: there is nothing to append
				body = edited(t, body, map[string]any{"/version": "2"})
			}
			what := w.sample(t, op, body).with("Idempotency-Key", key)
			once := c.do(t, what)
			if once.status >= 300 || once.header.Get("Idempotency-Replayed") != "" {
				t.Fatalf("%s: %d: %s", op.OperationId, once.status, once.body)
			}
			twice := c.do(t, what).want(t, once.status)
			if twice.header.Get("Idempotency-Replayed") != "true" || !bytes.Equal(once.body, twice.body) || once.header.Get("Location") != twice.header.Get("Location") {
				t.Errorf("%s again: replayed %q\n%s\n%s", op.OperationId, twice.header.Get("Idempotency-Replayed"), once.body, twice.body)
			}
			other := what
			other.body = append(slices.Clone(what.body), ' ')
			if a := c.do(t, other).want(t, http.StatusConflict); a.problem.Type != "/problems/idempotency-mismatch" {
				t.Errorf("%s with another body: %s", op.OperationId, a.problem.Type)
			}
			for name, bad := range map[string]string{"a long one": strings.Repeat("k", 256), "not ASCII": "clé", "empty": "", "a tab": "a\tb"} {
				if a := c.do(t, what.with("Idempotency-Key", bad)); a.status != http.StatusBadRequest {
					t.Errorf("%s with a key that is %s: %d", op.OperationId, name, a.status)
				}
			}
		}
		if appends != 5 {
			t.Errorf("%d operations take an Idempotency-Key, 5 append", appends)
		}
		// Another caller's key of the same name is another key.
		body := example(t, "addRecord", "record")
		var first, second recordView
		for c, record := range map[client]*recordView{w.callers[service.Analyst]: &first, w.callers[service.Checker]: &second} {
			c.do(t, post("/v1/records", body).with("Idempotency-Key", "shared")).decode(t, http.StatusCreated, record)
		}
		if first.ID == second.ID {
			t.Error("two callers with one key got one record")
		}
	})
}

// TestCurveSetsKeepTheirContent: a version is registered once.
func TestCurveSetsKeepTheirContent(t *testing.T) {
	w := newWorld(t, storetest.SQLite(t))
	admin, set := w.callers[service.Admin], example(t, "addCurveSet", "invented")
	var standing, again struct{ Index int64 }
	admin.do(t, post("/v1/curve-sets", set)).decode(t, http.StatusCreated, &standing)
	a := admin.do(t, post("/v1/curve-sets", edited(t, set, map[string]any{"/reader": "somebody else"}))).want(t, http.StatusConflict)
	if a.problem.Type != "/problems/conflict" {
		t.Error(a.problem.Type)
	}
	admin.do(t, post("/v1/curve-sets", set)).decode(t, http.StatusCreated, &again)
	if again != standing {
		t.Errorf("the same set was registered at %d and %d", standing.Index, again.Index)
	}
	// A name may have what an address must escape.
	odd := edited(t, set, map[string]any{"/id": "SM chart/1 °"})
	made := admin.do(t, post("/v1/curve-sets", odd)).want(t, http.StatusCreated)
	if a := admin.do(t, get(made.header.Get("Location"))); a.status != http.StatusOK || !bytes.Contains(a.body, []byte(`"SM chart/1 °"`)) {
		t.Errorf("%s: %d: %s", made.header.Get("Location"), a.status, a.body)
	}
}

// A batch that records is held against the document too, and so is a decision
// in plain lines.
func TestBatchesAndDecisionsOtherwise(t *testing.T) {
	callers := crew(t, storetest.SQLite(t))
	lines := example(t, "answerBatch", "twoLugs")
	record := `, "record": {"subject": {"part": "SM-1", "revision": "A", "joint": "hinge"}, "geometry_digest": "g", "idempotency_key": "k"}}` + "\n"
	body := append(bytes.TrimSuffix(bytes.SplitAfter(lines, []byte("\n"))[0], []byte("}\n")), record...)
	for _, replayed := range []string{`"replayed":false`, `"replayed":true`} {
		a := callers[service.Analyst].do(t, call{method: http.MethodPost, target: "/v1/batches?workings=none", body: body}.with("Content-Type", "application/x-ndjson"))
		if a.want(t, http.StatusOK); !bytes.Contains(a.body, []byte(replayed)) {
			t.Errorf("%.500s\nhas no %s", a.body, replayed)
		}
	}
	a := callers[service.Gate].do(t, post("/v1/release-checks", example(t, "checkRelease", "checkIn")).with("Accept", "text/plain"))
	if a.want(t, http.StatusOK); !bytes.HasPrefix(a.body, []byte("hold\nboom hinge lower: no-record: ")) {
		t.Errorf("%s", a.body)
	}
}
