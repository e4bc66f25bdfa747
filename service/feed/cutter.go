package feed

import (
	"bytes"

	"beamward/closures/wire"
)

// cutter cuts what comes in pieces into lines. It keeps the beginning of a
// line whose end has not come. A line longer than wire.MaxFactLine is told
// once, by its beginning and long, and the rest of it passed over.
type cutter struct {
	rest []byte
	long bool // within a line that is too long
}

// cut calls line for each line that data ends, without its end, LF or CR LF.
// The line is good for the call.
func (c *cutter) cut(data []byte, line func(text []byte, long bool) error) error {
	for len(data) > 0 {
		i := bytes.IndexByte(data, '\n')
		if i < 0 {
			return c.put(data, line)
		}
		piece := data[:i]
		data = data[i+1:]
		if c.long {
			c.long = false
			continue
		}
		if len(c.rest) > 0 {
			if err := c.put(piece, line); err != nil {
				return err
			}
			if c.long {
				c.long = false
				continue
			}
			piece = c.rest
			c.rest = c.rest[:0]
		}
		piece = bytes.TrimSuffix(piece, []byte{'\r'})
		if err := line(piece, len(piece) > wire.MaxFactLine); err != nil {
			return err
		}
	}
	return nil
}

// put keeps the beginning of a line.
func (c *cutter) put(piece []byte, line func([]byte, bool) error) error {
	if c.long {
		return nil
	}
	c.rest = append(c.rest, piece...)
	if len(c.rest) > wire.MaxFactLine+1 { // the one may be a carriage return
		text := c.rest
		c.rest, c.long = nil, true
		return line(text, true)
	}
	return nil
}

// forget drops the beginning of a line.
func (c *cutter) forget() { c.rest, c.long = c.rest[:0], false }
