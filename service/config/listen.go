package config

import (
	"net"
	"strings"
)

// feeds checks that each feed has one way in and is bound to what it may speak
// for. What can open a beam never comes in over a link that anyone may write
// to.
func (b *binder) feeds(f *fileKeys) {
	carried := map[string]string{} // the feed that carries each configured source
	for i := range f.Feeds {
		k := &f.Feeds[i]
		key := strings.TrimSuffix(k.Kind.key, ".kind")
		if !b.trusted(key) {
			continue
		}
		line := b.nearest(key).line
		switch k.Kind.value {
		case ModeS:
			if k.Dial.has == k.File.has {
				b.refuse(line, key, "", "state one of dial and file")
			}
		case FactsFile:
			if !k.File.has {
				b.refuse(line, join(key, "file"), "", "it is missing: name the file that is followed")
			}
		}
		bound := k.Sources
		if k.Source.has {
			bound = []text{k.Source}
		}
		if len(bound) == 0 {
			b.refuse(line, join(key, "sources"), "", "name what it may speak for: a feed is bound to sources")
		}
		b.known(f, bound)
		aircraftOnly := k.Kind.value == FactsUDP || k.Kind.value == ModeS || k.Kind.value == Asterix021
		for _, n := range bound {
			if !n.has || !b.trusted("sources", "beams", "neighbours", "watches") {
				continue
			}
			kind := b.kind(f, n.value)
			if aircraftOnly && kind != "" && kind != "aircraft" {
				mend := "name a source of kind aircraft: this feed carries nothing else"
				if k.Kind.value == FactsUDP {
					mend = "name a source of kind aircraft: over UDP a sender proves nothing, so it may say nothing that opens"
				}
				b.at(n.at, mend)
			}
			// A second link would hide the silence of the first.
			if first, twice := carried[n.value]; twice {
				b.at(n.at, "give it one feed: "+first+" carries it already, and would hide that this one is silent")
			} else if kind != "beam" && kind != "neighbour" && kind != "post" {
				carried[n.value] = key
			}
		}
		if k.Kind.value == FactsTCP {
			b.admits(f, k)
		}
	}
}

// admits checks who may connect to a feed that can carry what opens.
func (b *binder) admits(f *fileKeys, k *feedKeys) {
	if !k.Listen.has || !b.trusted("tls", "access") {
		return
	}
	local := isLoopback(k.Listen.value)
	switch k.Admits.value {
	case AdmitAnyone:
		if !local {
			b.at(k.Listen.at, "make it a loopback address, or make admits token or certificate: off loopback anyone could speak for these sources")
		}
	case AdmitToken:
		if f.Access == nil || !f.Access.Tokens.has {
			b.at(k.Admits.at, "add access.tokens_file")
		} else if f.TLS == nil && !local {
			b.at(k.Admits.at, "add tls: a token must not cross the network in the clear")
		}
	case AdmitCertificate:
		if f.Access == nil || len(f.Access.Certificates) == 0 {
			b.at(k.Admits.at, "add access.certificates with tls.client_ca_file")
		}
	}
}

// listeners checks that nobody off this machine is answered unnamed or in the
// clear, and that no two listeners want one address.
func (b *binder) listeners(f *fileKeys) {
	type listener struct {
		at      at
		network string
	}
	served := []listener{{f.Listen.at, "tcp"}, {f.Permit.Listen.at, "tcp"}}
	for _, l := range served {
		if !l.at.has || isLoopback(l.at.text) || !b.trusted("tls", "access") {
			continue
		}
		switch {
		case f.Access == nil:
			b.at(l.at, "make it a loopback address, or add tls and access: open access off loopback is refused")
		case f.TLS == nil:
			b.at(l.at, "make it a loopback address, or add tls: a token must not cross the network in the clear")
		}
	}
	for i := range f.Feeds {
		if k := &f.Feeds[i]; k.Listen.has {
			network := "tcp"
			if k.Kind.value == FactsUDP || k.Kind.value == Asterix021 {
				network = "udp"
			}
			served = append(served, listener{k.Listen.at, network})
		}
	}
	taken := map[string]string{}
	for _, l := range served {
		if !l.at.has {
			continue
		}
		host, p, err := net.SplitHostPort(l.at.text)
		if err != nil || p == "0" {
			continue
		}
		if host == "localhost" {
			host = "127.0.0.1"
		}
		id := l.network + " " + host + " " + p
		if first, ok := taken[id]; ok {
			b.at(l.at, "choose another port: "+first+" has it")
			continue
		}
		taken[id] = l.at.key
	}
}
