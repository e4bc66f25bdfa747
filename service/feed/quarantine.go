package feed

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"strings"
	"time"

	"beamward/closures/listfile"
)

// refuse moves a file out of the way, with the reason in a text beside it. One
// that cannot be moved is left, and not read again until it changes.
func (f *Folder) refuse(root *os.Root, c *candidate, cause error) {
	c.done, c.digest = true, [32]byte{}
	at := f.options.Clock.Wall()
	r := FileRefusal{At: at, Name: printable([]byte(c.name), shownBytes), Cause: printable([]byte(cause.Error()), 8*shownBytes)}
	f.mu.Lock()
	f.stats.Refused++
	if f.refusals = append(f.refusals, r); len(f.refusals) > keptRefusals {
		f.refusals = f.refusals[1:]
	}
	f.mu.Unlock()
	f.notice("a closure list is refused", "authority", f.options.Authority, "file", r.Name, "cause", r.Cause)
	if err := quarantine(root, c, at, cause); err != nil {
		c.stuck = "a refused file cannot be moved into " + refusedFolder + ": " + printable([]byte(err.Error()), 2*shownBytes)
		f.problem = c.stuck
		return
	}
	delete(f.known, c.name)
}

func quarantine(root *os.Root, c *candidate, at time.Time, cause error) error {
	if err := root.Mkdir(refusedFolder, 0o755); err != nil && !errors.Is(err, fs.ErrExist) {
		return err
	}
	if info, err := root.Lstat(refusedFolder); err != nil || !info.IsDir() {
		return errors.New("it is no folder")
	}
	to, err := freeName(root, c.name, at)
	if err != nil {
		return err
	}
	if !inPlace(root, c.name, c.info) {
		return nil // another file has its name now, which is looked at by itself
	}
	if err := root.Rename(c.name, to); err != nil {
		return err
	}
	if moved, err := root.Lstat(to); err == nil && !os.SameFile(moved, c.info) {
		// It was replaced in that very instant: the new one is a list in its
		// own right.
		if _, err := root.Lstat(c.name); errors.Is(err, fs.ErrNotExist) {
			return root.Rename(to, c.name)
		}
	}
	return root.WriteFile(to+".txt", []byte(reason(c.name, at, cause)), 0o644)
}

// freeName finds a name in the folder for refused files that none has yet.
func freeName(root *os.Root, name string, at time.Time) (string, error) {
	if len(name) > 200 { // names have an end, at 255 bytes for most
		name = name[:200]
	}
	base := refusedFolder + "/" + name
	for i := range 1000 {
		to := base
		if i > 0 {
			to = fmt.Sprintf("%s.%s.%d", base, at.UTC().Format("20060102T150405Z"), i)
		}
		_, first := root.Lstat(to)
		_, second := root.Lstat(to + ".txt")
		if errors.Is(first, fs.ErrNotExist) && errors.Is(second, fs.ErrNotExist) {
			return to, nil
		}
	}
	return "", errors.New("too many refused files of this name: take some out")
}

// reason is the text beside a refused file.
func reason(name string, at time.Time, cause error) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s\nrefused %s\n\n%s\n", printable([]byte(name), 255), at.UTC().Format(time.RFC3339), printable([]byte(cause.Error()), 4096))
	var lines *listfile.Refusal
	if errors.As(cause, &lines) {
		b.WriteString("\n")
		for _, l := range lines.Lines {
			if l.Line > 0 {
				fmt.Fprintf(&b, "line %d: ", l.Line)
			}
			b.WriteString(l.Cause)
			if l.Mend != "" {
				fmt.Fprintf(&b, ": %s", l.Mend)
			}
			if l.Text != "" {
				fmt.Fprintf(&b, "\n    %s", l.Text)
			}
			b.WriteString("\n")
		}
		if more := lines.Total - len(lines.Lines); more > 0 {
			fmt.Fprintf(&b, "and %d more\n", more)
		}
	}
	b.WriteString("\nMend the list, then put it into the folder again. What was in force stays so.\n")
	return b.String()
}
