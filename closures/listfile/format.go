package listfile

import (
	"bytes"
	"math"
	"path"
	"strings"
)

// Format is the form a closure list is written in.
type Format uint8

// The native formats. Auto looks at the text. Text is what a layout reads, and
// Read does not.
const (
	Auto Format = iota
	YAML
	JSON
	CSV
	Text
)

// String returns the format's word.
func (f Format) String() string {
	switch f {
	case YAML:
		return "yaml"
	case JSON:
		return "json"
	case CSV:
		return "csv"
	case Text:
		return "text"
	}
	return "auto"
}

// ParseFormat reads what String writes.
func ParseFormat(s string) (Format, bool) {
	for f := Auto; f <= CSV; f++ {
		if f.String() == s {
			return f, true
		}
	}
	return Auto, false
}

// FormatOf returns the format that a file's name says, Auto when it says none.
func FormatOf(name string) Format {
	switch strings.ToLower(path.Ext(name)) {
	case ".yaml", ".yml":
		return YAML
	case ".json":
		return JSON
	case ".csv":
		return CSV
	}
	return Auto
}

// sniff tells the format from the beginning of a text. A wrong guess does no
// harm: each format's reader refuses the others.
func sniff(head []byte) Format {
	text := bytes.TrimLeft(head, " \t\r\n")
	switch {
	case bytes.HasPrefix(text, []byte("{")):
		return JSON
	case bytes.HasPrefix(text, []byte("# closure_list:")), bytes.HasPrefix(text, []byte(csvHeader[:12])):
		return CSV
	}
	return YAML
}

// Limits bounds what one reading may take. A zero field stands for its
// default.
type Limits struct {
	Bytes   int64 // of text: 256 MiB; YAML and layouts at most 16 MiB
	Windows int   // 2,000,000; YAML at most 50,000
	Regions int   // 500,000
	Points  int   // of all tracks together: 1,000,000
}

// Recorded returns the limits for reading back the canonical form of what was
// accepted once.
func Recorded() Limits {
	return Limits{Bytes: math.MaxInt64, Windows: math.MaxInt32, Regions: math.MaxInt32, Points: math.MaxInt32}
}

const (
	yamlBytes   = 16 << 20
	yamlWindows = 50_000
	yamlItems   = 1_000_000 // bounds the memory of the tree; 50,000 windows take some 300,000
	mebibyte    = 1 << 20
)

// filled returns l with its defaults in place of zeros and of nonsense.
func (l Limits) filled() Limits {
	if l.Bytes <= 0 {
		l.Bytes = 256 * mebibyte
	}
	if l.Windows <= 0 {
		l.Windows = 2_000_000
	}
	if l.Regions <= 0 {
		l.Regions = 500_000
	}
	if l.Points <= 0 {
		l.Points = 1_000_000
	}
	return l
}

// Report says what was read, whether or not it was accepted.
type Report struct {
	Format Format
	Layout string // name of the layout, for a text read through one
	Bytes  int64
	Lines  int
}
