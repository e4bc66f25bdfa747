package main

import (
	"runtime"
	"runtime/debug"

	"github.com/spf13/cobra"
)

// build says what this program was made from.
type build struct {
	Version  string `json:"version"`
	Revision string `json:"revision,omitempty"`
	Changed  bool   `json:"changed,omitempty"` // the working tree held more than the revision
	Go       string `json:"go"`
	Platform string `json:"platform"`
	Level    string `json:"level,omitempty"` // GOAMD64 or its like: another level may round otherwise
}

func thisBuild() build {
	b := build{Version: "(devel)", Go: runtime.Version(), Platform: runtime.GOOS + "/" + runtime.GOARCH}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return b
	}
	if v := info.Main.Version; v != "" {
		b.Version = v
	}
	for _, s := range info.Settings {
		switch s.Key {
		case "vcs.revision":
			b.Revision = s.Value
		case "vcs.modified":
			b.Changed = s.Value == "true"
		case "GOAMD64", "GOARM64", "GOARM", "GOPPC64", "GORISCV64":
			b.Level = s.Key + "=" + s.Value
		}
	}
	return b
}

// String is the build on one line, as the record keeps it.
func (b build) String() string {
	s := "beamward " + b.Version
	if b.Revision != "" {
		s += " " + b.Revision
	}
	if b.Changed {
		s += " with changes"
	}
	s += " " + b.Go + " " + b.Platform
	if b.Level != "" {
		s += " " + b.Level
	}
	return s
}

func versionCommand(out *console) *cobra.Command {
	return &cobra.Command{
		Use:   "version",
		Short: "Say what this program was built from",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			b := thisBuild()
			if out.json {
				return out.document(b)
			}
			out.printf("%s\n", b)
			return nil
		},
	}
}
