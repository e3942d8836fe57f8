package api_test

import (
	"net/http"
	"strings"
	"testing"

	"jointledger/store/storetest"
)

// FuzzRequests sends any bytes to any operation that takes a body. Whatever
// they are, the answer is one that openapi.yaml has, is never a defect of the
// server, and nothing is accepted that the document refuses.
func FuzzRequests(f *testing.F) {
	c := serve(f, storetest.SQLite(f))
	var record recordView
	c.do(f, post("/v1/records", example(f, "addRecord", "record"))).decode(f, http.StatusCreated, &record)
	w := world{record: record.ID, curves: "none@1"}
	var posts []operation
	for _, op := range theDocument(f).operations() {
		if op.media() != "" {
			posts = append(posts, op)
		}
	}
	for i, op := range posts {
		for _, body := range op.examples(f) {
			f.Add(uint8(i), body)
			f.Add(uint8(i), body[:len(body)/2])
			f.Add(uint8(i), []byte(strings.Replace(string(body), "1", "1e308", 1)))
			f.Add(uint8(i), []byte(strings.ReplaceAll(string(body), "0", "-0")))
			f.Add(uint8(i), []byte(strings.Replace(string(body), `{"`, `{"":{"\u0000":[[]]},"`, 1)))
		}
		for _, body := range []string{"", "null", "{}", "[]", `""`, "0", "\xff", `{"units":"SI"}`, `{"kind":"lug","input":{}}`, strings.Repeat("[", 1000)} {
			f.Add(uint8(i), []byte(body))
		}
	}
	f.Fuzz(func(t *testing.T, which uint8, body []byte) {
		op := posts[int(which)%len(posts)]
		if a := c.do(t, w.sample(t, op, body)); a.status >= 500 {
			t.Errorf("%s: %d: %s", op.OperationId, a.status, a.body)
		}
	})
}
