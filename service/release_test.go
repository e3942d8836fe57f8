package service_test

import (
	"context"
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"jointledger/service"
	"jointledger/service/ledger"
	"jointledger/store/storetest"
)

var vault = service.Caller{Name: "vault", Role: service.Gate}

// recordOf asks for the record of a joint of the boom SM-1200.
func recordOf(joint, aspect, kind, input string) []byte {
	return fmt.Appendf(nil, `{"subject":{"part":"SM-1200","revision":"B","joint":%q,"aspect":%q},"geometry_digest":"g1","kind":%q,"input":%s}`, joint, aspect, kind, input)
}

// pair is a pattern of two fasteners, each of a strength, under 1,000 lbf of
// ultimate shear, its holes a distance from the plate's side.
func pair(strength, edge float64) string {
	return fmt.Sprintf(`{"units": "US", "stiffness": "equal", "rules": ["common-practice"],
  "fasteners": [{"id": "1", "x": 0, "y": 0, "diameter": 0.25, "type": {"name": "pin", "shear_strength": %[1]g, "tension_strength": 9000}},
                {"id": "2", "x": 2, "y": 0, "diameter": 0.25, "type": {"name": "pin", "shear_strength": %[1]g, "tension_strength": 9000}}],
  "plates": [{"id": "strap", "thickness": 0.25, "outline": [[-%[2]g,-%[2]g],[3,-%[2]g],[3,%[2]g],[-%[2]g,%[2]g]]}],
  "factors": {"ultimate": 1.5, "fitting": 1.0},
  "load_cases": [{"id": "LC1", "level": "ultimate", "point": [1, 0, 0], "force": [0, -1000, 0], "moment": [0, 0, 0]}]}`, strength, edge)
}

// weakLug is the example's lug under twice its load.
var weakLug = strings.Replace(hingeLug, `"force": 18000`, `"force": 36000`, 1)

func openWith(t testing.TB, store service.Store, policies string, watch service.Watch) *service.Service {
	t.Helper()
	var text []byte
	if policies != "" {
		text = []byte(policies)
	}
	known, err := service.NewPolicies(text)
	if err != nil {
		t.Fatal(err)
	}
	s, err := service.New(t.Context(), service.Setup{
		Store: store, Clock: &storetest.Ticking{Step: time.Second}, Signer: storetest.Signer(t), Policies: known, Watch: watch,
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	return s
}

// put records and, for each of the roles, signs.
func put(t testing.TB, s *service.Service, body []byte, roles ...string) string {
	t.Helper()
	r, _, err := s.Record(t.Context(), ada, body, service.Idempotency{})
	if err != nil {
		t.Fatal(err)
	}
	for _, role := range roles {
		by := ben
		if role == "approved" {
			by = cleo
		}
		if _, err := sign(t, s, by, r.ID, role); err != nil {
			t.Fatal(err)
		}
	}
	return r.ID
}

var both = []string{"checked", "approved"}

// ask asks for the release of SM-1200 B with joints of the geometry g1.
func ask(policy string, joints ...string) []byte {
	type joint struct {
		Joint          string `json:"joint"`
		GeometryDigest string `json:"geometry_digest"`
	}
	request := struct {
		Part     string  `json:"part"`
		Revision string  `json:"revision"`
		Joints   []joint `json:"joints"`
		Policy   string  `json:"policy"`
	}{"SM-1200", "B", []joint{}, policy}
	for _, j := range joints {
		request.Joints = append(request.Joints, joint{j, "g1"})
	}
	text, err := json.Marshal(request)
	if err != nil {
		panic(err)
	}
	return text
}

func judge(t testing.TB, s *service.Service, body []byte) *service.Decision {
	t.Helper()
	d, _, err := s.Judge(t.Context(), vault, body, false, service.Idempotency{})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// why lists a decision's reasons as joint:code.
func why(d *service.Decision) string {
	var list []string
	for _, f := range d.Findings {
		list = append(list, f.Joint+":"+f.Code)
	}
	return strings.Join(list, " ")
}

func expect(t testing.TB, when string, d *service.Decision, want string) {
	t.Helper()
	decision := service.Hold
	if want == "" {
		decision = service.Release
	}
	if d.Decision != decision || why(d) != want {
		t.Errorf("%s: %s for %q, want %s for %q", when, d.Decision, why(d), decision, want)
	}
}

func TestTheDefaultPolicy(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := openWith(t, store, "", service.Unwatched{})
		expect(t, "nothing on record", judge(t, s, ask("default", "a", "b")), "a:no-record b:no-record")

		first := put(t, s, recordOf("a", "", "lug", hingeLug))
		expect(t, "unsigned", judge(t, s, ask("default", "a")), "a:not-checked a:not-approved")
		if _, err := sign(t, s, ben, first, "checked"); err != nil {
			t.Fatal(err)
		}
		expect(t, "checked", judge(t, s, ask("default", "a")), "a:not-approved")
		if _, err := sign(t, s, cleo, first, "approved"); err != nil {
			t.Fatal(err)
		}
		expect(t, "approved", judge(t, s, ask("default", "a")), "")
		expect(t, "by default the policy default", judge(t, s, []byte(`{"part":"SM-1200","revision":"B","joints":[{"joint":"a","geometry_digest":"g1"}]}`)), "")

		// The geometry, the part and the revision are compared exactly.
		expect(t, "another geometry", judge(t, s, []byte(`{"part":"SM-1200","revision":"B","joints":[{"joint":"a","geometry_digest":"G1"}]}`)), "a:geometry-changed")
		expect(t, "another revision", judge(t, s, []byte(`{"part":"SM-1200","revision":"b","joints":[{"joint":"a","geometry_digest":"g1"}]}`)), "a:no-record")
		expect(t, "another part", judge(t, s, []byte(`{"part":"SM-120","revision":"B","joints":[{"joint":"a","geometry_digest":"g1"}]}`)), "a:no-record")

		// A new record takes the place of the approved one, for the better or
		// the worse.
		put(t, s, recordOf("a", "", "lug", hingeLug))
		expect(t, "a new record", judge(t, s, ask("default", "a")), "a:not-checked a:not-approved")
		put(t, s, recordOf("a", "", "lug", weakLug), both...)
		expect(t, "an inadequate record", judge(t, s, ask("default", "a")), "a:not-adequate")

		// Neither another kind nor another aspect hides it.
		put(t, s, recordOf("a", "", "fastener-group", pair(2000, 1)), both...)
		put(t, s, recordOf("a", "fatigue", "lug", hingeLug), both...)
		expect(t, "adequate records beside", judge(t, s, ask("default", "a")), "a:not-adequate")
		last := put(t, s, recordOf("a", "", "lug", hingeLug), both...)
		expect(t, "all adequate", judge(t, s, ask("default", "a")), "")
		expect(t, "a joint left out", judge(t, s, ask("default", "b")), "b:no-record a:joint-not-named")

		// A withdrawn record stays the latest.
		if _, err := withdraw(t, s, ada, last); err != nil {
			t.Fatal(err)
		}
		d := judge(t, s, ask("default", "a"))
		expect(t, "withdrawn", d, "a:withdrawn")
		if d.Findings[0].Record == nil || *d.Findings[0].Record != last {
			t.Errorf("the finding is about %v, want %s", d.Findings[0].Record, last)
		}
		// Undetermined is not adequate: nothing was checked.
		put(t, s, recordOf("a", "", "lug", hingeLug), both...)
		put(t, s, recordOf("u", "", "fastener-group", strings.ReplaceAll(pair(1, 1), `, "type": {"name": "pin", "shear_strength": 1, "tension_strength": 9000}`, "")), both...)
		expect(t, "undetermined", judge(t, s, ask("default", "a", "u")), "u:not-adequate")
		verifyAll(t, s)
	})
}

func TestPolicies(t *testing.T) {
	const affdl = `{"units": "US", "methods": ["affdl-tr-69-42"],
  "lug": {"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125, "material": "7050-T7451-plate-0.250-1.500-L"},
  "factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [{"id": "LC1", "level": "limit", "force": 9000, "angle": 0}]%s}`
	plain := fmt.Sprintf(affdl, "")
	set, err := openWith(t, storetest.SQLite(t), "", service.Unwatched{}).CurveSetByName(t.Context(), "derived-1")
	if err != nil {
		t.Fatal(err)
	}
	// A set that came with the input calls itself as it likes.
	set.CurveSet.ID, set.CurveSet.Version = "house", "1"
	inline, err := json.Marshal(set.CurveSet)
	if err != nil {
		t.Fatal(err)
	}
	disguised := fmt.Sprintf(affdl, `, "method_options": {"affdl-tr-69-42": {"curve_set": `+string(inline)+`}}`)

	for _, c := range []struct {
		policy, joint, kind, input string
		roles                      []string
		want                       string
	}{
		{`"sign_offs": []`, "a", "lug", hingeLug, nil, ""},
		{`"sign_offs": ["checked"]`, "a", "lug", hingeLug, nil, "a:not-checked"},
		{`"sign_offs": ["checked"]`, "a", "lug", hingeLug, []string{"checked"}, ""},
		// What every policy asks stands.
		{`"sign_offs": []`, "a", "lug", weakLug, nil, "a:not-adequate"},
		// The governing margin of the example is 0.098 (the README's).
		{`"least_margins": [{"joints": "*", "margin": 0.09}]`, "a", "lug", hingeLug, both, ""},
		{`"least_margins": [{"joints": "*", "margin": 0.10}]`, "a", "lug", hingeLug, both, "a:margin"},
		{`"least_margins": [{"joints": "hinge/*", "margin": 0.10}]`, "a", "lug", hingeLug, both, ""},
		{`"least_margins": [{"joints": "hinge*", "margin": 0.10}]`, "hinge/upper/1", "lug", hingeLug, both, "hinge/upper/1:margin"},
		{`"least_margins": [{"joints": "hinge-?", "margin": 0.10}]`, "hinge-1", "lug", hingeLug, both, "hinge-1:margin"},
		{`"least_margins": [{"joints": "hinge-?", "margin": 0.10}]`, "hinge-12", "lug", hingeLug, both, ""},
		{`"least_margins": [{"joints": "bay[1]*", "margin": 0.10}]`, "bay[1]", "lug", hingeLug, both, "bay[1]:margin"},
		{`"least_margins": [{"joints": "bay\\*", "margin": 0.10}]`, `bay\2`, "lug", hingeLug, both, `bay\2:margin`},
		// The first that matches holds.
		{`"least_margins": [{"joints": "a", "margin": 0}, {"joints": "*", "margin": 0.5}]`, "a", "lug", hingeLug, both, ""},
		{`"methods": {"bar": ["elementary"]}`, "a", "lug", hingeLug, both, "a:method"},
		{`"methods": {"bar": ["elementary@1"]}`, "a", "lug", hingeLug, both, "a:method"},
		{`"methods": {"bar": ["affdl-tr-69-42"]}`, "a", "lug", hingeLug, both, ""},
		{`"methods": {"allow": ["affdl-tr-69-42"]}`, "a", "lug", hingeLug, both, "a:method"},
		{`"methods": {"allow": ["elementary"]}`, "a", "lug", hingeLug, both, ""},
		{`"methods": {"allow": ["elementary"], "bar": ["elementary@1"]}`, "a", "lug", hingeLug, both, "a:method"},
		{`"curve_sets": {"allow": ["house"]}`, "a", "lug", hingeLug, both, ""},
		{`"curve_sets": {"allow": ["house"]}`, "a", "lug", plain, both, "a:curve-set"},
		{`"curve_sets": {"allow": ["house"]}`, "a", "lug", disguised, both, "a:curve-set"},
		{`"curve_sets": {"bar": ["house@1"]}`, "a", "lug", disguised, both, "a:curve-set"},
		{`"curve_sets": {"bar": ["derived-1"]}`, "a", "lug", plain, both, "a:curve-set"},
		{`"bar_findings": ["derived-curves"]`, "a", "lug", plain, both, "a:finding"},
		{`"bar_findings": ["derived-curves"]`, "a", "lug", hingeLug, both, ""},
		// An edge distance of 1.2 D breaks the common practice of 1.5 D.
		{`"violations": "allow"`, "a", "fastener-group", pair(2000, 0.3), both, ""},
		{`"violations": "hold"`, "a", "fastener-group", pair(2000, 0.3), both, "a:finding a:finding"},
		{`"violations": "hold"`, "a", "fastener-group", pair(2000, 1), both, ""},
		// The clock of the test moves on by seconds.
		{`"greatest_age_days": 1`, "a", "lug", hingeLug, both, ""},
		{`"greatest_age_days": 0.00001`, "a", "lug", hingeLug, both, "a:too-old"},
		{`"least_engine": "` + service.Engine + `"`, "a", "lug", hingeLug, both, ""},
		{`"least_engine": "99.0.0"`, "a", "lug", hingeLug, both, "a:engine"},
	} {
		t.Run(c.policy+" "+c.joint, func(t *testing.T) {
			s := openWith(t, storetest.SQLite(t), `{"policies": [{"name": "flight", `+c.policy+`}]}`, service.Unwatched{})
			put(t, s, recordOf(c.joint, "", c.kind, c.input), c.roles...)
			d := judge(t, s, ask("flight", c.joint))
			expect(t, "flight", d, c.want)
			if d.Policy != "flight" || !strings.HasPrefix(d.PolicyDigest, "sha256:") {
				t.Errorf("policy %q, digest %q", d.Policy, d.PolicyDigest)
			}
		})
	}
}

// A file of policies with an error stops the start, with line and field.
func TestPolicyFilesAreRefused(t *testing.T) {
	for text, want := range map[string]string{
		`{`:                "line 1",
		`{"policies": []}`: "line 1: /policies must have at least 1 element",
		"{\"policies\": [\n{\"name\": \"a\",\n\"greatest_age\": 3}]}":                                      "line 3: /policies/0/greatest_age there is no member",
		"{\"policies\": [\n{\"name\": \"a\",\n\"greatest_age_days\": -3}]}":                                "line 3: /policies/0/greatest_age_days must be more than 0",
		"{\"policies\": [\n{\"name\": \"a\"},\n{\"name\": \"a\"}]}":                                        "line 3: /policies/1/name the name \"a\" is taken",
		"{\"policies\": [\n{\"name\": \"default\"}]}":                                                      "line 2: /policies/0/name the name \"default\" is taken",
		"{\"policies\": [\n{\"name\": \"a\",\n\"sign_offs\": [\"seen\"]}]}":                                "line 3: /policies/0/sign_offs/0 must be one of checked, approved",
		"{\"policies\": [\n{\"name\": \"a\",\n\"violations\": \"maybe\"}]}":                                "line 3: /policies/0/violations must be one of hold, allow",
		"{\"policies\": [\n{\"name\": \"a\",\n\"least_margins\": [{\"joints\": \"*\",\n\"margin\":-1}]}]}": "line 4: /policies/0/least_margins/0/margin must be 0 or more",
		"{\"policies\": [\n{\"name\": \"a\",\n\"least_engine\": \"1\"}]}":                                  "line 3: /policies/0/least_engine must be a version",
		// A misspelt method would bar nothing.
		"{\"policies\": [\n{\"name\": \"a\",\n\"methods\": {\"bar\": [\"elementry\"]}}]}": "line 3: /policies/0/methods there is no method \"elementry\"",
		"{\"policies\": [\n{\"name\": \"a\",\n\"methods\": {\"allow\": []}}]}":            "line 3: /policies/0/methods/allow must have at least 1 element",
	} {
		_, err := service.NewPolicies([]byte(text))
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s\ngives %v, want %s", text, err, want)
		}
	}
}

func TestReleaseRequestsAreRefused(t *testing.T) {
	s := openWith(t, storetest.SQLite(t), "", service.Unwatched{})
	many := make([]string, 1001)
	for i := range many {
		many[i] = fmt.Sprint(i)
	}
	for name, c := range map[string]struct {
		body []byte
		code service.Code
		at   string
	}{
		"no joints":       {ask("default"), service.Invalid, "/joints"},
		"too many":        {ask("default", many...), service.Invalid, "/joints"},
		"a joint twice":   {ask("default", "a", "a"), service.Invalid, "/joints/1/joint"},
		"no such policy":  {ask("flight", "a"), service.Invalid, "/policy"},
		"an empty joint":  {ask("default", ""), service.Invalid, "/joints/0/joint"},
		"no joint member": {[]byte(`{"part":"p","revision":"r"}`), service.Malformed, "/joints"},
		"null":            {[]byte(`{"part":"p","revision":"r","joints":null}`), service.Malformed, "/joints"},
		"unknown member":  {[]byte(`{"part":"p","revision":"r","joints":[],"force":true}`), service.Malformed, "/force"},
	} {
		for _, dry := range []bool{false, true} {
			d, _, err := s.Judge(t.Context(), vault, c.body, dry, service.Idempotency{})
			if d != nil || code(t, err) != c.code || !strings.Contains(err.Error(), c.at+" ") {
				t.Errorf("%s: %v, %v", name, d, err)
			}
		}
	}
}

func TestADecisionIsKept(t *testing.T) {
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := openWith(t, store, "", service.Unwatched{})
		id := put(t, s, recordOf("a", "", "lug", hingeLug), both...)
		body := ask("default", "a")
		dry, _, err := s.Judge(t.Context(), vault, body, true, service.Idempotency{})
		if err != nil || dry.Decision != service.Release || dry.ID != nil || dry.Index != nil {
			t.Errorf("dry run: %+v, %v", dry, err)
		}
		if size := verifyAll(t, s); size != 3 {
			t.Errorf("after a dry run the log has %d entries, want 3", size)
		}
		key := service.Idempotency{Key: "k", Method: "POST", Path: "/v1/release-checks", Body: body}
		first, _, err := s.Judge(t.Context(), vault, body, false, key)
		if err != nil || first.ID == nil || *first.Index != 3 {
			t.Fatalf("%+v, %v", first, err)
		}
		// What it rests on is in its entry.
		entry, err := store.Entry(t.Context(), 3)
		if err != nil {
			t.Fatal(err)
		}
		envelope, err := ledger.Parse(entry.Bytes)
		if err != nil {
			t.Fatal(err)
		}
		found, err := s.RecordByID(t.Context(), id)
		if err != nil {
			t.Fatal(err)
		}
		var kept struct {
			Decision string
			Records  []struct {
				ID     string
				Digest string `json:"record_digest"`
				State  string
			}
			Policy struct {
				SignOffs []string `json:"sign_offs"`
			}
		}
		if err := json.Unmarshal(envelope.Body, &kept); err != nil {
			t.Fatal(err)
		}
		if envelope.Type != "release-decision" || envelope.Author != "vault" || kept.Decision != "release" || len(kept.Records) != 1 ||
			kept.Records[0].ID != id || kept.Records[0].Digest != found.RecordDigest || kept.Records[0].State != "approved" || !slices.Equal(kept.Policy.SignOffs, both) {
			t.Errorf("kept is %s", entry.Bytes)
		}
		// The same request again has the same answer, whatever is true now.
		if _, err := withdraw(t, s, ada, id); err != nil {
			t.Fatal(err)
		}
		second, again, err := s.Judge(t.Context(), vault, body, false, key)
		if err != nil || !again || *second.ID != *first.ID || second.Decision != service.Release || second.At != first.At {
			t.Errorf("again: %+v, %v, %v", second, again, err)
		}
		expect(t, "without the key", judge(t, s, body), "a:withdrawn")
		verifyAll(t, s)
	})
}

// altering changes what a store answers, as somebody with the database file
// would.
type altering struct {
	service.Store
	record func(*service.Entry)
	about  func(*service.Entry)
	hashes func([]ledger.Hash)
}

func (a *altering) Latest(ctx context.Context, part, revision string, yield func(service.Entry) error) error {
	return a.Store.Latest(ctx, part, revision, func(e service.Entry) error {
		if a.record != nil {
			a.record(&e)
		}
		return yield(e)
	})
}

func (a *altering) About(ctx context.Context, records []string) (map[string][]service.Entry, error) {
	found, err := a.Store.About(ctx, records)
	for _, entries := range found {
		for i := range entries {
			if a.about != nil {
				a.about(&entries[i])
			}
		}
	}
	return found, err
}

func (a *altering) Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	found, err := a.Store.Hashes(ctx, indexes)
	if a.hashes != nil {
		a.hashes(found)
	}
	return found, err
}

// alarms counts what must never happen.
type alarms struct {
	service.Unwatched
	altered int
}

func (a *alarms) Altered(error) { a.altered++ }

// No release rests on rows that are not those that were signed.
func TestAlteredRowsGiveNoDecision(t *testing.T) {
	store := &altering{Store: storetest.SQLite(t)}
	watch := &alarms{}
	s := openWith(t, store, "", watch)
	put(t, s, recordOf("a", "", "lug", weakLug), both...)
	expect(t, "unaltered", judge(t, s, ask("default", "a")), "a:not-adequate")
	margin := 0.5
	swap := func(e *service.Entry, was, is string) {
		changed := strings.Replace(string(e.Bytes), was, is, 1)
		if changed == string(e.Bytes) {
			t.Fatalf("%q is not in the entry", was)
		}
		e.Bytes = []byte(changed)
	}
	for name, record := range map[string]func(*service.Entry){
		"verdict":         func(e *service.Entry) { e.Verdict = "adequate" },
		"margin":          func(e *service.Entry) { e.Margin = &margin },
		"no margin":       func(e *service.Entry) { e.Margin = nil },
		"author":          func(e *service.Entry) { e.Author = "eve" },
		"time":            func(e *service.Entry) { e.At = "2026-03-01T08:00:00.000Z" },
		"geometry digest": func(e *service.Entry) { e.GeometryDigest = "g2" },
		"joint":           func(e *service.Entry) { e.Joint = "b" },
		"part":            func(e *service.Entry) { e.Part = "SM-1" },
		"kind":            func(e *service.Entry) { e.Kind = "splice" },
		"type":            func(e *service.Entry) { e.Type = "sign-off" },
		"leaf":            func(e *service.Entry) { e.Leaf[0] ^= 1 },
		"bytes":           func(e *service.Entry) { swap(e, `"verdict":"inadequate"`, `"verdict":"adequate"`) },
		"broken bytes":    func(e *service.Entry) { e.Bytes = e.Bytes[:100] },
		"everything, consistently": func(e *service.Entry) {
			swap(e, `"force":36000`, `"force":18000`)
			e.Leaf = ledger.Leaf(e.Bytes)
		},
	} {
		store.record = record
		watch.altered = 0
		d, _, err := s.Judge(t.Context(), vault, ask("default", "a"), false, service.Idempotency{})
		if d != nil || code(t, err) != service.Unavailable || watch.altered != 1 {
			t.Errorf("%s of a record: %v, %v, %d alarms", name, d, err, watch.altered)
		}
	}
	store.record = nil
	for name, about := range map[string]func(*service.Entry){
		"role":   func(e *service.Entry) { e.Role = "approved" },
		"target": func(e *service.Entry) { e.Target = "another" },
		"author": func(e *service.Entry) { e.Author = "eve" },
		"bytes":  func(e *service.Entry) { swap(e, "looked at it", "looked at IT") },
	} {
		store.about = about
		watch.altered = 0
		d, _, err := s.Judge(t.Context(), vault, ask("default", "a"), false, service.Idempotency{})
		if d != nil || code(t, err) != service.Unavailable || watch.altered != 1 {
			t.Errorf("%s of a signature: %v, %v, %d alarms", name, d, err, watch.altered)
		}
	}
	store.about = nil
	store.hashes = func(h []ledger.Hash) { h[0][0] ^= 1 }
	if d, _, err := s.Judge(t.Context(), vault, ask("default", "a"), false, service.Idempotency{}); d != nil || code(t, err) != service.Unavailable {
		t.Errorf("a hash of the tree: %v, %v", d, err)
	}
	store.hashes = nil
	expect(t, "unaltered again", judge(t, s, ask("default", "a")), "a:not-adequate")
}

// Whatever call fails, there is no release without the ledger.
func TestTheGateFailsSafe(t *testing.T) {
	store := storetest.NewFaulty(storetest.SQLite(t))
	s := openWith(t, store, "", service.Unwatched{})
	put(t, s, recordOf("a", "", "lug", hingeLug), both...)
	store.Plan(nil)
	expect(t, "without faults", judge(t, s, ask("default", "a")), "")
	for n := range len(store.Calls()) {
		for _, fault := range []storetest.Fault{storetest.NotStored, storetest.Stored} {
			store.Once(n, fault)
			d, _, err := s.Judge(t.Context(), vault, ask("default", "a"), false, service.Idempotency{})
			if d != nil || code(t, err) != service.Unavailable {
				t.Errorf("call %d failing: %v, %v", n, d, err)
			}
			store.Plan(nil)
		}
	}
}

// meanwhile does something after the gate has looked at the sign-offs.
type meanwhile struct {
	service.Store
	once sync.Once
	do   func()
}

func (m *meanwhile) Hashes(ctx context.Context, indexes []int64) ([]ledger.Hash, error) {
	m.once.Do(m.do)
	return m.Store.Hashes(ctx, indexes)
}

// A withdrawal that gets into the log before the decision counts for it.
func TestADecisionIsTrueAtItsPlaceInTheLog(t *testing.T) {
	inner := storetest.SQLite(t)
	signer := storetest.Signer(t)
	writer := open(t, inner, signer)
	id := put(t, writer, recordOf("a", "", "lug", hingeLug), both...)
	store := &meanwhile{Store: inner, do: func() {
		if _, err := withdraw(t, writer, ada, id); err != nil {
			t.Error(err)
		}
	}}
	expect(t, "withdrawn meanwhile", judge(t, open(t, store, signer), ask("default", "a")), "a:withdrawn")
	store = &meanwhile{Store: inner, do: func() { put(t, writer, recordOf("a", "", "lug", hingeLug)) }}
	expect(t, "recorded anew meanwhile", judge(t, open(t, store, signer), ask("default", "a")), "a:not-checked a:not-approved")
	store = &meanwhile{Store: inner, do: func() {
		put(t, writer, []byte(strings.Replace(string(recordOf("a", "", "lug", hingeLug)), "SM-1200", "SM-7", 1)))
	}}
	expect(t, "another part meanwhile", judge(t, open(t, store, signer), ask("default", "a")), "a:not-checked a:not-approved")
	if size := verifyAll(t, writer); size != 9 {
		t.Errorf("%d entries, want 9: no decision that did not stand", size)
	}
}

func TestTextOfADecision(t *testing.T) {
	id := "0192"
	d := service.Decision{Decision: service.Hold, Findings: []service.ReleaseFinding{
		{Joint: "a", Code: "not-checked", Message: "two\nlines\x1b[2J", Record: &id}, {Joint: "b", Code: "no-record", Message: "none"},
	}}
	if got, want := d.Text(), "hold\na: not-checked: two lines [2J [record 0192]\nb: no-record: none\n"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
}

// BenchmarkRelease judges a part of 500 joints, each record signed twice, among
// 100,000 records in Postgres.
func BenchmarkRelease(b *testing.B) {
	store, signer := storetest.Postgres(b), storetest.Signer(b)
	s := open(b, store, signer)
	joints := make([]string, 500)
	var work sync.WaitGroup
	for i := range joints {
		joints[i] = fmt.Sprintf("joint-%d", i)
		work.Go(func() { put(b, s, recordOf(joints[i], "", "lug", hingeLug), both...) })
	}
	work.Wait()
	fill(b, store, signer, 100_000-len(joints))
	body := ask("default", joints...)
	for b.Loop() {
		if d, _, err := s.Judge(b.Context(), vault, body, true, service.Idempotency{}); err != nil || d.Decision != service.Release {
			b.Fatal(d, err)
		}
	}
}

// fill appends copies of the first record under other parts and ids.
func fill(b *testing.B, store service.Store, signer service.Signer, n int) {
	b.Helper()
	ctx := b.Context()
	first, err := store.Entry(ctx, 0)
	if err != nil {
		b.Fatal(err)
	}
	for made := 0; made < n; {
		var copies []string
		for range min(256, n-made) {
			part := fmt.Sprintf("SM-%d", 10_000+made/500)
			id := fmt.Sprintf("00000000-0000-7000-8000-%012d", made)
			copies = append(copies, strings.NewReplacer(first.ID, id, "SM-1200", part, "joint-0", fmt.Sprintf("joint-%d", made%500)).Replace(string(first.Bytes)))
			made++
		}
		appendBytes(b, store, signer, copies...)
	}
}

// appendBytes appends entries by their bytes, as another program has made them.
func appendBytes(t testing.TB, store service.Store, signer service.Signer, entries ...string) {
	t.Helper()
	ctx := t.Context()
	head, err := store.Head(ctx)
	if err != nil {
		t.Fatal(err)
	}
	var made []service.Entry
	for _, text := range entries {
		e, err := service.EntryOf([]byte(text))
		if err != nil {
			t.Fatal(err)
		}
		made = append(made, e)
	}
	batch, err := storetest.BatchOn(ctx, store, signer, head, made)
	if err != nil {
		t.Fatal(err)
	}
	if err := store.Append(ctx, batch); err != nil {
		t.Fatal(err)
	}
}

// The built-in curve set is the same however it is named: its formulas and its
// warning do not depend on the words of the request.
func TestTheBuiltInCurveSetIsOneHoweverNamed(t *testing.T) {
	const lug = `{"units": "US", "methods": ["affdl-tr-69-42"]%s,
  "lug": {"shape": "round", "width": 2, "thickness": 0.5, "hole_diameter": 0.75, "edge_distance": 1.125, "material": "7050-T7451-plate-0.250-1.500-L"},
  "factors": {"ultimate": 1.5, "fitting": 1.15}, "load_cases": [{"id": "LC1", "level": "limit", "force": 9000, "angle": 37}]}`
	results := map[string]bool{}
	for _, named := range []string{``, `"derived-1"`, `"derived-1@1"`} {
		if named != "" {
			named = `, "method_options": {"affdl-tr-69-42": {"curve_set": ` + named + `}}`
		}
		r, err := service.Calculate(service.Lug, fmt.Appendf(nil, lug, named), service.View{})
		if err != nil {
			t.Fatal(err)
		}
		if !slices.ContainsFunc(r.Findings, func(f service.Finding) bool { return f.Code == "derived-curves" }) {
			t.Errorf("%s: nothing says that the curves are derived", named)
		}
		text, err := json.Marshal(r)
		if err != nil {
			t.Fatal(err)
		}
		results[string(text)] = true
	}
	if len(results) != 1 {
		t.Errorf("%d answers to one question", len(results))
	}
}
