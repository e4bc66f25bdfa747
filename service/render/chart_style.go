package render

import (
	"slices"
	"strings"

	"beamward/closures"
)

// classOf names a reason's pattern and mark.
func classOf(c closures.Code) string {
	switch c {
	case closures.CodeListedClosure:
		return "listed"
	case closures.CodeNotCovered:
		return "uncovered"
	case closures.CodeFieldCrossing:
		return "crossing"
	case closures.CodeHold:
		return "hold"
	case closures.CodeElevationLimit:
		return "elevation"
	case closures.CodeDaylight:
		return "daylight"
	}
	return "other"
}

// attributes are the light look of classes as plain attributes, the later class
// before the earlier, so that a viewer without style sheets, or one that is not
// allowed them, shows it too.
func attributes(classes string) string {
	var names, values []string
	for _, class := range strings.Fields(classes) {
		for look := lightLook(class); look != ""; {
			name, rest, _ := strings.Cut(look, `="`)
			value, more, _ := strings.Cut(rest, `"`)
			look = strings.TrimPrefix(more, " ")
			if i := slices.Index(names, name); i >= 0 {
				values[i] = value
				continue
			}
			names, values = append(names, name), append(values, value)
		}
	}
	var out strings.Builder
	for i, name := range names {
		out.WriteString(" " + name + `="` + values[i] + `"`)
	}
	return out.String()
}

func lightLook(class string) string {
	switch class {
	case "b-listed":
		return `fill="#fbdcd8"`
	case "l-listed":
		return `fill="none" stroke="#a3201a" stroke-width="1.1"`
	case "b-uncovered":
		return `fill="#ececec"`
	case "l-uncovered":
		return `fill="none" stroke="#4d4d4d" stroke-width="2.4" stroke-linecap="round"`
	case "b-crossing":
		return `fill="#d9e5fb"`
	case "l-crossing":
		return `fill="none" stroke="#1d4fa8" stroke-width="1.7"`
	case "b-hold":
		return `fill="#fde6c4"`
	case "l-hold":
		return `fill="none" stroke="#8a4b00" stroke-width="2"`
	case "b-elevation":
		return `fill="#eff1f3"`
	case "l-elevation":
		return `fill="none" stroke="#8b959e" stroke-width="0.9"`
	case "b-daylight":
		return `fill="#fff4cf"`
	case "l-daylight":
		return `fill="none" stroke="#a98a1f" stroke-width="1"`
	case "b-other":
		return `fill="#f0e3f6"`
	case "l-other":
		return `fill="none" stroke="#6d3591" stroke-width="1"`
	case "page":
		return `fill="#ffffff"`
	case "title":
		return `fill="#171c21" font-size="19" font-weight="600"`
	case "name":
		return `fill="#171c21" font-size="13"`
	case "small":
		return `fill="#3c464f" font-size="12"`
	case "strong":
		return `font-weight="600"`
	case "tiny":
		return `fill="#171c21" font-size="10.5"`
	case "plot":
		return `fill="#ffffff"`
	case "track":
		return `fill="#ffffff" stroke="#9aa4ad" stroke-width="0.5"`
	case "rule":
		return `stroke="#dde2e6" stroke-width="1"`
	case "hour":
		return `stroke="#9aa4ad" stroke-width="0.6"`
	case "dusk":
		return `stroke="#5a6672" stroke-width="0.9" stroke-dasharray="5 3"`
	case "edge":
		return `stroke="#5a6672" stroke-width="0.6"`
	case "sun0":
		return `fill="#fff0c2"`
	case "sun1":
		return `fill="#eaeff7"`
	case "sun2":
		return `fill="#dbe4f1"`
	case "sun3":
		return `fill="#ccd8ea"`
	case "sun4":
		return `fill="#bccbe2"`
	case "allowed":
		return `fill="#0b6b4f" stroke="#06402f" stroke-width="0.8"`
	case "onallowed":
		return `fill="#ffffff" font-weight="600"`
	case "plate":
		return `fill="#ffffff" fill-opacity="0.86"`
	case "placed":
		return `fill="#ffffff" stroke="#171c21" stroke-width="2"`
	case "mark":
		return `fill="#171c21" stroke="none"`
	case "mark-listed":
		return `fill="#a3201a"`
	case "mark-uncovered":
		return `fill="#ffffff" stroke="#3c464f" stroke-width="1.3"`
	case "mark-crossing":
		return `fill="none" stroke="#1d4fa8" stroke-width="1.8"`
	case "mark-hold":
		return `fill="#8a4b00"`
	case "mark-elevation":
		return `fill="#5a6672"`
	case "mark-daylight":
		return `fill="#8a6d00"`
	}
	return ""
}

// chartStyle is the dark look, for screens alone: paper stays light.
const chartStyle = `
svg{print-color-adjust:exact;-webkit-print-color-adjust:exact}
@media screen and (prefers-color-scheme:dark){
.page,.plot{fill:#10151a}
.title,.name,.tiny{fill:#e9eef2}
.small{fill:#b9c4cd}
.track{fill:#10151a;stroke:#55616c}
.rule{stroke:#262f37}
.hour{stroke:#55616c}
.dusk,.edge{stroke:#8b98a4}
.sun0{fill:#5b4f22}.sun1{fill:#39476a}.sun2{fill:#2c3856}.sun3{fill:#212b44}.sun4{fill:#182035}
.allowed{fill:#46c795;stroke:#b9f2dc}
.onallowed{fill:#04231a}
.plate{fill:#10151a}
.placed{fill:#10151a;stroke:#ffffff}
.mark{fill:#e9eef2}
.mark-listed{fill:#ff8f85}.mark-hold{fill:#ffb75e}.mark-elevation{fill:#a7b3bd}.mark-daylight{fill:#ecc94b}
.mark-uncovered{fill:#10151a;stroke:#cfd8df}.mark-crossing{fill:none;stroke:#8db6ff}
.b-listed{fill:#41191a}.l-listed{stroke:#ff8f85}
.b-uncovered{fill:#2a2f34}.l-uncovered{stroke:#b4bcc3}
.b-crossing{fill:#16264a}.l-crossing{stroke:#8db6ff}
.b-hold{fill:#3d2a10}.l-hold{stroke:#e39b40}
.b-elevation{fill:#1a2127}.l-elevation{stroke:#5d6973}
.b-daylight{fill:#38310f}.l-daylight{stroke:#b99b32}
.b-other{fill:#2f1d3b}.l-other{stroke:#c79be6}
}
`
