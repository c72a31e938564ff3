package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"html"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
	"time"
)

// browser is headless Chromium that reaches nothing but a proxy, which serves the
// pages and writes down whatever else is asked for.
type browser struct {
	program string
	proxy   *httptest.Server
	pages   map[string][]byte // by path on the host page.test
	mu      sync.Mutex
	asked   []string // that is not a page
}

func newBrowser(t *testing.T, pages map[string][]byte) *browser {
	t.Helper()
	b := &browser{pages: pages}
	for _, name := range []string{"chromium", "chromium-browser", "google-chrome"} {
		if path, err := exec.LookPath(name); err == nil {
			b.program = path
			break
		}
	}
	if b.program == "" {
		if os.Getenv("CI") != "" {
			t.Fatal("no chromium; .ci/run installs it")
		}
		t.Skip("no chromium; apt-get install chromium")
	}
	b.proxy = httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		page, ok := b.pages[r.URL.Path]
		if !ok || r.Host != "page.test" {
			b.mu.Lock()
			b.asked = append(b.asked, r.Method+" "+r.Host+r.URL.Path+" from "+r.Referer())
			b.mu.Unlock()
			http.NotFound(w, r)
			return
		}
		w.Header().Set("Content-Type", "text/html; charset=utf-8")
		w.Write(page)
	}))
	t.Cleanup(b.proxy.Close)
	return b
}

// run opens a page and returns what chromium wrote to stdout and its log.
func (b *browser) run(t *testing.T, path string, args ...string) (stdout, log string) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 2*time.Minute)
	defer cancel()
	args = append([]string{"--headless=new", "--no-sandbox", "--disable-gpu", "--hide-scrollbars", "--no-first-run",
		"--disable-background-networking", "--disable-component-update", "--disable-sync", "--disable-extensions",
		"--disable-features=OptimizationHints,MediaRouter,DialMediaRouteProvider", "--disable-dev-shm-usage",
		"--proxy-server=" + strings.TrimPrefix(b.proxy.URL, "http://"), "--proxy-bypass-list=<-loopback>",
		"--user-data-dir=" + t.TempDir(), "--enable-logging=stderr", "--virtual-time-budget=10000"}, args...)
	cmd := exec.CommandContext(ctx, b.program, append(args, "http://page.test"+path)...)
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	if err := cmd.Run(); err != nil {
		t.Fatalf("%s %s: %v\n%s", b.program, path, err, errs.String())
	}
	return out.String(), errs.String()
}

// console are the messages that pages left in a log.
func console(log string) []string {
	return regexp.MustCompile(`(?m)^.*CONSOLE.*$`).FindAllString(log, -1)
}

// leaks are the requests that a page made; those of the browser itself carry no
// page's name.
func (b *browser) leaks() []string {
	b.mu.Lock()
	defer b.mu.Unlock()
	var out []string
	for _, r := range b.asked {
		if strings.Contains(r, "page.test") && !strings.HasPrefix(r, "GET page.test/favicon.ico") {
			out = append(out, r)
		}
	}
	return out
}

// frame is a page that shows others 360 pixels wide and measures them.
func frame(paths ...string) []byte {
	var b strings.Builder
	b.WriteString("<!DOCTYPE html><body style='margin:0'>")
	for _, p := range paths {
		fmt.Fprintf(&b, "<iframe src='%s' width=360 height=2400 style='border:0'></iframe>", p)
	}
	b.WriteString(`<script>onload=()=>{const out=[];for(const f of document.querySelectorAll("iframe")){
const d=f.contentDocument,r=[];
for(const e of d.querySelectorAll("body *")){const box=e.getBoundingClientRect();if(box.width&&!e.closest("svg *")&&box.right>360.5)r.push(e.tagName+" "+e.className)}
out.push({width:d.scrollingElement.scrollWidth,scripts:d.scripts.length,images:d.images.length,figures:d.querySelectorAll("svg").length,title:d.title,beyond:r})}
const p=document.createElement("pre");p.id="measured";p.textContent=JSON.stringify(out);document.body.append(p)}</script>`)
	return []byte(b.String())
}

// measured is what the script of frame says of one page.
type measured struct {
	Width, Scripts, Images, Figures int
	Title                           string
	Beyond                          []string // elements that reach out of the page
}

// The pages in a browser: quiet on the console, no request, no script, nothing to
// scroll sideways on a phone; in light and dark. The screenshots are kept in
// OMEN_SCREENSHOTS, or the folder omen-screenshots for temporary files.
func TestReportInBrowser(t *testing.T) {
	dir, said := hostileFolder()
	report, err := os.ReadFile(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatalf("%v; fit said:\n%s", err, said)
	}
	side := filepath.Join(t.TempDir(), "side")
	output(t, "compare", dir, dir, "-o", side)
	comparison, err := os.ReadFile(filepath.Join(side, "comparison.html"))
	if err != nil {
		t.Fatal(err)
	}
	b := newBrowser(t, map[string][]byte{"/report": report, "/comparison": comparison, "/frame": frame("/report", "/comparison"),
		"/phone": frame("/report"), "/loud": []byte(`<!DOCTYPE html><script>console.log("loud");new Image().src="http://elsewhere.test/x.png"</script>`)})

	dom, log := b.run(t, "/frame", "--dump-dom")
	if m := console(log); m != nil {
		t.Errorf("console: %q", m)
	}
	m := regexp.MustCompile(`(?s)<pre id="measured">(.*?)</pre>`).FindStringSubmatch(dom)
	if m == nil {
		t.Fatalf("the pages could not be measured:\n%.2000s\n%s", dom, log)
	}
	var pages []measured
	if err := json.Unmarshal([]byte(html.UnescapeString(m[1])), &pages); err != nil || len(pages) != 2 {
		t.Fatalf("measured %q: %v", m[1], err)
	}
	for i, p := range pages {
		if p.Width > 360 || len(p.Beyond) > 0 {
			t.Errorf("page %d is %d wide at 360 pixels; beyond the edge: %v", i, p.Width, p.Beyond)
		}
		if p.Scripts != 0 || p.Images != 0 || p.Figures == 0 {
			t.Errorf("page %d has %d scripts, %d images, %d figures", i, p.Scripts, p.Images, p.Figures)
		}
	}
	if pages[0].Title != hostile {
		t.Errorf("title %q, expected %q", pages[0].Title, hostile)
	}
	if leaks := b.leaks(); leaks != nil {
		t.Errorf("requests: %q", leaks)
	}
	b.screenshots(t)

	_, log = b.run(t, "/loud", "--dump-dom") // that silence means something
	if len(console(log)) == 0 || len(b.leaks()) == 0 {
		t.Errorf("a page that is loud was not heard: console %q, requests %q", console(log), b.leaks())
	}
}

// screenshots keeps the page in light and dark, wide and narrow, and looks at the
// colour of the paper.
func (b *browser) screenshots(t *testing.T) {
	keep := os.Getenv("OMEN_SCREENSHOTS")
	if keep == "" {
		keep = filepath.Join(os.TempDir(), "omen-screenshots")
	}
	if err := os.MkdirAll(keep, 0o755); err != nil {
		t.Fatal(err)
	}
	t.Logf("screenshots in %s", keep)
	for _, c := range []struct {
		name, path, size, scheme string
		dark                     bool
	}{
		{"light-wide", "/report", "1200,3000", "1", false},
		{"dark-wide", "/report", "1200,3000", "0", true},
		{"light-phone", "/phone", "500,2400", "1", false},
		{"dark-phone", "/phone", "500,2400", "0", true},
	} {
		file := filepath.Join(keep, "report-"+c.name+".png")
		b.run(t, c.path, "--screenshot="+file, "--window-size="+c.size, "--blink-settings=preferredColorScheme="+c.scheme)
		r, g, bl, _ := decode(t, file).At(4, 4).RGBA()
		if dark := r+g+bl < 3*0x8000; dark != c.dark {
			t.Errorf("%s: the paper is %02x%02x%02x", c.name, r>>8, g>>8, bl>>8)
		}
	}
}
