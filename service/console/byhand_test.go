package console

import (
	"net"
	"net/http"
	"net/http/httputil"
	"net/url"
	"os"
	"strings"
	"testing"
)

// TestByHand serves the page beside a service that runs already, for looking at
// it in a browser:
//
//	BEAMWARD_CONSOLE=http://127.0.0.1:8460 BEAMWARD_LISTEN=127.0.0.1:8465 go test -run TestByHand -timeout 0 ./service/console
//
// The files are read anew for each load. It ends when it is interrupted.
func TestByHand(t *testing.T) {
	service := os.Getenv("BEAMWARD_CONSOLE")
	if service == "" {
		t.Skip("for looking at the page in a browser: set BEAMWARD_CONSOLE to the address of a running service")
	}
	to, err := url.Parse(service)
	if err != nil {
		t.Fatal(err)
	}
	proxy := &httputil.ReverseProxy{FlushInterval: -1, Rewrite: func(r *httputil.ProxyRequest) { r.SetURL(to) }}
	listen, err := net.Listen("tcp", os.Getenv("BEAMWARD_LISTEN"))
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("http://%s", listen.Addr())
	err = http.Serve(listen, http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.URL.Path != "/" && !strings.HasPrefix(r.URL.Path, assetsPath) {
			proxy.ServeHTTP(w, r)
			return
		}
		s, err := build(os.DirFS("."))
		if err != nil {
			t.Error(err)
			return
		}
		s.ServeHTTP(w, r)
	}))
	t.Fatal(err)
}
