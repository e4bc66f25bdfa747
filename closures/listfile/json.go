package listfile

import (
	"errors"
	"io"
)

// jsonReader reads the native JSON form. What it reads of a region or a window
// is borrowed from the scanner until that is checked.
type jsonReader struct {
	d *draft
	s *scanner
}

// readJSON reads a whole list. The error is the reader's own; what is wrong
// with the list is in d.
func readJSON(d *draft, r io.Reader, report *Report) error {
	j := &jsonReader{d: d, s: newScanner(r, d.limits.Bytes)}
	err := j.list()
	report.Bytes, report.Lines = j.s.total, j.s.line
	if j.s.pos == j.s.lineStart && j.s.line > 1 { // the text ended with a line end
		report.Lines--
	}
	var syntax *syntaxError
	switch {
	case errors.As(err, &syntax):
		d.stop(syntax.at, syntax.cause, syntax.mend)
		return nil
	case errors.Is(err, errEnough):
		return nil
	}
	return err
}

// errEnough ends the reading after a limit was passed, which is reported.
var errEnough = errors.New("enough")

func (j *jsonReader) list() error {
	if t, err := j.s.peek(); err != nil || t != '{' {
		if err == nil {
			err = j.s.fail("the text is not a JSON object")
		}
		return err
	}
	var seen keys
	if err := j.s.object(func(key []byte) error { return j.headKey(&seen, key) }); err != nil {
		return err
	}
	t, err := j.s.peek()
	if err == nil && t != tokenEnd {
		err = j.s.fail("something follows the list")
	}
	return err
}

// keys is the set of keys that an object has given.
type keys uint32

// take notes key number n, and reports whether it may be read: a second one is
// refused.
func (k *keys) take(d *draft, n int, at place, key []byte) bool {
	if *k&(1<<n) != 0 {
		d.twice(at, key)
		return false
	}
	*k |= 1 << n
	return true
}

// place returns the present line with a piece of the text to show.
func (j *jsonReader) place(text []byte) place { return place{line: j.s.line, text: text} }

// headKeys are the keys of a list, in no order that matters.
var headKeys = [...]string{"closure_list", "id", "authority", "issued", "unlisted_sky", "window_count", "digest", "covers", "replaces", "beams",
	"regions", "windows"}

// headKey reads the value of a key of the list.
func (j *jsonReader) headKey(seen *keys, key []byte) error {
	for n, known := range headKeys {
		if known == string(key) {
			if !seen.take(j.d, n, j.place(key), key) {
				return j.s.skip()
			}
			return j.headValue(known)
		}
	}
	j.d.unknownKey(j.place(key), key)
	return j.s.skip()
}

func (j *jsonReader) headValue(key string) error {
	h := &j.d.head
	switch key {
	case "covers":
		return j.covers()
	case "replaces":
		return j.names(key, &h.replaces)
	case "beams":
		t, err := j.s.peek()
		if err != nil {
			return err
		}
		h.beamsSet, h.beamsAt = t == '[', j.place([]byte(key))
		return j.names(key, &h.beams)
	case "regions":
		h.regionsSet = true
		return j.array(key, j.region)
	case "windows":
		h.windowsSet = true
		return j.array(key, j.window)
	}
	c, err := j.s.scalar()
	if dst := h.scalar(key); err == nil && dst != nil {
		*dst = c.own()
	}
	return err
}

// array reads an array of objects or of scalars, forgetting the text of each.
func (j *jsonReader) array(key string, each func() error) error {
	if t, err := j.s.peek(); err != nil {
		return err
	} else if t != '[' {
		return j.other(key, " is not an array", "write it as an array")
	}
	return j.s.array(func() error {
		mark := len(j.s.scratch)
		err := each()
		j.s.scratch = j.s.scratch[:mark]
		if err == nil && j.d.full {
			err = errEnough
		}
		return err
	})
}

// object reads an object; anything else is refused, and skipped.
func (j *jsonReader) object(what string, each func(key []byte) error) (ok bool, err error) {
	if t, err := j.s.peek(); err != nil {
		return false, err
	} else if t != '{' {
		return false, j.other(what, " is not an object", "write it as an object")
	}
	return true, j.s.object(each)
}

// other skips a value and reports it as not what it must be.
func (j *jsonReader) other(what, cause, mend string) error {
	at := j.place([]byte(what))
	err := j.s.skip()
	if err == nil {
		j.d.add(at, what+cause, mend)
	}
	return err
}

func (j *jsonReader) names(key string, dst *[]cell) error {
	return j.array(key, func() error {
		c, err := j.s.scalar()
		if len(*dst) <= maxNames {
			*dst = append(*dst, c.own())
		}
		return err
	})
}

func (j *jsonReader) covers() error {
	h := &j.d.head
	h.covers = j.place([]byte("covers"))
	_, err := j.cells("covers", func(key string) *cell {
		switch key {
		case "from":
			return &h.from
		case "until":
			return &h.until
		}
		return nil
	})
	h.from, h.until = h.from.own(), h.until.own()
	return err
}
