package pages_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"golang.org/x/net/html"
)

var void = []string{"meta", "link", "input", "br", "hr", "img"}

// checkPage holds a page to what HTML5 and its readers ask: elements nested as
// they are written (the parser of HTML5 must not have to move or close any),
// each id once, every label, reference and name there, nothing that the
// content policy would refuse.
func checkPage(t *testing.T, name, page string) *html.Node {
	t.Helper()
	var written []string // the elements in the order and depth of the source
	var open []string
	z := html.NewTokenizer(strings.NewReader(page))
	for {
		kind := z.Next()
		if kind == html.ErrorToken {
			break
		}
		token := z.Token()
		switch kind {
		case html.StartTagToken, html.SelfClosingTagToken:
			written = append(written, fmt.Sprintf("%d %s", len(open), strings.ToLower(token.Data)))
			if !slices.Contains(void, token.Data) && kind == html.StartTagToken {
				open = append(open, token.Data)
			}
			seen := map[string]bool{}
			for _, a := range token.Attr {
				if seen[a.Key] {
					t.Errorf("%s: <%s> has %s twice", name, token.Data, a.Key)
				}
				seen[a.Key] = true
				if strings.HasPrefix(a.Key, "on") || a.Key == "style" {
					t.Errorf("%s: <%s> has the attribute %s", name, token.Data, a.Key)
				}
				if (a.Key == "href" || a.Key == "src" || a.Key == "action") && strings.Contains(strings.ToLower(a.Val), "javascript:") {
					t.Errorf("%s: <%s %s=%q>", name, token.Data, a.Key, a.Val)
				}
			}
		case html.EndTagToken:
			if len(open) == 0 || open[len(open)-1] != token.Data {
				t.Fatalf("%s: </%s> closes %v", name, token.Data, open)
			}
			open = open[:len(open)-1]
		}
	}
	if len(open) > 0 {
		t.Errorf("%s: %v stay open", name, open)
	}
	if !strings.HasPrefix(page, "<!doctype html>") {
		t.Errorf("%s: no doctype", name)
	}
	root, err := html.Parse(strings.NewReader(page))
	if err != nil {
		t.Fatal(err)
	}
	var parsed []string
	ids := map[string]int{}
	var refer, labelled []string
	headings := 0
	var walk func(n *html.Node, depth int, inLabel bool)
	walk = func(n *html.Node, depth int, inLabel bool) {
		if n.Type == html.ElementNode {
			parsed = append(parsed, fmt.Sprintf("%d %s", depth, strings.ToLower(n.Data)))
			depth++
			inLabel = inLabel || n.Data == "label"
			named := inLabel
			for _, a := range n.Attr {
				switch a.Key {
				case "id":
					ids[a.Val]++
				case "href":
					if anchor, ok := strings.CutPrefix(a.Val, "#"); ok {
						refer = append(refer, anchor)
					}
				case "aria-labelledby", "list":
					refer = append(refer, a.Val)
				case "aria-label":
					named = true
				case "type":
					named = named || a.Val == "hidden"
				}
			}
			switch n.Data {
			case "input", "select", "textarea":
				if !named {
					labelled = append(labelled, n.Data)
				}
			case "h1":
				headings++
			case "script":
				if n.FirstChild != nil {
					t.Errorf("%s: a script within the page", name)
				}
			case "style", "iframe", "object", "embed", "base":
				t.Errorf("%s: <%s>", name, n.Data)
			case "svg":
				if !hasAttribute(n, "role") || !hasAttribute(n, "aria-label") {
					t.Errorf("%s: a drawing without a text", name)
				}
			}
		}
		for c := n.FirstChild; c != nil; c = c.NextSibling {
			walk(c, depth, inLabel)
		}
	}
	walk(root, 0, false)
	for i := range min(len(written), len(parsed)) {
		if written[i] != parsed[i] {
			t.Errorf("%s: element %d is written as %q after %v and read as %q", name, i, written[i], written[max(0, i-4):i], parsed[i])
			break
		}
	}
	if len(written) != len(parsed) {
		t.Errorf("%s: %d elements are written and %d read", name, len(written), len(parsed))
	}
	for id, n := range ids {
		if n > 1 || id == "" {
			t.Errorf("%s: the id %q stands %d times", name, id, n)
		}
	}
	for _, id := range refer {
		if ids[id] == 0 {
			t.Errorf("%s: nothing has the id %q", name, id)
		}
	}
	if labelled != nil || headings != 1 {
		t.Errorf("%s: fields without a label: %v; %d headings of the first rank", name, labelled, headings)
	}
	return root
}

func hasAttribute(n *html.Node, key string) bool {
	return slices.ContainsFunc(n.Attr, func(a html.Attribute) bool { return a.Key == key && a.Val != "" })
}

// textOf is all text of a page, the labels of drawings too.
func textOf(n *html.Node) string {
	var b strings.Builder
	var walk func(*html.Node)
	walk = func(n *html.Node) {
		if n.Type == html.TextNode {
			b.WriteString(n.Data + "\n")
		}
		for c := n.FirstChild; c != nil; c = c.NextSibling {
			walk(c)
		}
	}
	walk(n)
	return b.String()
}
