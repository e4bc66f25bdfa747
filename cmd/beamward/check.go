package main

import (
	"errors"
	"fmt"

	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/service/config"
)

func checkCommand(out *console) *cobra.Command {
	var from configFlag
	var layout string
	c := &cobra.Command{
		Use:   "check --config FILE [--layout FILE] [LIST...]",
		Short: "Read a configuration and closure lists, say what was understood, keep nothing",
		Long: `Reads the configuration, the lists in the authorities' folders and the lists that
are named, in this order, each as if those before it were in force. Says what was
understood of each and what it changes. One bad line refuses a list whole, and
every bad line is told. Nothing is kept.

With --layout the named lists are read by that layout, line by line.`,
		RunE: func(_ *cobra.Command, args []string) error {
			cfg, err := from.load()
			var bad *config.Error
			if out.json && errors.As(err, &bad) {
				if err := out.document(map[string]any{"file": from.path, "good": false, "problems": problemsOf(bad)}); err != nil {
					return err
				}
			}
			if err != nil {
				return err
			}
			return check(out, cfg, from.path, layout, args)
		},
	}
	from.on(c)
	c.Flags().StringVar(&layout, "layout", "", "read the named lists by this layout `file`, and say what each line was taken for")
	return c
}

// check reads and tells all, and fails if one list cannot be taken.
func check(out *console, c *config.Config, path, layout string, named []string) error {
	own, err := newListReader(c, "")
	if err != nil {
		return err
	}
	by := own
	if layout != "" {
		if by, err = newListReader(nil, layout); err != nil {
			return err
		}
	}
	doc := checked{File: path, Good: true, RulesDigest: c.Rules.Digest.String(), Understood: understood(c), Cautions: cautions(c.Rules), Lists: []checkedList{}}
	if !out.json {
		out.printf("config %s is good\n", path)
		for _, line := range doc.Understood {
			out.printf("%s\n", line)
		}
		for _, line := range doc.Cautions {
			out.printf("Caution: %s\n", line)
		}
	}
	s := &shelf{rules: c.Rules}
	var told []error
	for _, l := range checkable(c, own, by, named, layout != "") {
		one := s.check(&l)
		if one.err != nil {
			told = append(told, one.err)
		}
		doc.Lists = append(doc.Lists, one.checkedList)
		if !out.json {
			writeChecked(out, &l, &one)
		}
	}
	if out.json {
		if err := out.document(doc); err != nil {
			return err
		}
	}
	return errors.Join(told...)
}

// checkable reads the folders' lists in order of issue, then the named ones as
// they come.
func checkable(c *config.Config, own, by *listReader, named []string, explain bool) []readList {
	var lists []readList
	for _, f := range c.Folders {
		files, _ := filesOf(f.Path) // a folder that is not there yet holds no list
		for _, path := range files {
			lists = append(lists, own.read(path, false))
		}
	}
	sortByIssue(lists)
	for _, path := range named {
		lists = append(lists, by.read(path, explain))
	}
	return lists
}

type checked struct {
	File        string        `json:"file"`
	Good        bool          `json:"good"`
	RulesDigest string        `json:"rules_digest"`
	Understood  []string      `json:"understood"`
	Cautions    []string      `json:"cautions"`
	Lists       []checkedList `json:"lists"`
}

type checkedList struct {
	File    string            `json:"file"`
	Taken   bool              `json:"taken"`
	Format  string            `json:"format,omitempty"`
	Layout  string            `json:"layout,omitempty"`
	Change  string            `json:"change,omitempty"` // same, tightens or loosens
	Effect  string            `json:"effect,omitempty"`
	Summary *listSummary      `json:"summary,omitempty"`
	Refusal *listfile.Refusal `json:"refusal,omitempty"`
	Cause   string            `json:"cause,omitempty"`
	Lines   []listfile.Taken  `json:"lines,omitempty"`
}

// checkedWithError is a checked list with what is not JSON.
type checkedWithError struct {
	checkedList
	summary *listfile.Summary
	err     error
}

// check says what a list that was read would do to the shelf, and puts it there.
func (s *shelf) check(l *readList) checkedWithError {
	one := checkedWithError{checkedList: checkedList{File: l.path, Format: l.report.Format.String(), Layout: l.report.Layout, Lines: l.lines}}
	if l.err != nil {
		if !errors.As(l.err, &one.Refusal) {
			one.Cause = l.err.Error()
		}
		one.err = l.told()
		return one
	}
	sum := listfile.Summarise(l.list.Text())
	one.summary, one.Summary = &sum, summaryOf(&sum)
	same, tightens, err := s.offer(l.list, l.path)
	switch {
	case err != nil:
		one.Cause = err.Error()
		one.err = fmt.Errorf("%s: %w", l.path, err)
		return one
	case same:
		one.Change, one.Effect = "same", "it is there already"
	case tightens:
		one.Change, one.Effect = "tightens", "it only closes: it would take effect at once"
	default:
		one.Change, one.Effect = "loosens", "it opens time: "+waitsFor(s.rules.Authority(l.list.Authority()))
	}
	one.Taken = true
	return one
}

func waitsFor(a *closures.AuthorityRules) string {
	switch {
	case a == nil:
		return "its authority is not configured"
	case a.Loosening == closures.LooseningAtOnce:
		return "its authority's rule lets it take effect at once"
	case a.Loosening == closures.LooseningConfirm:
		return "it would wait until a person confirms it, and close meanwhile"
	}
	return "it would wait until a second person confirms it, and close meanwhile"
}

func writeChecked(out *console, l *readList, one *checkedWithError) {
	out.printf("\n")
	if len(one.Lines) > 0 {
		out.printf("%s, line by line:\n", l.path)
		_ = listfile.WriteExplanation(out, one.Lines)
	}
	if one.summary != nil {
		_ = one.summary.WriteText(out)
	}
	switch {
	case one.Taken:
		out.printf("%s: %s\n", l.path, one.Effect)
	case one.Refusal != nil:
		out.printf("%s: refused whole: %d bad in all\n", l.path, one.Refusal.Total)
	default:
		out.printf("%s: refused\n", l.path)
	}
}
