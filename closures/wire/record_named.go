package wire

import (
	"errors"
	"time"

	"beamward/closures"
)

func rulesSet(a *archive, b *closures.RulesSet, r *Resolver) {
	var d closures.Digest
	if !a.reading {
		if b.Rules == nil || b.Rules.Digest.IsZero() {
			a.fail("rules without a digest")
			return
		}
		d = b.Rules.Digest
	}
	digest(a, "digest", &d)
	text(a, "by", &b.By)
	if !a.reading || a.err != nil {
		return
	}
	var err error
	if b.Rules, err = ask(r.Rules, d); err == nil && (b.Rules == nil || b.Rules.Digest != d) {
		err = errOther
	}
	if err != nil {
		a.fail("the rules " + d.String() + ": " + err.Error())
	}
}

func listOffered(a *archive, b *closures.ListOffered, r *Resolver) {
	list(a, &b.List, r)
	text(a, "by", &b.By)
}

// list carries a list by its name and digest.
func list(a *archive, p **closures.List, r *Resolver) {
	var id closures.ListID
	var authority closures.AuthorityID
	var d closures.Digest
	if !a.reading {
		if *p == nil || (*p).Digest().IsZero() {
			a.fail("a list without a digest")
			return
		}
		authority, id, d = (*p).Authority(), (*p).ID(), (*p).Digest()
	}
	text(a, "authority", &authority)
	text(a, "id", &id)
	digest(a, "digest", &d)
	if !a.reading || a.err != nil {
		return
	}
	l, err := ask(r.List, d)
	if err == nil && (l == nil || l.Digest() != d || l.Authority() != authority || l.ID() != id) {
		err = errOther
	}
	if err != nil {
		a.fail("the list " + d.String() + ": " + err.Error())
		return
	}
	*p = l
}

func nightReady(a *archive, b *closures.NightReady, r *Resolver) {
	var bin time.Time
	if !a.reading {
		if b.Night == nil {
			a.fail("a night that is not there")
			return
		}
		bin = closures.BinOf(b.Night).From
	}
	instant(a, "bin", &bin)
	if !a.reading || a.err != nil {
		return
	}
	n, err := ask(r.Night, bin)
	if err == nil && (n == nil || !closures.BinOf(n).From.Equal(bin)) {
		err = errOther
	}
	if err != nil {
		a.fail("the night of " + FormatTime(bin) + ": " + err.Error())
		return
	}
	b.Night = n
}

var (
	errNobody = errors.New("nobody was named to ask")
	errOther  = errors.New("what was found is another")
)

func ask[K, V any](who func(K) (V, error), key K) (V, error) {
	if who == nil {
		var none V
		return none, errNobody
	}
	return who(key)
}
