package config

import (
	"fmt"
	"sort"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Problem is one thing in a file that cannot be met.
type Problem struct {
	Line  int    // from 1; 0: the text as a whole
	Key   string // such as beams[north].limits.elevation_min_deg; entries without a name as beams[#1]; empty: the text itself
	Value string // as written; empty: it is missing, or is not one value
	Mend  string // what is wrong or what to write instead
}

// String returns "line N: key: value: mend".
func (p Problem) String() string {
	parts := make([]string, 0, 4)
	if p.Line > 0 {
		parts = append(parts, "line "+strconv.Itoa(p.Line))
	}
	for _, s := range []string{p.Key, p.Value, p.Mend} {
		if s != "" {
			parts = append(parts, s)
		}
	}
	return strings.Join(parts, ": ")
}

// Error is every problem that was found in one text, in order of the lines.
type Error struct {
	File     string // empty: the text came from no file
	Problems []Problem
}

// Error returns one problem a line, each with the file's name.
func (e *Error) Error() string {
	lines := make([]string, len(e.Problems))
	for i, p := range e.Problems {
		lines[i] = p.String()
		if e.File != "" {
			lines[i] = fmt.Sprintf("config %s: %s", e.File, p)
		}
	}
	return strings.Join(lines, "\n")
}

// ordered sorts problems by line, then key.
func ordered(ps []Problem) []Problem {
	sort.SliceStable(ps, func(i, j int) bool {
		if ps[i].Line != ps[j].Line {
			return ps[i].Line < ps[j].Line
		}
		return ps[i].Key < ps[j].Key
	})
	return ps
}

// shown makes a written value fit to print: short, on one line, and quoted
// where it holds what a terminal would act on. Nothing written is shown as "".
func shown(s string) string {
	const most = 80
	whole := s
	if len(s) > most {
		s = s[:most]
		for len(s) > 0 && !utf8.ValidString(s) {
			s = s[:len(s)-1]
		}
	}
	dots := ""
	if len(s) < len(whole) {
		dots = "…"
	}
	for _, r := range s {
		if !unicode.IsPrint(r) {
			return strconv.Quote(s) + dots
		}
	}
	if strings.TrimSpace(s) != s || s == "" {
		return strconv.Quote(s) + dots
	}
	return s + dots
}

// nearest returns the known word that a slip of the finger may have meant.
func nearest(word string, known []string) string {
	best, least := "", 3
	for _, k := range known {
		if d := edits(word, k); d < least && d < len(k) {
			best, least = k, d
		}
	}
	return best
}

// edits counts the insertions, deletions and replacements between two words
// (Levenshtein 1966), of which one may be as long as a file allows: it gives
// up on words over 64 bytes.
func edits(a, b string) int {
	if len(a) > 64 || len(b) > 64 {
		return 64
	}
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := 1; i <= len(a); i++ {
		diagonal := row[0]
		row[0] = i
		for j := 1; j <= len(b); j++ {
			cost := diagonal
			if a[i-1] != b[j-1] {
				cost++
			}
			diagonal = row[j]
			row[j] = min(cost, row[j]+1, row[j-1]+1)
		}
	}
	return row[len(b)]
}
