package api

import (
	"log/slog"
	"net/http"
	"strings"
)

// A trace is where a request stands in its caller's trace, as the header
// traceparent of W3C Trace Context (Recommendation of 2021-11-23, section 3.2)
// says it. This server makes no spans of its own: it writes the caller's into
// its logs, so that both can be found by one id.
type trace struct {
	id   string // 32 hexadecimal digits, empty for none
	span string // 16, of the caller's span
}

// traceOf reads the header; one that breaks the form is as none.
func traceOf(header http.Header) trace {
	given := header.Values("traceparent")
	if len(given) != 1 {
		return trace{}
	}
	const length = len("00-0af7651916cd43dd8448eb211c80319c-b7ad6b7169203331-01")
	text := given[0]
	if len(text) < length || text[2] != '-' || text[35] != '-' || text[52] != '-' {
		return trace{}
	}
	version, t, flags := text[:2], trace{text[3:35], text[36:52]}, text[53:55]
	// Version 0 has exactly these four parts; later ones may go on after a dash.
	if len(text) > length && (version == "00" || text[length] != '-') || version == "ff" {
		return trace{}
	}
	if !isHex(version) || !isHex(t.id) || !isHex(t.span) || !isHex(flags) || isZero(t.id) || isZero(t.span) {
		return trace{}
	}
	return t
}

func isHex(s string) bool { return strings.Trim(s, "0123456789abcdef") == "" }

func isZero(s string) bool { return strings.Trim(s, "0") == "" }

// attributes are what a line of the log says of the request that it is about.
func (t trace) attributes(request string) []slog.Attr {
	attributes := make([]slog.Attr, 0, 8)
	attributes = append(attributes, slog.String("request", request))
	if t.id != "" {
		attributes = append(attributes, slog.String("trace", t.id), slog.String("span", t.span))
	}
	return attributes
}
