package pages_test

import (
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"jointledger/api/pages"
)

// luminance is the relative luminance of a colour.
//
// Source: WCAG 2.2, definition of relative luminance.
func luminance(t *testing.T, colour string) float64 {
	t.Helper()
	colour = strings.TrimPrefix(colour, "#")
	if len(colour) == 3 {
		colour = string([]byte{colour[0], colour[0], colour[1], colour[1], colour[2], colour[2]})
	}
	sum := 0.0
	for i, weight := range []float64{0.2126, 0.7152, 0.0722} {
		n, err := strconv.ParseUint(colour[2*i:2*i+2], 16, 8)
		if err != nil {
			t.Fatal(err)
		}
		c := float64(n) / 255
		if c <= 0.04045 {
			c /= 12.92
		} else {
			c = math.Pow((c+0.055)/1.055, 2.4)
		}
		sum += weight * c
	}
	return sum
}

// Text has a contrast of 4.5, lines that carry meaning one of 3 (WCAG 2.2,
// 1.4.3 and 1.4.11), in each scheme.
func TestContrast(t *testing.T) {
	schemes := regexp.MustCompile(`(?s):root \{(.*?)\}`).FindAllStringSubmatch(pages.Style, -1)
	if len(schemes) != 3 {
		t.Fatalf("%d schemes, want light, dark and print", len(schemes))
	}
	variable := regexp.MustCompile(`--([a-z-]+): (#[0-9a-f]+);`)
	light := map[string]string{}
	for i, name := range []string{"light", "dark", "print"} {
		colours := map[string]string{}
		if i > 0 { // what a scheme leaves is that of light
			for k, v := range light {
				colours[k] = v
			}
		}
		for _, m := range variable.FindAllStringSubmatch(schemes[i][1], -1) {
			colours[m[1]] = m[2]
			if i == 0 {
				light[m[1]] = m[2]
			}
		}
		for _, pair := range []struct {
			ink, paper string
			least      float64
		}{
			{"ink", "paper", 7},
			{"ink", "tint", 7},
			{"quiet", "paper", 4.5},
			{"quiet", "tint", 4.5},
			{"accent", "paper", 4.5},
			{"accent", "tint", 4.5},
			{"on-accent", "accent", 4.5},
			{"paper", "ink", 4.5},
			{"edge", "paper", 3},
			{"ink", "metal", 4.5},
			{"ink", "metal-two", 4.5},
			{"accent", "metal", 3},
			{"accent", "metal-two", 3},
			{"quiet", "metal", 4.5},
		} {
			a, b := luminance(t, colours[pair.ink]), luminance(t, colours[pair.paper])
			if ratio := (math.Max(a, b) + 0.05) / (math.Min(a, b) + 0.05); ratio < pair.least {
				t.Errorf("%s: %s on %s has a contrast of %.2f, want %v", name, pair.ink, pair.paper, ratio, pair.least)
			}
		}
	}
	// No colour stands anywhere but in the schemes and the margins of paper.
	rest := regexp.MustCompile(`(?s)(:root|@page) \{.*?\}`).ReplaceAllString(pages.Style, "")
	if found := regexp.MustCompile(`#[0-9a-fA-F]{3,8}\b|rgb|hsl`).FindString(rest); found != "" {
		t.Errorf("a colour of its own: %s", found)
	}
	for _, outside := range []string{"url(", "@import", "http"} {
		if strings.Contains(pages.Style, outside) {
			t.Errorf("the stylesheet has %q", outside)
		}
	}
}
