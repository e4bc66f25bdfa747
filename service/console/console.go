package console

import (
	"bytes"
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"io/fs"
	"mime"
	"net/http"
	"path"
	"strings"
)

//go:embed page
var page embed.FS

// policy lets the page use its own files and its own server, and nothing else.
// No script may be made from text.
const policy = "default-src 'none'; script-src 'self'; style-src 'self'; connect-src 'self'; img-src 'self'; " +
	"base-uri 'none'; form-action 'none'; frame-ancestors 'none'; require-trusted-types-for 'script'; trusted-types 'none'"

const (
	indexName  = "index.html"
	buildMark  = "BUILD" // in the page: stands for what the assets are
	assetsPath = "/console/"
	buildPath  = "/console/build"
)

// types are the media types of the assets, so that no table of the machine's
// decides what a browser runs.
var types = map[string]string{".js": "text/javascript; charset=utf-8", ".css": "text/css; charset=utf-8", ".svg": "image/svg+xml"}

// asset is one file as it is served.
type asset struct {
	body    []byte
	kind    string
	etag    string
	forever bool // its path names its content
}

// site is the page and its files by path. It is never changed.
type site struct{ files map[string]asset }

// Handler serves the page at / and its files below /console/. It asks nobody
// who they are: the page holds no secret, and what it shows comes from routes
// that ask. The files' paths hold a digest of all of them, so that a page never
// mixes two versions; /console/build gives the digest of those served now, by
// which a page knows that it is an old one.
func Handler() http.Handler {
	s, err := build(page)
	if err != nil {
		// The files are part of the program: it is the program that is broken.
		panic("reading the console's own files: " + err.Error())
	}
	return s
}

// build reads the files of a page.
func build(from fs.FS) (*site, error) {
	names, err := fs.Glob(from, "page/*")
	if err != nil {
		return nil, err
	}
	all := sha256.New()
	bodies := make(map[string][]byte, len(names))
	for _, name := range names {
		body, err := fs.ReadFile(from, name)
		if err != nil {
			return nil, err
		}
		sum := sha256.Sum256(body)
		all.Write([]byte(name))
		all.Write(sum[:])
		bodies[path.Base(name)] = body
	}
	digest := hex.EncodeToString(all.Sum(nil)[:8])
	s := &site{files: map[string]asset{buildPath: {body: []byte(digest), kind: "text/plain; charset=utf-8"}}}
	for name, body := range bodies {
		if name == indexName {
			s.files["/"] = asset{body: bytes.ReplaceAll(body, []byte(buildMark), []byte(digest)), kind: "text/html; charset=utf-8"}
			continue
		}
		kind := types[path.Ext(name)]
		if kind == "" {
			kind = mime.TypeByExtension(path.Ext(name))
		}
		sum := sha256.Sum256(body)
		s.files[assetsPath+digest+"/"+name] = asset{body: body, kind: kind, etag: `"` + hex.EncodeToString(sum[:16]) + `"`, forever: true}
	}
	return s, nil
}

// ServeHTTP serves one file.
func (s *site) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	h := w.Header()
	h.Set("Content-Security-Policy", policy)
	h.Set("X-Content-Type-Options", "nosniff")
	h.Set("X-Frame-Options", "DENY")
	h.Set("Referrer-Policy", "no-referrer")
	h.Set("Cross-Origin-Resource-Policy", "same-origin")
	h.Set("Cross-Origin-Opener-Policy", "same-origin")
	h.Set("Permissions-Policy", "camera=(), geolocation=(), microphone=()")
	h.Set("Cache-Control", "no-store")
	if r.Method != http.MethodGet && r.Method != http.MethodHead {
		h.Set("Allow", "GET, HEAD")
		http.Error(w, "use GET", http.StatusMethodNotAllowed)
		return
	}
	one, ok := s.files[r.URL.Path]
	if !ok {
		http.Error(w, "there is no such file: load the page again", http.StatusNotFound)
		return
	}
	h.Set("Content-Type", one.kind)
	if one.forever {
		h.Set("Cache-Control", "private, max-age=31536000, immutable")
		h.Set("Etag", one.etag)
		if known(r.Header.Values("If-None-Match"), one.etag) {
			w.WriteHeader(http.StatusNotModified)
			return
		}
	}
	_, _ = w.Write(one.body) // the client may be gone; there is nobody to tell
}

// known reports whether a client has the file already (RFC 9110, 13.1.2).
func known(given []string, etag string) bool {
	for _, one := range strings.Split(strings.Join(given, ","), ",") {
		if one = strings.TrimPrefix(strings.TrimSpace(one), "W/"); one == "*" || one == etag {
			return true
		}
	}
	return false
}
