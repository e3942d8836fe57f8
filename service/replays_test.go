package service_test

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"jointledger/service"
	"jointledger/store/storetest"
)

// The example's lug, worked in the README: shear-out governs, 34,087.47 lbf at
// F_su 42,000 psi against 31,050, margin 0.0978. With F_su 35,000 psi it is
// 34,087.47 x 35/42 = 28,406.23 lbf, margin 28,406.23/31,050 - 1 = -0.08515.
// 35,000 psi is 241.3165 MPa (1 psi = 4.4482216152605/645.16 MPa).
func TestReplayWithAnotherMaterial(t *testing.T) {
	const name = "7050-T7451 plate, 0.250-1.500 in"
	psi := `"ftu": 74000, "fty": 64000, "fsu": 35000, "bearing": [{"e_over_d": 1.5, "fbru": 107000, "fbry": 86000}]`
	mpa := `"ftu": 510.212, "fty": 441.265, "fsu": 241.3165, "bearing": [{"e_over_d": 1.5, "fbru": 737.739, "fbry": 592.949}]`
	storetest.Each(t, func(t *testing.T, store service.Store) {
		s := open(t, store, storetest.Signer(t))
		record(t, s, ada, "hinge-upper", "")
		for _, c := range []struct {
			name, body string
			margin     float64
			changes    bool
		}{
			{"none", `{"filter": {"part": "SM-1200"}}`, 0.0978, false},
			{"in the record's units", `{"filter": {"material": "` + name + `"}, "substitute": {"material": "` + name + `", "units": "US", "with": {"name": "corrected", ` + psi + `}}}`, -0.0851, true},
			{"in other units", `{"filter": {}, "substitute": {"material": "` + name + `", "units": "SI", "with": {"name": "corrected", ` + mpa + `}}}`, -0.0851, true},
			{"of a material that is not there", `{"filter": {}, "substitute": {"material": "another", "units": "US", "with": {` + psi + `}}}`, 0.0978, false},
		} {
			stream, err := s.Replays(t.Context(), []byte(c.body))
			if err != nil {
				t.Fatalf("%s: %v", c.name, err)
			}
			var out bytes.Buffer
			if err := stream(t.Context(), &out); err != nil {
				t.Fatal(err)
			}
			lines := strings.Split(strings.TrimSpace(out.String()), "\n")
			if len(lines) != 2 {
				t.Fatalf("%s: %d lines: %s", c.name, len(lines), &out)
			}
			var first struct {
				Replay struct {
					Recorded    struct{ Reproduced bool }
					Current     struct{ Margin float64 }
					SignChanges bool `json:"sign_changes"`
				}
			}
			if err := json.Unmarshal([]byte(lines[0]), &first); err != nil {
				t.Fatal(err)
			}
			r := first.Replay
			if math.Abs(r.Current.Margin-c.margin) > 5e-5 || r.SignChanges != c.changes || !r.Recorded.Reproduced {
				t.Errorf("%s: %+v, want margin %v, sign changes %v", c.name, r, c.margin, c.changes)
			}
		}
	})
}
