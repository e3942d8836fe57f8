package api

import (
	"net/http"
	"testing"
)

// The headers of W3C Trace Context, sections 3.2.2 and 3.2.4, and of its test
// suite's kinds: lengths, digits, versions, zero ids.
func TestTraceOf(t *testing.T) {
	const id, span = "4bf92f3577b34da6a3ce929d0e0e4736", "00f067aa0ba902b7"
	whole := trace{id, span}
	for given, want := range map[string]trace{
		"00-" + id + "-" + span + "-01":                       whole,
		"00-" + id + "-" + span + "-00":                       whole,
		"cc-" + id + "-" + span + "-01":                       whole,
		"cc-" + id + "-" + span + "-01-what-the-future-holds": whole,
		"00-" + id + "-" + span + "-01-more":                  {},
		"cc-" + id + "-" + span + "-01.more":                  {},
		"ff-" + id + "-" + span + "-01":                       {},
		"0g-" + id + "-" + span + "-01":                       {},
		"00-" + id + "-" + span + "-0":                        {},
		"00-" + id + "-" + span + "-0x":                       {},
		"00-" + id + "_" + span + "-01":                       {},
		"00-4BF92F3577B34DA6A3CE929D0E0E4736-" + span + "-01": {},
		"00-00000000000000000000000000000000-" + span + "-01": {},
		"00-" + id + "-0000000000000000-01":                   {},
		"":                                                    {},
	} {
		if found := traceOf(http.Header{"Traceparent": {given}}); found != want {
			t.Errorf("%q: %+v, want %+v", given, found, want)
		}
	}
	if found := traceOf(http.Header{"Traceparent": {"00-" + id + "-" + span + "-01", "00-" + id + "-" + span + "-01"}}); found != (trace{}) {
		t.Errorf("two headers: %+v", found)
	}
}
