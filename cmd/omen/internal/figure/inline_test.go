package figure

import (
	"bytes"
	"encoding/xml"
	"errors"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// Names from data files and alternative texts are characters, never markup, in files and in pages.
func TestSVGIsSafe(t *testing.T) {
	in := hubbleFew()
	in.Magnitude = Plain(hostile)
	f, err := DrawHubble(in, Column)
	if err != nil {
		t.Fatal(err)
	}
	f.Title = hostile + "\x00\x1b"
	var file, page bytes.Buffer
	if err := f.Write(&file, "svg"); err != nil {
		t.Fatal(err)
	}
	if err := f.WriteInlineSVG(&page, "fig-1", hostile+"\x07"); err != nil {
		t.Fatal(err)
	}
	for name, b := range map[string]*bytes.Buffer{"file": &file, "page": &page} {
		if bytes.Contains(b.Bytes(), []byte("<script")) {
			t.Errorf("%s: a script element from a name", name)
		}
		tags, text := parse(t, b.Bytes())
		if strings.Count(text, hostile) == 0 {
			t.Errorf("%s: the name is gone", name)
		}
		for _, tag := range []string{"image", "use", "a", "foreignObject"} {
			if tags[tag] > 0 {
				t.Errorf("%s: element %s", name, tag)
			}
		}
		if m := regexp.MustCompile(`(?i)href|url\(|@import|javascript:|http:`).FindAll(b.Bytes(), -1); len(m) > 1 { // the name space
			t.Errorf("%s: reaches out: %q", name, m)
		}
	}
}

// parse reads XML to the end and returns its elements and its text.
func parse(t *testing.T, b []byte) (map[string]int, string) {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(b))
	tags, text := map[string]int{}, ""
	for {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			return tags, text
		}
		if err != nil {
			t.Fatalf("not well-formed: %v", err)
		}
		switch e := tok.(type) {
		case xml.StartElement:
			tags[e.Name.Local]++
		case xml.CharData:
			text += string(e)
		}
	}
}

// Everything that is global on a page starts with the prefix: ids, and the selectors of the styles.
func TestInlineSVGKeepsToItself(t *testing.T) {
	for _, d := range drawings {
		f, err := d.draw()
		if err != nil {
			t.Fatal(err)
		}
		var b bytes.Buffer
		if err := f.WriteInlineSVG(&b, "part7", "what it shows"); err != nil {
			t.Fatal(err)
		}
		if *look != "" {
			if err := os.WriteFile(filepath.Join(*look, d.name+".inline.svg"), b.Bytes(), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		for _, m := range regexp.MustCompile(`\bid="([^"]*)"`).FindAllStringSubmatch(b.String(), -1) {
			if !strings.HasPrefix(m[1], "part7") {
				t.Errorf("%s: id %s", d.name, m[1])
			}
		}
		_, style, _ := strings.Cut(b.String(), "<style>")
		style, _, _ = strings.Cut(style, "</style>")
		for _, m := range regexp.MustCompile(`([^{}]*)\{`).FindAllStringSubmatch(style, -1) {
			if s := strings.TrimSpace(m[1]); !strings.HasPrefix(s, "#part7 ") && !strings.HasPrefix(s, "@media") {
				t.Errorf("%s: selector %q", d.name, s)
			}
		}
		if !strings.Contains(b.String(), `<desc id="part7-desc">what it shows</desc>`) || !strings.Contains(b.String(), "currentColor") {
			t.Errorf("%s: no alternative text or no colour of the page", d.name)
		}
	}
	f, _ := drawings[0].draw()
	for _, bad := range []string{"", "7a", `x"`, "a b", "<"} {
		if f.WriteInlineSVG(io.Discard, bad, "") == nil {
			t.Errorf("prefix %q is accepted", bad)
		}
	}
}
