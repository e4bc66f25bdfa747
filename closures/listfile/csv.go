package listfile

import (
	"bytes"
	"errors"
	"io"
)

// csvHeader is the header row, exactly.
const csvHeader = "region,shape,ra_deg,dec_deg,radius_deg,az_from_deg,az_to_deg,el_from_deg,el_to_deg,throughout,window,from,until,ref"

// The columns of a row.
const (
	colRegion = iota
	colShape
	colRA
	colDec
	colRadius
	colAzFrom
	colAzTo
	colElFrom
	colElTo
	colThroughout
	colWindow
	colFrom
	colUntil
	colRef
	columns
)

// csvReader reads the CSV form: the head as "# key: value" lines, the header
// row, then rows. The first row that names a region defines it; later ones
// leave the shape columns empty or repeat them exactly. A row with window
// `point` adds a point at ra_deg, dec_deg and from to a track.
type csvReader struct {
	d     *draft
	lines *lineReader
	at    place
	field [columns][]byte
	spare []byte // unquoted fields of the row

	defined []definition // by index of name
	tracks  []int32      // names of tracks, whose region waits for its points
}

// readCSV reads a whole list. The error is the reader's own; what is wrong
// with the list is in d.
func readCSV(d *draft, r io.Reader, report *Report) error {
	c := &csvReader{d: d, lines: newLineReader(r, d.limits.Bytes)}
	err := c.read()
	report.Bytes, report.Lines = c.lines.total, c.lines.line
	return err
}

func (c *csvReader) read() error {
	if ok, err := c.readHead(); !ok {
		return err
	}
	c.d.head.regionsSet, c.d.head.windowsSet = true, true // the header row stands for both
	c.d.settle()
	for !c.d.full {
		line, err := c.lines.next()
		if err != nil {
			return c.end(line, err)
		}
		c.at = place{line: c.lines.line, text: line}
		if cause, mend := badText(line); cause != "" {
			c.d.add(c.at, "the line holds "+cause, mend)
			c.d.lost = true
			continue
		}
		if len(line) == 0 {
			c.d.add(c.at, "the line is empty", "take it out")
			continue
		}
		if !c.split(line) || !c.row() {
			c.d.lost = true
		}
	}
	return nil
}

// end deals with the end of the lines, and returns what is not the list's
// fault.
func (c *csvReader) end(line []byte, err error) error {
	at := place{line: c.lines.line, text: line}
	switch {
	case errors.Is(err, io.EOF):
		if c.lines.open {
			c.d.add(c.at, "the last line does not end: the text may be cut short", `end it with \n, or ask for the list again`)
		}
		for _, name := range c.tracks {
			c.d.region(c.defined[name].track)
		}
		if len(c.tracks) > 0 {
			c.d.reorder()
		}
		return nil
	case errors.Is(err, errLongLine):
		c.d.stop(at, "the line is too long; nothing after it was read", "write at most 16384 bytes on a line")
		return nil
	case errors.Is(err, errTooLarge):
		c.d.stop(at, "the list is too large", "split the list")
		return nil
	}
	return err
}

// readHead reads up to the header row; ok is false when the rows cannot be
// read.
func (c *csvReader) readHead() (ok bool, err error) {
	for {
		line, err := c.lines.next()
		c.at = place{line: c.lines.line, text: line}
		if errors.Is(err, io.EOF) {
			c.d.stop(c.at, "the list has no header row", "write the row "+csvHeader)
			return false, nil
		}
		if err != nil {
			return false, c.end(line, err)
		}
		if cause, mend := badText(line); cause != "" {
			c.d.add(c.at, "the line holds "+cause, mend)
			continue
		}
		if len(line) > 0 && line[0] == '#' {
			c.headLine(line)
			continue
		}
		if string(line) != csvHeader {
			c.d.stop(c.at, "the header row is not as it must be; no row was read", "write exactly "+csvHeader)
			return false, nil
		}
		if c.lines.open {
			c.d.add(c.at, "the last line does not end: the text may be cut short", `end it with \n, or ask for the list again`)
		}
		return true, nil
	}
}

// headLine reads one "# key: value" line.
func (c *csvReader) headLine(line []byte) {
	key, value, found := bytes.Cut(bytes.TrimPrefix(line, []byte("# ")), []byte(": "))
	if !found || !bytes.HasPrefix(line, []byte("# ")) || len(value) == 0 {
		c.d.add(c.at, "the head line is not of the form # key: value", "write # key: value")
		return
	}
	one := cell{kind: bare, text: value, at: c.at}.own()
	h := &c.d.head
	put := func(dst *cell) {
		if dst.set() {
			c.d.twice(c.at, key)
			return
		}
		*dst = one
	}
	switch string(key) {
	case "closure_list":
		put(&h.version)
	case "id":
		put(&h.id)
	case "authority":
		put(&h.authority)
	case "issued":
		put(&h.issued)
	case "covers":
		if h.covers.line != 0 {
			c.d.twice(c.at, key)
			return
		}
		from, until, _ := bytes.Cut(one.text, []byte("/"))
		h.covers = one.at
		h.from, h.until = cell{kind: bare, text: from, at: one.at}, cell{kind: bare, text: until, at: one.at}
	case "replaces":
		c.names(&h.replaces, one, key)
	case "beams":
		h.beamsSet, h.beamsAt = true, one.at
		c.names(&h.beams, one, key)
	case "unlisted_sky":
		put(&h.unlisted)
	case "window_count":
		put(&h.count)
	case "digest":
		put(&h.digest)
	default:
		c.d.unknownKey(c.at, key)
	}
}

// names reads names parted by a comma and a space.
func (c *csvReader) names(dst *[]cell, all cell, key []byte) {
	if len(*dst) > 0 {
		c.d.twice(c.at, key)
		return
	}
	for _, name := range bytes.Split(all.text, []byte(", ")) {
		*dst = append(*dst, cell{kind: bare, text: name, at: all.at})
	}
}

var headerNames = [columns]string{"region", "shape", "ra_deg", "dec_deg", "radius_deg", "az_from_deg", "az_to_deg", "el_from_deg", "el_to_deg",
	"throughout", "window", "from", "until", "ref"}
