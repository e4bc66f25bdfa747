package console

import (
	"bytes"
	"compress/gzip"
	"io/fs"
	"net/http"
	"net/http/httptest"
	"path"
	"regexp"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"beamward/closures"
)

func ask(t *testing.T, h http.Handler, method, path string, header ...string) *http.Response {
	t.Helper()
	r := httptest.NewRequest(method, path, nil)
	for i := 0; i+1 < len(header); i += 2 {
		r.Header.Set(header[i], header[i+1])
	}
	w := httptest.NewRecorder()
	h.ServeHTTP(w, r)
	return w.Result()
}

func text(t *testing.T, res *http.Response) string {
	t.Helper()
	var b bytes.Buffer
	if _, err := b.ReadFrom(res.Body); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// files returns the page's files by name.
func files(t *testing.T) map[string]string {
	t.Helper()
	out := map[string]string{}
	names, err := fs.Glob(page, "page/*")
	if err != nil || len(names) < 10 {
		t.Fatalf("%d files, %v", len(names), err)
	}
	for _, name := range names {
		b, err := fs.ReadFile(page, name)
		if err != nil {
			t.Fatal(err)
		}
		out[path.Base(name)] = string(b)
	}
	return out
}

func TestThePageAndWhatItNamesAreServed(t *testing.T) {
	h := Handler()
	res := ask(t, h, "GET", "/")
	body := text(t, res)
	if res.StatusCode != 200 || res.Header.Get("Content-Type") != "text/html; charset=utf-8" || res.Header.Get("Cache-Control") != "no-store" {
		t.Fatalf("the page: %d %v", res.StatusCode, res.Header)
	}
	named := regexp.MustCompile(`(?:src|href)="(/[^"]+)"`).FindAllStringSubmatch(body, -1)
	if len(named) < 4 {
		t.Fatalf("the page names %d files", len(named))
	}
	var digest string
	for _, n := range named {
		res := ask(t, h, "GET", n[1])
		etag := res.Header.Get("Etag")
		if res.StatusCode != 200 || etag == "" || !strings.Contains(res.Header.Get("Cache-Control"), "immutable") {
			t.Errorf("%s: %d %v", n[1], res.StatusCode, res.Header)
		}
		if again := ask(t, h, "GET", n[1], "If-None-Match", etag); again.StatusCode != http.StatusNotModified || text(t, again) != "" {
			t.Errorf("%s with its tag: %d", n[1], again.StatusCode)
		}
		digest = strings.Split(n[1], "/")[2]
	}
	if got := text(t, ask(t, h, "GET", "/console/build")); got != digest || !strings.Contains(body, `data-build="`+got+`"`) {
		t.Errorf("the build is %q, the page's %q", got, digest)
	}
	// Every module that a module imports is there, under the same build.
	for name, body := range files(t) {
		for _, m := range regexp.MustCompile(`from "([^"]+)"`).FindAllStringSubmatch(body, -1) {
			if !strings.HasPrefix(m[1], "./") {
				t.Errorf("%s imports %s, which is no file of the page", name, m[1])
				continue
			}
			res := ask(t, h, "GET", "/console/"+digest+"/"+m[1][2:])
			if res.StatusCode != 200 || res.Header.Get("Content-Type") != "text/javascript; charset=utf-8" {
				t.Errorf("%s imports %s: %d %s", name, m[1], res.StatusCode, res.Header.Get("Content-Type"))
			}
		}
	}
}

func TestEveryAnswerCarriesThePolicy(t *testing.T) {
	h := Handler()
	for _, c := range []struct {
		method, path string
		status       int
	}{
		{"GET", "/", 200}, {"HEAD", "/", 200}, {"GET", "/console/build", 200}, {"POST", "/", 405}, {"GET", "/console/", 404},
		{"GET", "/console/0000000000000000/main.js", 404}, {"GET", "/console/../console.go", 404}, {"GET", "/index.html", 404}, {"GET", "/v1/beams", 404},
	} {
		res := ask(t, h, c.method, c.path)
		if res.StatusCode != c.status {
			t.Errorf("%s %s: %d, want %d", c.method, c.path, res.StatusCode, c.status)
		}
		csp := res.Header.Get("Content-Security-Policy")
		for _, part := range []string{"default-src 'none'", "script-src 'self'", "style-src 'self'", "connect-src 'self'", "img-src 'self'", "frame-ancestors 'none'", "base-uri 'none'", "form-action 'none'"} {
			if !slices.Contains(strings.Split(csp, "; "), part) {
				t.Errorf("%s %s: the policy lacks %s", c.method, c.path, part)
			}
		}
		if strings.Contains(csp, "unsafe") || strings.Contains(csp, "http") || strings.Contains(csp, "data:") {
			t.Errorf("%s %s: the policy is loose: %s", c.method, c.path, csp)
		}
		if res.Header.Get("X-Content-Type-Options") != "nosniff" {
			t.Errorf("%s %s: a browser may guess the type", c.method, c.path)
		}
		if c.status != 200 && res.Header.Get("Cache-Control") != "no-store" {
			t.Errorf("%s %s: a refusal may be kept", c.method, c.path)
		}
	}
}

// Nothing is loaded from elsewhere and nothing is inline. The name of a
// namespace is no address that is loaded.
func TestTheFilesStandAlone(t *testing.T) {
	for name, body := range files(t) {
		for _, url := range regexp.MustCompile(`(?i)(https?:|wss?:)?//[a-z0-9.-]+\.[a-z]{2,}[^\s"']*`).FindAllString(body, -1) {
			if url != "http://www.w3.org/2000/svg" {
				t.Errorf("%s names %s", name, url)
			}
		}
		for what, bad := range map[string]string{
			"markup from text": `innerHTML|outerHTML|insertAdjacentHTML|document\.write|DOMParser|createContextualFragment|setHTML|srcdoc`,
			"code from text":   `\beval\(|new Function|setTimeout\(\s*["'` + "`" + `]|setInterval\(\s*["'` + "`" + `]|import\(`,
			"an inline style":  `\sstyle=|setAttribute\("style"|<style`,
			"an import of CSS": `@import|url\(`,
		} {
			if m := regexp.MustCompile(bad).FindString(body); m != "" {
				t.Errorf("%s has %s: %s", name, what, m)
			}
		}
	}
	html := files(t)[indexName]
	for _, tag := range regexp.MustCompile(`(?s)<script\b[^>]*>(.*?)</script>`).FindAllStringSubmatch(html, -1) {
		if tag[1] != "" || !strings.Contains(tag[0], "src=") {
			t.Errorf("an inline script: %s", tag[0])
		}
	}
	if m := regexp.MustCompile(`(?i)\son[a-z]+=`).FindString(html); m != "" {
		t.Errorf("an inline handler: %s", m)
	}
}

// Every string becomes text in one file, which knows no way to markup; the
// others make elements through it alone.
func TestTextIsOnlyEverText(t *testing.T) {
	for name, body := range files(t) {
		if name == "dom.js" || path.Ext(name) != ".js" {
			continue
		}
		if m := regexp.MustCompile(`createElement|setAttributeNS|\.href\s*=|\.src\s*=`).FindString(body); m != "" {
			t.Errorf("%s makes elements past dom.js: %s", name, m)
		}
		for _, m := range regexp.MustCompile(`h\("(a|iframe|object|embed|script|link|style|base|img|meta)"`).FindAllString(body, -1) {
			t.Errorf("%s makes an element that loads or leads away: %s", name, m)
		}
	}
}

// Each reason of the service has its plain words.
func TestEveryReasonHasPlainWords(t *testing.T) {
	words := files(t)["words.js"]
	for _, code := range closures.AllCodes.Names() {
		if !strings.Contains(words, `"`+code+`": "`) {
			t.Errorf("%s has no words", code)
		}
	}
}

// The page that is served before any script ran claims nothing, and the curtain
// of the style sheet falls within the two seconds that the script goes by.
func TestThePageBeginsNotKnowing(t *testing.T) {
	all := files(t)
	if html := all[indexName]; !strings.Contains(html, `<body class="lost">`) || !strings.Contains(html, "<title>Beamward: not known</title>") {
		t.Error("the page claims something before it has heard anything")
	}
	if !strings.Contains(all["known.js"], "export const limit = 1800;") {
		t.Error("the script's limit leaves no time to draw within 2 s")
	}
	for _, rule := range []string{".even .veil { animation: fall-even 1.8s step-end forwards; }", ".odd .veil { animation: fall-odd 1.8s step-end forwards; }", ".lost .veil { animation: none; opacity: 1; }"} {
		if !strings.Contains(all["console.css"], rule) {
			t.Errorf("the style sheet lacks %s", rule)
		}
	}
}

func TestTheAssetsAreSmall(t *testing.T) {
	const most = 200 << 10 // bytes, compressed
	total := 0
	for _, body := range files(t) {
		var b bytes.Buffer
		z := gzip.NewWriter(&b)
		if _, err := z.Write([]byte(body)); err != nil {
			t.Fatal(err)
		}
		if err := z.Close(); err != nil {
			t.Fatal(err)
		}
		total += b.Len()
	}
	t.Logf("%d bytes compressed, of %d", total, most)
	if total > most {
		t.Errorf("%d bytes compressed, over %d", total, most)
	}
}

// Another file, another build: a page never mixes two.
func TestTheBuildIsOfEveryFile(t *testing.T) {
	one := fstest.MapFS{"page/index.html": {Data: []byte("BUILD")}, "page/a.js": {Data: []byte("1")}}
	two := fstest.MapFS{"page/index.html": {Data: []byte("BUILD")}, "page/a.js": {Data: []byte("2")}}
	a, err := build(one)
	if err != nil {
		t.Fatal(err)
	}
	b, err := build(two)
	if err != nil {
		t.Fatal(err)
	}
	if was, is := text(t, ask(t, a, "GET", "/")), text(t, ask(t, b, "GET", "/")); was == is || len(is) != 16 {
		t.Errorf("builds %s and %s", was, is)
	}
}
