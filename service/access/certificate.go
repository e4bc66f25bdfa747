package access

import (
	"crypto/sha256"
	"crypto/tls"
	"crypto/x509"
	"errors"
	"fmt"
	"os"
	"slices"

	"beamward/closures"
)

// Certificate says whom a client certificate stands for. Exactly one of
// CommonName, DNS, Email and URI is set, and the certificate must hold it.
type Certificate struct {
	Name                        string
	Role                        Role
	Sources                     []closures.Source
	CommonName, DNS, Email, URI string
}

func (c *Certificate) check() error {
	set := 0
	for _, s := range []string{c.CommonName, c.DNS, c.Email, c.URI} {
		if s != "" {
			set++
		}
	}
	t := Token{Name: c.Name, Role: c.Role.String(), Sources: c.Sources}
	switch err := t.check(); {
	case err != nil:
		return fmt.Errorf("certificate %.80q: %w", c.Name, err)
	case set != 1:
		return fmt.Errorf("certificate %s: state exactly one of common name, DNS name, mail address and URI", c.Name)
	}
	return nil
}

func (c *Certificate) fits(leaf *x509.Certificate) bool {
	switch {
	case c.CommonName != "":
		return leaf.Subject.CommonName == c.CommonName
	case c.DNS != "":
		return slices.Contains(leaf.DNSNames, c.DNS)
	case c.Email != "":
		return slices.Contains(leaf.EmailAddresses, c.Email)
	case c.URI != "":
		for _, u := range leaf.URIs {
			if u.String() == c.URI {
				return true
			}
		}
	}
	return false
}

// whose returns whom a verified certificate stands for. One that nothing fits,
// or two, stands for nobody.
func whose(rules []Certificate, state *tls.ConnectionState) (Person, bool) {
	if state == nil || len(state.VerifiedChains) == 0 || len(state.VerifiedChains[0]) == 0 {
		return Person{}, false
	}
	leaf := state.VerifiedChains[0][0]
	var fit *Certificate
	for i := range rules {
		if rules[i].fits(leaf) {
			if fit != nil {
				return Person{}, false
			}
			fit = &rules[i]
		}
	}
	if fit == nil {
		return Person{}, false
	}
	return Person{Name: fit.Name, Role: fit.Role, Sources: fit.Sources, Token: true, proof: sha256.Sum256(leaf.Raw), until: leaf.NotAfter}, true
}

// ServerTLS reads the certificate that listeners show, and whose client
// certificates they take; clientCA is empty where none is asked for. A private
// key that everyone can read, or that others can write, is refused.
func ServerTLS(cert, key, clientCA string) (*tls.Config, error) {
	info, err := os.Stat(key)
	if err != nil {
		return nil, fmt.Errorf("read the private key: %w", err)
	}
	if info.Mode().Perm()&0o037 != 0 {
		return nil, fmt.Errorf("read the private key %s: its mode is %#o: make it 0600 or 0640", key, info.Mode().Perm())
	}
	pair, err := tls.LoadX509KeyPair(cert, key)
	if err != nil {
		return nil, fmt.Errorf("read certificate %s with key %s: %w", cert, key, err)
	}
	c := &tls.Config{MinVersion: tls.VersionTLS12, Certificates: []tls.Certificate{pair}}
	if clientCA == "" {
		return c, nil
	}
	pem, err := os.ReadFile(clientCA)
	if err != nil {
		return nil, fmt.Errorf("read the authorities of client certificates: %w", err)
	}
	c.ClientCAs = x509.NewCertPool()
	if !c.ClientCAs.AppendCertsFromPEM(pem) {
		return nil, fmt.Errorf("read the authorities of client certificates %s: %w", clientCA, errors.New("it holds no PEM certificate"))
	}
	c.ClientAuth = tls.VerifyClientCertIfGiven
	return c, nil
}
