package pages

import (
	"net/http"
	"net/url"
	"strings"

	"jointledger/service"
)

type homeContent struct {
	Query   map[string]string
	Asked   bool // something is searched for
	List    *service.RecordList
	Next    string // address of the next page
	First   string // address of the first page, on a later one
	Size    string
	Origin  string
	Root    string
	Note    string // the whole checkpoint
	Key     string
	Parts   []string // of the records shown
	Methods []string
}

// searched are the fields of the search form, in the words of the API.
var searched = []string{"part", "revision", "joint", "author", "verdict", "state", "kind", "method", "since", "until", "latest", "cursor"}

// dayOf turns a date of a form into the time that the API takes.
func dayOf(date string) string {
	if len(date) == len("2006-01-02") {
		return date + "T00:00:00Z"
	}
	return date
}

func (p *Pages) home(v *visit) error {
	query := v.r.URL.Query()
	c := homeContent{Query: map[string]string{}}
	for _, name := range searched {
		c.Query[name] = strings.TrimSpace(query.Get(name))
		c.Asked = c.Asked || c.Query[name] != "" && name != "cursor"
	}
	q := c.Query
	var err error
	c.List, err = p.service.Records(v.r.Context(), service.RecordQuery{
		Part: q["part"], Revision: q["revision"], Joint: q["joint"], Author: q["author"], Verdict: q["verdict"], State: q["state"],
		Kind: q["kind"], Method: q["method"], Since: dayOf(q["since"]), Until: dayOf(q["until"]), Latest: q["latest"], Cursor: q["cursor"], Limit: "25",
	})
	if err != nil {
		return err
	}
	if c.List.NextCursor != nil {
		c.Next = "/?" + searchWith(q, *c.List.NextCursor)
	}
	if q["cursor"] != "" {
		c.First = "/?" + searchWith(q, "")
	}
	if c.Note, err = p.service.Checkpoint(v.r.Context()); err != nil {
		return err
	}
	// The first three lines of a checkpoint are origin, size and root.
	if lines := strings.SplitN(c.Note, "\n", 4); len(lines) == 4 {
		c.Origin, c.Size, c.Root = lines[0], thousands(lines[1]), lines[2]
	}
	c.Key = p.service.VerifierKey()
	seen := map[string]bool{}
	for _, r := range c.List.Items {
		if !seen[r.Subject.Part] {
			seen[r.Subject.Part] = true
			c.Parts = append(c.Parts, r.Subject.Part)
		}
	}
	methods, err := service.Methods("")
	if err != nil {
		return err
	}
	for _, m := range methods.Items {
		c.Methods = append(c.Methods, m.Method)
	}
	p.show(v, http.StatusOK, "home", "Records", c)
	return nil
}

func searchWith(q map[string]string, cursor string) string {
	values := url.Values{}
	for name, value := range q {
		if value != "" && name != "cursor" {
			values.Set(name, value)
		}
	}
	if cursor != "" {
		values.Set("cursor", cursor)
	}
	return values.Encode()
}
