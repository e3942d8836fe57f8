package pages_test

import (
	"bytes"
	"errors"
	"fmt"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"os"
	"strings"
	"testing"
	"time"

	"jointledger/api"
	"jointledger/service"
	"jointledger/store/storetest"
)

var (
	ada = service.Caller{Name: "ada", Role: service.Analyst}
	ben = service.Caller{Name: "ben", Role: service.Checker}
)

// site is a server with the pages on it.
type site struct {
	service *service.Service
	handler http.Handler
	logged  *bytes.Buffer
}

func newSite(t testing.TB) *site {
	t.Helper()
	signer := storetest.Signer(t)
	policies, err := service.NewPolicies(nil)
	if err != nil {
		t.Fatal(err)
	}
	s, err := service.New(t.Context(), service.Setup{
		Store: storetest.SQLite(t), Clock: &storetest.Ticking{Step: time.Minute}, Signer: signer, Policies: policies, Watch: service.Unwatched{},
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	document, err := os.ReadFile("../../openapi.yaml")
	if err != nil {
		t.Fatal(err)
	}
	var logged bytes.Buffer
	log := slog.New(slog.NewJSONHandler(&logged, &slog.HandlerOptions{Level: slog.LevelError}))
	return &site{s, api.New(s, api.Options{Log: log, Metrics: api.NewMetrics(log), OpenAPI: document}), &logged}
}

// record puts an input on record.
func (s *site) record(t testing.TB, part, revision, joint string, kind service.Kind, input string) *service.RecordDocument {
	t.Helper()
	body := fmt.Appendf(nil, `{"subject":{"part":%s,"revision":%s,"joint":%s},"geometry_digest":"sha256:invented","kind":%q,"note":"","input":%s}`,
		quote(t, part), quote(t, revision), quote(t, joint), kind, input)
	r, _, err := s.service.Record(t.Context(), ada, body, service.Idempotency{})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// quote writes a text as JSON.
func quote(t testing.TB, text string) string {
	t.Helper()
	out, err := service.Spread(text)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// get asks for a page and fails unless it has the status.
func (s *site) get(t testing.TB, path string, status int) string {
	t.Helper()
	w := httptest.NewRecorder()
	s.handler.ServeHTTP(w, httptest.NewRequest(http.MethodGet, "http://localhost"+path, nil))
	if w.Code != status {
		t.Fatalf("GET %s: status %d, want %d\n%s%s", path, w.Code, status, s.logged, clip(w.Body.String()))
	}
	return w.Body.String()
}

func clip(s string) string { return s[:min(len(s), 2000)] }

// problemCode is the code of a problem.
func problemCode(err error) service.Code {
	var p *service.Problem
	if errors.As(err, &p) {
		return p.Code
	}
	return ""
}

// published reads the input of a published case; the first of several, or the
// one whose title begins with a word.
func published(t testing.TB, file, title string) string {
	t.Helper()
	text, err := os.ReadFile("../../testdata/published/" + file + ".json")
	if err != nil {
		t.Fatal(err)
	}
	input := inputOf(t, text, title)
	if input == "" {
		t.Fatalf("%s has no case %q", file, title)
	}
	return strings.TrimSpace(input)
}

// Lugs, patterns and splices of the Saltmarsh's tail boom, invented.
const hingeLug = `{
  "units": "SI", "title": "boom hinge, lower lug", "methods": ["affdl-tr-69-42"],
  "lug": {"shape": "round", "width": 70, "thickness": 12, "hole_diameter": 25, "edge_distance": 37, "material": "7050-T7451-plate-0.250-1.500-L"},
  "pin": {"diameter": 20, "material": "alloy-steel-125-ksi"},
  "bushing": {"material": {"name": "bushing steel", "fcy": 700, "e": 200000, "nu": 0.3, "source": "invented"}},
  "clevis": {"shape": "round", "width": 70, "thickness": 7, "hole_diameter": 25, "edge_distance": 36, "gap": 0.5, "material": "7050-T7451-plate-0.250-1.500-L",
             "bushing": {"material": {"name": "bushing steel", "fcy": 700, "e": 200000, "nu": 0.3, "source": "invented"}}},
  "factors": {"ultimate": 1.5, "fitting": 1.15},
  "load_cases": [{"id": "landing", "level": "limit", "force": 42000, "angle": 0}, {"id": "turn", "level": "limit", "force": 12000, "angle": 30}, {"id": "fold", "level": "limit", "force": 9000, "angle": 90}]}`

const bracketPattern = `{
  "units": "US", "title": "cap to bracket", "stiffness": "equal",
  "fasteners": [
    {"id": "1", "x": 0, "y": 0, "diameter": 0.25, "type": {"name": "SM bolt", "shear_strength": 4650, "tension_strength": 5200, "source": "invented"}},
    {"id": "2", "x": 2, "y": 0, "diameter": 0.25, "type": {"name": "SM bolt", "shear_strength": 4650, "tension_strength": 5200, "source": "invented"}},
    {"id": "3", "x": 0, "y": 1.5, "diameter": 0.25, "type": {"name": "SM bolt", "shear_strength": 4650, "tension_strength": 5200, "source": "invented"}},
    {"id": "4", "x": 2, "y": 1.5, "diameter": 0.25, "type": {"name": "SM bolt", "shear_strength": 4650, "tension_strength": 5200, "source": "invented"}},
    {"id": "5", "x": 2, "y": 2.1, "diameter": 0.3125, "type": {"name": "SM bolt", "shear_strength": 7200, "tension_strength": 8000, "source": "invented"}}],
  "plates": [{"id": "bracket", "thickness": 0.25, "outline": [[-0.5, -0.5], [2.3, -0.5], [2.3, 3], [-0.5, 3]]}],
  "rules": ["common-practice"], "interaction": "2-2", "factors": {"ultimate": 1.5, "fitting": 1.15},
  "load_cases": [{"id": "LC1", "level": "ultimate", "point": [4, 1, 0.5], "force": [0, -1600, 300], "moment": [0, 0, 0]}]}`

// largePattern has so many fasteners, ten to a row, and load cases.
func largePattern(fasteners, cases int) string {
	var f, l []string
	for i := range fasteners {
		f = append(f, fmt.Sprintf(`{"id":"F%d","x":%d,"y":%d,"diameter":6,"type":{"name":"SM bolt","shear_strength":16000,"tension_strength":14000,"source":"invented"}}`, i+1, i%10*30, i/10*30))
	}
	for i := range cases {
		l = append(l, fmt.Sprintf(`{"id":"LC%d","level":"ultimate","point":[400,100,5],"force":[%d,%d,20000],"moment":[0,0,0]}`, i+1, 60000-i*97, -90000+i*61))
	}
	return `{"units":"SI","title":"skin to frame","stiffness":"equal","fasteners":[` + strings.Join(f, ",") + `],"plates":[{"id":"skin","thickness":4,"material":"7050-T7451-plate-0.250-1.500-L","outline":[[-15,-15],[285,-15],[285,285],[-15,285]]}],` +
		`"rules":["common-practice"],"interaction":"2-2","factors":{"ultimate":1.5,"fitting":1.15},"load_cases":[` + strings.Join(l, ",") + `]}`
}
