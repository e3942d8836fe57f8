package pages

import (
	"net/url"
	"strings"
	"time"
)

// day and moment write a time of an entry for people, always in UTC.
func day(at string) string {
	t, err := time.Parse(time.RFC3339, at)
	if err != nil {
		return at
	}
	return t.UTC().Format("2 Jan 2006")
}

func moment(at string) string {
	t, err := time.Parse(time.RFC3339, at)
	if err != nil {
		return at
	}
	return t.UTC().Format("2 Jan 2006, 15:04:05 UTC")
}

func deref(s *string) string {
	if s == nil {
		return ""
	}
	return *s
}

func optional(s string) string {
	if s == "" {
		return "—"
	}
	return s
}

// shortDigest is the beginning of a digest, enough to compare by eye.
func shortDigest(digest string) string {
	_, hex, found := strings.Cut(digest, ":")
	if !found || len(hex) < 12 {
		return digest
	}
	return hex[:12]
}

// verdictSign stands beside each verdict, so that no colour has to be seen.
func verdictSign(verdict string) string {
	switch verdict {
	case "adequate":
		return "✓"
	case "inadequate":
		return "✗"
	}
	return "?"
}

func recordLink(id string) string { return "/records/" + url.PathEscape(id) }

// kindName names a kind of joint.
func kindName(kind string) string {
	switch kind {
	case "lug":
		return "Pinned lug"
	case "fastener-group":
		return "Fastener pattern"
	case "splice":
		return "Splice"
	}
	return kind
}

// jsonCell writes a JSON value for a table; a dash for null.
func jsonCell(raw []byte) string {
	if string(raw) == "null" {
		return "—"
	}
	return clip(string(raw), 300)
}
