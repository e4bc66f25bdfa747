package listfile

import (
	"bytes"
	"errors"
	"io"
)

// maxLine bounds one line of a text that is read by lines.
const maxLine = 16 << 10

var (
	errLongLine = errors.New("a line is too long")
	errTooLarge = errors.New("the text is too large")
)

// lineReader hands out a text line by line without keeping it.
type lineReader struct {
	r          io.Reader
	limit      int64
	buf        []byte
	start, end int
	ended      bool // r gave io.EOF
	line       int  // number of the line handed out last
	total      int64
	open       bool // the last line had no line end
	idle       int  // readings in a row that gave nothing
}

func newLineReader(r io.Reader, limit int64) *lineReader {
	return &lineReader{r: r, limit: limit, buf: make([]byte, 4096)}
}

// next returns the next line without its line end, valid until the following
// call. The error is io.EOF, errLongLine, errTooLarge or the reader's own.
func (l *lineReader) next() ([]byte, error) {
	searched := l.start
	for {
		if i := bytes.IndexByte(l.buf[searched:l.end], '\n'); i >= 0 {
			line := l.buf[l.start : searched+i]
			l.start = searched + i + 1
			l.line++
			if n := len(line); n > maxLine {
				return line[:80], errLongLine
			} else if n > 0 && line[n-1] == '\r' {
				line = line[:n-1]
			}
			return line, nil
		}
		if l.end-l.start > maxLine {
			l.line++
			return l.buf[l.start : l.start+80], errLongLine
		}
		if l.ended {
			if l.start == l.end {
				return nil, io.EOF
			}
			line := l.buf[l.start:l.end]
			l.start = l.end
			l.line++
			l.open = true
			return line, nil
		}
		to := l.buf
		if len(to) < 4*maxLine { // small texts need no more; large ones soon have enough
			to = make([]byte, 2*len(l.buf))
		}
		copy(to, l.buf[l.start:l.end])
		l.buf = to
		l.end -= l.start
		l.start, searched = 0, l.end
		n, err := l.r.Read(l.buf[l.end:])
		if l.idle++; n > 0 {
			l.idle = 0
		} else if err == nil && l.idle > 100 {
			return nil, io.ErrNoProgress
		}
		l.end += n
		if l.total += int64(n); l.total > l.limit {
			l.line++
			return nil, errTooLarge
		}
		if err == io.EOF {
			l.ended = true
		} else if err != nil {
			return nil, err
		}
	}
}
