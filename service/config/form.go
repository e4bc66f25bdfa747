package config

import (
	"net"
	"net/netip"
	"regexp"
	"strings"
	"time"
	_ "time/tzdata" // a site's zone has to be known on a machine without the database, too

	"beamward/closures"
)

// form is what a text has to look like.
type form struct {
	ok      func(string) bool
	mend    string
	pattern string // for the schema; empty: any text
}

// forms are the forms of texts by name; they never change.
var forms = map[string]form{
	"": {func(s string) bool { return s != "" && len(s) <= 200 },
		"write 1 to 200 printable characters on one line", ""},
	"name": {closures.ValidName, "make it 1 to 64 of the characters A-Z a-z 0-9 . _ -", `^[A-Za-z0-9._-]{1,64}$`},
	"path": {func(s string) bool { return s != "" }, "write a path of printable characters", ""},
	"zone": {isZone, "name a zone of the IANA database, such as Atlantic/St_Helena, or UTC", ""},
	"listen": {isListen, "write an IP address, or localhost, and a port, such as 127.0.0.1:8460 or [::1]:8460",
		`^(localhost|[0-9.]+|\[[0-9a-fA-F:.]+\])?:[0-9]{1,5}$`},
	"dial": {isDial, "write a host and a port, such as 127.0.0.1:30002", `^.+:[0-9]{1,5}$`},
	"time_of_day": {regexp.MustCompile(`^([01][0-9]|2[0-3]):[0-5][0-9]$`).MatchString,
		`write hh:mm, "00:00" to "23:59"`, `^([01][0-9]|2[0-3]):[0-5][0-9]$`},
	"address24": {regexp.MustCompile(`^[0-9a-f]{6}$`).MatchString,
		"write a 24-bit address: six digits of 0-9 a-f", `^[0-9a-f]{6}$`},
	"edition": {regexp.MustCompile(`^[0-9]\.[0-9]{1,2}$`).MatchString,
		"write an edition, such as 2.4", `^[0-9]\.[0-9]{1,2}$`},
}

func isZone(s string) bool {
	// "Local" depends on the machine and "" means UTC by accident.
	if s == "" || s == "Local" {
		return false
	}
	_, err := time.LoadLocation(s)
	return err == nil
}

var portForm = regexp.MustCompile(`^(0|[1-9][0-9]{0,4})$`)

// port returns the port in s, or -1.
func port(s string) int {
	if !portForm.MatchString(s) {
		return -1
	}
	n := 0
	for _, c := range s {
		n = 10*n + int(c-'0')
	}
	if n > 65535 {
		return -1
	}
	return n
}

// isListen wants an address whose interface is plain to see: a host name may
// turn into any.
func isListen(s string) bool {
	host, p, err := net.SplitHostPort(s)
	if err != nil || port(p) < 0 {
		return false
	}
	if host == "" || host == "localhost" {
		return true
	}
	ip, err := netip.ParseAddr(host)
	return err == nil && ip.Zone() == "" && strings.Contains(s, "[") == ip.Is6()
}

var hostForm = regexp.MustCompile(`^[A-Za-z0-9]([A-Za-z0-9.-]{0,251}[A-Za-z0-9])?$`)

func isDial(s string) bool {
	host, p, err := net.SplitHostPort(s)
	if err != nil || port(p) < 1 {
		return false
	}
	if _, err := netip.ParseAddr(host); err == nil {
		return true
	}
	return hostForm.MatchString(host)
}

// isLoopback reports whether an address that isListen took is reached from
// this machine alone.
func isLoopback(s string) bool {
	host, _, err := net.SplitHostPort(s)
	if err != nil {
		return false
	}
	if host == "localhost" {
		return true
	}
	ip, err := netip.ParseAddr(host)
	return err == nil && ip.Unmap().IsLoopback()
}
