package access

import (
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/tls"
	"crypto/x509"
	"crypto/x509/pkix"
	"encoding/pem"
	"io"
	"log"
	"math/big"
	"net"
	"net/http"
	"net/http/httptest"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

// authority signs certificates for one test.
type authority struct {
	t    *testing.T
	cert *x509.Certificate
	key  *ecdsa.PrivateKey
}

func newAuthority(t *testing.T) *authority {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	c := &x509.Certificate{SerialNumber: big.NewInt(1), Subject: pkix.Name{CommonName: "skerry test authority"}, IsCA: true,
		BasicConstraintsValid: true, KeyUsage: x509.KeyUsageCertSign, NotBefore: time.Now().Add(-time.Hour), NotAfter: time.Now().Add(time.Hour)}
	der, err := x509.CreateCertificate(rand.Reader, c, c, &key.PublicKey, key)
	if err != nil {
		t.Fatal(err)
	}
	if c, err = x509.ParseCertificate(der); err != nil {
		t.Fatal(err)
	}
	return &authority{t, c, key}
}

func (a *authority) sign(edit func(*x509.Certificate)) tls.Certificate {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		a.t.Fatal(err)
	}
	c := &x509.Certificate{SerialNumber: big.NewInt(time.Now().UnixNano()), NotBefore: time.Now().Add(-time.Hour), NotAfter: time.Now().Add(time.Hour),
		ExtKeyUsage: []x509.ExtKeyUsage{x509.ExtKeyUsageClientAuth, x509.ExtKeyUsageServerAuth}}
	edit(c)
	der, err := x509.CreateCertificate(rand.Reader, c, a.cert, &key.PublicKey, a.key)
	if err != nil {
		a.t.Fatal(err)
	}
	return tls.Certificate{Certificate: [][]byte{der}, PrivateKey: key}
}

func (a *authority) write(dir string, c tls.Certificate) (cert, key, ca string) {
	put := func(name, kind string, der []byte, mode os.FileMode) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, pem.EncodeToMemory(&pem.Block{Type: kind, Bytes: der}), mode); err != nil {
			a.t.Fatal(err)
		}
		return path
	}
	der, err := x509.MarshalPKCS8PrivateKey(c.PrivateKey)
	if err != nil {
		a.t.Fatal(err)
	}
	return put("cert.pem", "CERTIFICATE", c.Certificate[0], 0o644), put("key.pem", "PRIVATE KEY", der, 0o600), put("ca.pem", "CERTIFICATE", a.cert.Raw, 0o644)
}

func TestCertificatesStandForWhomTheConfigurationSays(t *testing.T) {
	a := newAuthority(t)
	stranger := newAuthority(t)
	cert, key, ca := a.write(t.TempDir(), a.sign(func(c *x509.Certificate) { c.IPAddresses = []net.IP{net.IPv4(127, 0, 0, 1)} }))
	conf, err := ServerTLS(cert, key, ca)
	if err != nil {
		t.Fatal(err)
	}
	f := newFile(t)
	ada := add(t, f, "ada", Operate)
	g := guard(t, Options{TokensFile: string(f), Certificates: []Certificate{
		{Name: "laser-control", Role: Read, CommonName: "laser-control"},
		{Name: "bus", Role: Feed, Sources: []closures.Source{"catwalk"}, DNS: "bus.skerry.invalid"},
		{Name: "desk", Role: Operate, Email: "desk@skerry.invalid"},
		{Name: "duty", Role: Admin, URI: "spiffe://skerry.invalid/duty"},
	}})
	var in Person
	srv := httptest.NewUnstartedServer(g.Middleware(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		in, _ = PersonOf(r.Context())
		p, err := g.Connection(remote(r.RemoteAddr), *r.TLS)
		if r.Header.Get("Authorization") == "" && (err != nil || p.Name != in.Name || !g.Still(p)) {
			t.Errorf("the connection is %+v's, %v", p, err)
		}
	})))
	srv.TLS, srv.Config.ErrorLog = conf, log.New(io.Discard, "", 0)
	srv.StartTLS()
	defer srv.Close()

	roots := x509.NewCertPool()
	roots.AddCert(a.cert)
	for name, c := range map[string]struct {
		cert  *tls.Certificate
		token string
		want  string
	}{
		"common name": {cert: sign(a, func(c *x509.Certificate) { c.Subject.CommonName = "laser-control" }), want: "laser-control"},
		"DNS name":    {cert: sign(a, func(c *x509.Certificate) { c.DNSNames = []string{"x.invalid", "bus.skerry.invalid"} }), want: "bus"},
		"mail":        {cert: sign(a, func(c *x509.Certificate) { c.EmailAddresses = []string{"desk@skerry.invalid"} }), want: "desk"},
		"URI": {cert: sign(a, func(c *x509.Certificate) {
			c.URIs = []*url.URL{{Scheme: "spiffe", Host: "skerry.invalid", Path: "/duty"}}
		}), want: "duty"},
		"nobody's":       {cert: sign(a, func(c *x509.Certificate) { c.Subject.CommonName = "someone" })},
		"a name as mail": {cert: sign(a, func(c *x509.Certificate) { c.EmailAddresses = []string{"laser-control"} })},
		"mail as a name": {cert: sign(a, func(c *x509.Certificate) { c.Subject.CommonName = "desk@skerry.invalid" })},
		"two people's": {cert: sign(a, func(c *x509.Certificate) {
			c.Subject.CommonName = "laser-control"
			c.DNSNames = []string{"bus.skerry.invalid"}
		})},
		"no certificate":     {},
		"a token beside":     {cert: sign(a, func(c *x509.Certificate) { c.Subject.CommonName = "laser-control" }), token: ada.Reveal(), want: "ada"},
		"a bad token beside": {cert: sign(a, func(c *x509.Certificate) { c.Subject.CommonName = "laser-control" }), token: mint().Reveal()},
		"of a stranger":      {cert: sign(stranger, func(c *x509.Certificate) { c.Subject.CommonName = "laser-control" })},
		"expired": {cert: sign(a, func(c *x509.Certificate) {
			c.Subject.CommonName, c.NotBefore, c.NotAfter = "laser-control", time.Now().Add(-2*time.Hour), time.Now().Add(-time.Hour)
		})},
		"for servers only": {cert: sign(a, func(c *x509.Certificate) {
			c.Subject.CommonName, c.ExtKeyUsage = "laser-control", []x509.ExtKeyUsage{x509.ExtKeyUsageServerAuth}
		})},
	} {
		in = Person{}
		tc := &tls.Config{RootCAs: roots}
		if c.cert != nil {
			tc.GetClientCertificate = func(*tls.CertificateRequestInfo) (*tls.Certificate, error) { return c.cert, nil }
		}
		tr := &http.Transport{TLSClientConfig: tc}
		r, err := http.NewRequest("GET", srv.URL, nil)
		if err != nil {
			t.Fatal(err)
		}
		if c.token != "" {
			r.Header.Set("Authorization", "Bearer "+c.token)
		}
		if res, err := (&http.Client{Transport: tr}).Do(r); err == nil {
			res.Body.Close()
			if (res.StatusCode == 200) != (c.want != "") {
				t.Errorf("%s: %d", name, res.StatusCode)
			}
		} else if c.want != "" {
			t.Errorf("%s: %v", name, err)
		}
		tr.CloseIdleConnections()
		if in.Name != c.want {
			t.Errorf("%s: let in %+v", name, in)
		}
	}
	if _, err := g.Connection(remote("192.0.2.1:1"), tls.ConnectionState{PeerCertificates: []*x509.Certificate{{Subject: pkix.Name{CommonName: "laser-control"}}}}); err == nil {
		t.Error("a certificate that nobody verified is taken")
	}
	if g.Still(Person{Name: "bus", Role: Admin, Token: true, until: time.Now().Add(time.Hour)}) {
		t.Error("a role that the configuration does not give is still good")
	}
}

func sign(a *authority, edit func(*x509.Certificate)) *tls.Certificate {
	c := a.sign(edit)
	return &c
}

func TestCertificateRulesAreChecked(t *testing.T) {
	for want, rules := range map[string][]Certificate{
		"state exactly one":      {{Name: "a", Role: Read}},
		"exactly one of":         {{Name: "a", Role: Read, DNS: "a", URI: "b"}},
		"role must be":           {{Name: "a", DNS: "a"}},
		"must name the sources":  {{Name: "a", Role: Feed, DNS: "a"}},
		"1 to 64":                {{Role: Read, DNS: "a"}},
		"another has its name":   {{Name: "a", Role: Read, DNS: "a"}, {Name: "A", Role: Read, DNS: "b"}},
		"without a name":         {{Name: "local", Role: Read, DNS: "a"}},
		"speaks for no source":   {{Name: "a", Role: Read, DNS: "a", Sources: []closures.Source{"north"}}},
		"its sources must be na": {{Name: "a", Role: Feed, DNS: "a", Sources: []closures.Source{""}}},
	} {
		if _, err := New(Options{Certificates: rules}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("want %q, got %v", want, err)
		}
	}
}

func TestServerTLSRefuses(t *testing.T) {
	a := newAuthority(t)
	dir := t.TempDir()
	cert, key, ca := a.write(dir, a.sign(func(c *x509.Certificate) { c.DNSNames = []string{"a"} }))
	if c, err := ServerTLS(cert, key, ""); err != nil || c.ClientAuth != tls.NoClientCert || c.MinVersion < tls.VersionTLS12 {
		t.Errorf("%+v, %v", c, err)
	}
	for want, try := range map[string]func() error{
		"no such file":          func() error { _, err := ServerTLS(cert, dir+"/none", ca); return err },
		"with key":              func() error { _, err := ServerTLS(key, key, ca); return err },
		"holds no PEM":          func() error { _, err := ServerTLS(cert, key, key); return err },
		"authorities of client": func() error { _, err := ServerTLS(cert, key, dir+"/none"); return err },
		"0644: make it 0600 or 0640": func() error {
			if err := os.Chmod(key, 0o644); err != nil {
				return err
			}
			_, err := ServerTLS(cert, key, ca)
			if e := os.Chmod(key, 0o600); e != nil {
				return e
			}
			return err
		},
	} {
		if err := try(); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("want %q, got %v", want, err)
		}
	}
}
