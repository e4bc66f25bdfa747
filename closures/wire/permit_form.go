package wire

import (
	"encoding/json"
	"errors"
	"fmt"
	"strconv"
	"time"

	"beamward/closures"
)

// PayloadOf returns the bytes that are signed: the permit as JSON without its
// signature, always the same for the same permit. Fields come in the order of
// the struct, none is left out, and there are no blanks.
func PayloadOf(p *Permit) []byte { return appendPermit(make([]byte, 0, 1024), p) }

func appendPermit(dst []byte, p *Permit) []byte {
	dst = appendString(append(dst, `{"beam":`...), p.Beam)
	dst = append(append(append(dst, `,"state":"`...), p.State.String()...), '"')
	dst = strconv.AppendUint(append(dst, `,"seq":`...), p.Seq, 10)
	dst = appendString(append(dst, `,"boot_id":`...), p.BootID)
	dst = append(AppendTime(append(dst, `,"issued_at":"`...), p.IssuedAt), '"')
	dst = append(AppendTime(append(dst, `,"valid_until":"`...), p.ValidUntil), '"')
	dst = strconv.AppendInt(append(dst, `,"lease_ms":`...), p.LeaseMS, 10)
	dst = appendEach(append(dst, `,"reasons":`...), p.Reasons, appendReason)
	dst = appendEach(append(dst, `,"cautions":`...), p.Cautions, appendCaution)
	dst = appendInstant(append(dst, `,"closes_at":`...), p.ClosesAt)
	dst = appendInstant(append(dst, `,"opens_at":`...), p.OpensAt)
	dst = appendEach(append(dst, `,"inputs":`...), p.Inputs, appendInput)
	dst = appendString(append(dst, `,"rules_digest":`...), p.RulesDigest)
	dst = appendString(append(dst, `,"lists_digest":`...), p.ListsDigest)
	dst = strconv.AppendBool(append(dst, `,"simulated":`...), p.Simulated)
	dst = appendString(append(dst, `,"nonce":`...), p.Nonce)
	return append(dst, '}')
}

func appendEach[T any](dst []byte, list []T, each func([]byte, *T) []byte) []byte {
	dst = append(dst, '[')
	for i := range list {
		if i > 0 {
			dst = append(dst, ',')
		}
		dst = each(dst, &list[i])
	}
	return append(dst, ']')
}

func appendInstant(dst []byte, t *time.Time) []byte {
	if t == nil {
		return append(dst, "null"...)
	}
	return append(AppendTime(append(dst, '"'), *t), '"')
}

func appendReason(dst []byte, r *Reason) []byte {
	dst = appendString(append(dst, `{"code":`...), r.Code)
	dst = appendString(append(dst, `,"source":`...), r.Source)
	dst = appendInstant(append(dst, `,"from":`...), r.From)
	dst = appendInstant(append(dst, `,"until":`...), r.Until)
	dst = append(dst, `,"margin":`...)
	if r.Margin == nil {
		dst = append(dst, "null"...)
	} else {
		dst = appendNumber(append(dst, `{"value":`...), r.Margin.Value)
		dst = append(appendString(append(dst, `,"unit":`...), r.Margin.Unit), '}')
	}
	dst = appendString(append(dst, `,"detail":`...), r.Detail)
	dst = appendString(append(dst, `,"ref":`...), r.Ref)
	return append(dst, '}')
}

func appendCaution(dst []byte, c *Caution) []byte {
	dst = appendString(append(dst, `{"code":`...), c.Code)
	dst = appendString(append(dst, `,"source":`...), c.Source)
	return append(appendString(append(dst, `,"detail":`...), c.Detail), '}')
}

func appendInput(dst []byte, in *Input) []byte {
	dst = appendString(append(dst, `{"source":`...), in.Source)
	dst = append(dst, `,"age_s":`...)
	if in.AgeS == nil {
		dst = append(dst, "null"...)
	} else {
		dst = appendNumber(dst, *in.AgeS)
	}
	return append(appendNumber(append(dst, `,"limit_s":`...), in.LimitS), '}')
}

// AppendPermit appends the whole permit, signature included, as the service
// answers with it.
func AppendPermit(dst []byte, p *Permit) []byte {
	dst = appendPermit(dst, p)
	return append(appendString(append(dst[:len(dst)-1], `,"signed":`...), p.Signed), '}')
}

// MarshalJSON writes what AppendPermit writes.
func (p Permit) MarshalJSON() ([]byte, error) { return AppendPermit(nil, &p), nil }

// UnmarshalJSON reads what ParsePermit reads.
func (p *Permit) UnmarshalJSON(b []byte) (err error) {
	*p, err = ParsePermit(b)
	return err
}

// ParsePermit reads a permit as the service answers with it, strictly: every
// field there and no other, and everything outside the signature as its payload
// says it. It does not check the signature: what is to be acted on comes from
// VerifyPermit. With an error the permit is the zero one, which is shuttered.
func ParsePermit(data []byte) (Permit, error) {
	p, err := parsePermit(data, true)
	if err != nil {
		return Permit{}, fmt.Errorf("reading a permit: %w", err)
	}
	if p.Signed != "" {
		_, payload, _, err := splitJWS(p.Signed)
		if err != nil {
			return Permit{}, fmt.Errorf("reading a permit: %w", err)
		}
		if string(payload) != string(PayloadOf(&p)) {
			return Permit{}, errors.New("reading a permit: its signed payload says otherwise")
		}
	}
	return p, nil
}

// permitFields is how many fields a permit has besides its signature.
const permitFields = 16

func parsePermit(data []byte, signed bool) (Permit, error) {
	var keys map[string]json.RawMessage
	if err := Strict(data, &keys); err != nil {
		return Permit{}, err
	}
	if _, has := keys["signed"]; has != signed {
		return Permit{}, errors.New("the signature is missing, or is where it cannot be")
	}
	delete(keys, "signed")
	// Strict refuses other names and twins, so the count tells a missing one.
	if len(keys) != permitFields {
		return Permit{}, errors.New("fields are missing or too many")
	}
	type plain Permit
	var p plain
	if err := Strict(data, &p); err != nil {
		return Permit{}, err
	}
	out := Permit(p)
	return out, out.check()
}

// check holds a permit against what each must be.
func (p *Permit) check() error {
	switch {
	case !closures.ValidName(string(p.Beam)):
		return errors.New("beam: not a name")
	case !closures.ValidName(p.BootID):
		return errors.New("boot_id: not a name")
	case !ValidNonce(p.Nonce):
		return errors.New("nonce: more than 128 characters, or not printable ASCII")
	case p.LeaseMS < 0 || p.LeaseMS > time.Hour.Milliseconds():
		return errors.New("lease_ms: want 0 to 3600000")
	}
	for _, d := range [...]string{p.RulesDigest, p.ListsDigest} {
		if _, err := closures.ParseDigest(d); err != nil {
			return err
		}
	}
	for i := range p.Reasons {
		if err := p.Reasons[i].check(); err != nil {
			return fmt.Errorf("reason %d: %w", i, err)
		}
	}
	for i := range p.Cautions {
		if _, known := closures.ParseCode(p.Cautions[i].Code); !known {
			return fmt.Errorf("caution %d: no such code", i)
		}
	}
	if p.State == Shuttered {
		return nil
	}
	switch lasts := p.ValidUntil.Sub(p.IssuedAt); {
	case len(p.Reasons) > 0:
		return errors.New("open with reasons not to be")
	case !(lasts > 0 && lasts <= p.Lease()):
		return errors.New("open for no time, or for longer than the lease")
	case p.ClosesAt != nil && p.ValidUntil.After(*p.ClosesAt):
		return errors.New("open past the next closure")
	}
	return nil
}

func (r *Reason) check() error {
	if _, known := closures.ParseCode(r.Code); !known {
		return errors.New("no such code")
	}
	if m := r.Margin; m != nil && m.Unit != "deg" && m.Unit != "m" && m.Unit != "s" {
		return errors.New("margin: want deg, m or s")
	}
	return nil
}

// maxNonce bounds a reader's nonce, in characters.
const maxNonce = 128

// ValidNonce reports whether a nonce can be echoed: up to 128 characters of
// printable ASCII. None at all is valid.
func ValidNonce(s string) bool {
	if len(s) > maxNonce {
		return false
	}
	for i := range len(s) {
		if s[i] < ' ' || s[i] > '~' {
			return false
		}
	}
	return true
}
