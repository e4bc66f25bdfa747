package access

import (
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"net/netip"
	"os"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

func guard(t testing.TB, o Options) *Guard {
	t.Helper()
	g, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// ask sends one request through the guard and returns the answer and who got
// in.
func ask(g *Guard, edit func(*http.Request)) (*http.Response, Person) {
	r := httptest.NewRequest("GET", "http://127.0.0.1:8460/v1/beams", nil)
	r.RemoteAddr = "127.0.0.1:40000"
	if edit != nil {
		edit(r)
	}
	var in Person
	w := httptest.NewRecorder()
	g.Middleware(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		in, _ = PersonOf(r.Context())
		w.WriteHeader(http.StatusNoContent)
	})).ServeHTTP(w, r)
	return w.Result(), in
}

func bearer(s Secret) func(*http.Request) {
	return func(r *http.Request) { r.Header.Set("Authorization", "Bearer "+s.Reveal()) }
}

func TestWhoMayDoWhat(t *testing.T) {
	all := []Action{Nothing, See, Shutter, Tell, Act, Administer}
	for role, want := range map[Role]string{
		NoRole:   "......",
		Read:     ".ss...",
		Feed:     "..st..",
		Operate:  ".ssta.",
		Admin:    ".sstaa",
		Role(99): "......",
	} {
		got := ""
		for i, a := range all {
			if role.May(a) {
				got += string(".sstaa"[i])
			} else {
				got += "."
			}
		}
		if got != want {
			t.Errorf("%v may %s, want %s", role, got, want)
		}
	}
	for r := Read; r <= Admin; r++ {
		if p, ok := ParseRole(r.String()); !ok || p != r {
			t.Errorf("%v is read as %v", r, p)
		}
		if (Person{Role: r}).May(See) {
			t.Error("someone without a name may see")
		}
	}
	for _, s := range []string{"", "root", "Read", "admin "} {
		if r, ok := ParseRole(s); ok || r != NoRole {
			t.Errorf("%q is read as %v", s, r)
		}
	}
}

func TestSecondPerson(t *testing.T) {
	ada, bob := Person{Name: "ada", Token: true}, Person{Name: "bob", Token: true}
	for _, c := range []struct {
		a, b Person
		want bool
	}{
		{ada, bob, true}, {bob, ada, true}, {ada, ada, false}, {ada, Person{Name: "ADA", Token: true}, false},
		{ada, Person{Name: LocalName}, false}, {Person{Name: LocalName}, ada, false}, {Person{}, Person{}, false},
		{ada, Person{Token: true}, false}, {Person{Name: LocalName}, Person{Name: LocalName}, false},
	} {
		if got := SecondPerson(c.a, c.b); got != c.want {
			t.Errorf("%+v and %+v: %v", c.a, c.b, got)
		}
	}
}

func TestTokensLetTheirHoldersIn(t *testing.T) {
	f := newFile(t)
	ada := add(t, f, "ada", Operate, "spotter-east")
	bus := add(t, f, "bus", Feed, "north", "catwalk")
	g := guard(t, Options{TokensFile: string(f)})

	res, p := ask(g, bearer(ada))
	if res.StatusCode != 204 || p.Name != "ada" || p.Role != Operate || !p.Token {
		t.Errorf("%d, %+v", res.StatusCode, p)
	}
	if !p.MaySpeakFor("spotter-east") || p.MaySpeakFor("catwalk") || p.MaySpeakFor("") {
		t.Error("ada speaks for others")
	}
	if !g.Still(p) || !g.Named() || g.Err() != nil {
		t.Error("ada is not still there")
	}
	_, p = ask(g, bearer(bus))
	if !p.MaySpeakFor("catwalk") || !p.MaySpeakFor("north") || p.MaySpeakFor("spotter-east") || p.May(See) || p.May(Act) {
		t.Errorf("bus may too much: %+v", p)
	}
	if _, p = ask(g, func(r *http.Request) { r.Header.Set("Authorization", "bearer  "+ada.Reveal()) }); p.Name != "ada" {
		t.Error("the scheme's case matters")
	}

	unknown := mint()
	for name, edit := range map[string]func(*http.Request){
		"nothing":            nil,
		"an unknown token":   bearer(unknown),
		"no token":           func(r *http.Request) { r.Header.Set("Authorization", "Bearer ") },
		"no scheme":          func(r *http.Request) { r.Header.Set("Authorization", ada.Reveal()) },
		"another scheme":     func(r *http.Request) { r.SetBasicAuth("ada", ada.Reveal()) },
		"half a token":       func(r *http.Request) { r.Header.Set("Authorization", "Bearer "+ada.Reveal()[:40]) },
		"two headers":        func(r *http.Request) { bearer(ada)(r); r.Header.Add("Authorization", "Bearer "+bus.Reveal()) },
		"a cookie":           func(r *http.Request) { r.AddCookie(&http.Cookie{Name: "token", Value: ada.Reveal()}) },
		"the digest":         func(r *http.Request) { r.Header.Set("Authorization", "Bearer "+fmt.Sprintf("%x", ada.digest())) },
		"another's and mine": func(r *http.Request) { r.Header.Set("Authorization", "Bearer "+ada.Reveal()+", "+bus.Reveal()) },
	} {
		res, p := ask(guard(t, Options{TokensFile: string(f)}), edit)
		if res.StatusCode != 401 || p.Name != "" || res.Header.Get("WWW-Authenticate") != `Bearer realm="beamward"` {
			t.Errorf("%s: %d, %+v, %v", name, res.StatusCode, p, res.Header)
		}
		body, _ := io.ReadAll(res.Body)
		var problem struct{ Status int }
		if json.Unmarshal(body, &problem) != nil || problem.Status != 401 || res.Header.Get("Content-Type") != "application/problem+json" {
			t.Errorf("%s: answered with %s", name, body)
		}
		if strings.Contains(string(body), "bw_") {
			t.Errorf("%s: the answer shows a token", name)
		}
	}
}

func TestTokenInTheURL(t *testing.T) {
	f := newFile(t)
	ada := add(t, f, "ada", Operate)
	for _, url := range []string{"/v1/beams?token=" + ada.Reveal(), "/v1/beams?access_token=" + ada.Reveal(), "/" + ada.Reveal()} {
		var denied Denial
		g := guard(t, Options{TokensFile: string(f), Denied: func(d Denial) { denied = d }})
		res, p := ask(g, func(r *http.Request) {
			bearer(ada)(r)
			u := httptest.NewRequest("GET", "http://127.0.0.1:8460"+url, nil).URL
			r.URL = u
		})
		if res.StatusCode != 400 || p.Name != "" {
			t.Errorf("%s: %d", url, res.StatusCode)
		}
		if strings.Contains(denied.Error(), ada.Reveal()[3:]) {
			t.Error("the refusal shows the token")
		}
	}
}

// A change of the file holds within a second, and a file that broke lets
// nobody in until it is mended.
func TestChangesHoldWithinASecond(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		f := newFile(t)
		ada := add(t, f, "ada", Operate)
		bob := add(t, f, "bob", Operate)
		g := guard(t, Options{TokensFile: string(f)})
		_, p := ask(g, bearer(ada))
		if p.Name != "ada" {
			t.Fatal("ada is not let in")
		}
		if err := f.Revoke("ada"); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Second)
		if res, _ := ask(g, bearer(ada)); res.StatusCode != 401 {
			t.Errorf("a second after the revocation: %d", res.StatusCode)
		}
		if g.Still(p) {
			t.Error("ada is still there")
		}
		if _, p := ask(g, bearer(bob)); p.Name != "bob" {
			t.Error("bob lost his token, too")
		}

		eve := add(t, f, "eve", Read)
		time.Sleep(time.Second)
		if _, p := ask(g, bearer(eve)); p.Name != "eve" {
			t.Error("eve is not let in")
		}

		_, bobIn := ask(g, bearer(bob))
		good, err := os.ReadFile(string(f))
		if err != nil {
			t.Fatal(err)
		}
		for name, spoil := range map[string]func() error{
			"gone":     func() error { return os.Remove(string(f)) },
			"broken":   func() error { return os.WriteFile(string(f), good[:len(good)-5], 0o600) },
			"readable": func() error { return os.Chmod(string(f), 0o644) },
			"emptied":  func() error { return os.Truncate(string(f), 0) },
		} {
			if err := spoil(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(time.Second)
			res, _ := ask(g, bearer(bob))
			if res.StatusCode != 503 || res.Header.Get("Retry-After") != "1" || g.Err() == nil || g.Still(bobIn) {
				t.Errorf("%s: %d, %v", name, res.StatusCode, g.Err())
			}
			if strings.Contains(fmt.Sprint(res.Body), string(f)) {
				t.Errorf("%s: the answer names the file", name)
			}
			os.Remove(string(f))
			if err := os.WriteFile(string(f), good, 0o600); err != nil {
				t.Fatal(err)
			}
			time.Sleep(time.Second)
			if _, p := ask(g, bearer(bob)); p.Name != "bob" || g.Err() != nil {
				t.Errorf("%s, then mended: %+v, %v", name, p, g.Err())
			}
		}

		// The same name with another role is no longer whom we let in.
		if err := f.Revoke("bob"); err != nil {
			t.Fatal(err)
		}
		add(t, f, "bob", Read)
		time.Sleep(time.Second)
		if g.Still(bobIn) {
			t.Error("bob's old token is still good")
		}
	})
}

func TestFailuresAreLimitedByAddress(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		f := newFile(t)
		ada := add(t, f, "ada", Operate)
		denials := map[int]int{}
		g := guard(t, Options{TokensFile: string(f), Denied: func(d Denial) { denials[d.Status]++ }})
		from := func(addr string, s Secret) func(*http.Request) {
			return func(r *http.Request) { bearer(s)(r); r.RemoteAddr = addr }
		}
		for i := range 30 {
			res, _ := ask(g, from("192.0.2.7:1", mint()))
			want := 401
			if i >= failBurst {
				want = 429
			}
			if res.StatusCode != want {
				t.Fatalf("attempt %d: %d", i, res.StatusCode)
			}
			if want == 429 && res.Header.Get("Retry-After") != "6" {
				t.Fatalf("retry after %q", res.Header.Get("Retry-After"))
			}
		}
		if denials[401] != failBurst || denials[429] != 20 {
			t.Errorf("told of %v", denials)
		}
		// Others, and the right token from the same address, are not in the way.
		if res, _ := ask(g, from("192.0.2.8:1", mint())); res.StatusCode != 401 {
			t.Errorf("another address: %d", res.StatusCode)
		}
		if _, p := ask(g, from("192.0.2.7:1", ada)); p.Name != "ada" {
			t.Error("the right token is locked out")
		}
		if res, _ := ask(g, from("[::ffff:192.0.2.7]:1", mint())); res.StatusCode != 429 {
			t.Errorf("the same address mapped: %d", res.StatusCode)
		}
		time.Sleep(failEvery)
		if res, _ := ask(g, from("192.0.2.7:1", mint())); res.StatusCode != 401 {
			t.Errorf("after a while: %d", res.StatusCode)
		}
		// One IPv6 network is one sender.
		for i := range 2 * failBurst {
			res, _ := ask(g, from(fmt.Sprintf("[2001:db8::%x]:1", i), mint()))
			if want := map[bool]int{true: 401, false: 429}[i < failBurst]; res.StatusCode != want {
				t.Fatalf("address %d of the network: %d", i, res.StatusCode)
			}
		}
	})
}

func TestFailuresOfManyAddressesTakeLittleMemory(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		var f fails
		for i := range 5 * failsKept {
			f.allow(netip.AddrFrom4([4]byte{10, 0, byte(i >> 8), byte(i)}))
		}
		if len(f.by) != failsKept {
			t.Errorf("%d are kept", len(f.by))
		}
		if f.allow(netip.AddrFrom4([4]byte{11, 0, 0, 1})) {
			t.Error("one address more is not limited")
		}
		time.Sleep(2 * failWindow)
		if !f.allow(netip.AddrFrom4([4]byte{12, 0, 0, 1})) || len(f.by) != 1 {
			t.Errorf("after a while %d are kept", len(f.by))
		}
	})
}

func TestWithoutTokensThisMachineOnly(t *testing.T) {
	g := guard(t, Options{Listen: []string{"127.0.0.1:8460", "[::1]:8460", "127.0.0.2:8461"}})
	res, p := ask(g, nil)
	if res.StatusCode != 204 || p.Name != LocalName || p.Role != Operate || p.Token {
		t.Errorf("%d, %+v", res.StatusCode, p)
	}
	if !p.MaySpeakFor("catwalk") || p.May(Administer) || !p.May(Act) || !g.Still(p) || g.Named() {
		t.Errorf("local: %+v", p)
	}
	for name, c := range map[string]struct {
		edit func(*http.Request)
		want int
	}{
		"localhost":            {func(r *http.Request) { r.Host = "localhost:9000" }, 204},
		"localhost, no port":   {func(r *http.Request) { r.Host = "LocalHost" }, 204},
		"IPv6":                 {func(r *http.Request) { r.Host, r.RemoteAddr = "[::1]:8460", "[::1]:40000" }, 204},
		"IPv6, no port":        {func(r *http.Request) { r.Host = "[::1]" }, 204},
		"mapped":               {func(r *http.Request) { r.RemoteAddr = "[::ffff:127.0.0.1]:40000" }, 204},
		"another name":         {func(r *http.Request) { r.Host = "skerry.invalid:8460" }, 403},
		"a longer name":        {func(r *http.Request) { r.Host = "localhost.skerry.invalid:8460" }, 403},
		"an address's name":    {func(r *http.Request) { r.Host = "127.0.0.1.skerry.invalid" }, 403},
		"another address":      {func(r *http.Request) { r.Host = "192.0.2.1:8460" }, 403},
		"no host":              {func(r *http.Request) { r.Host = "" }, 403},
		"every address":        {func(r *http.Request) { r.Host = "0.0.0.0:8460" }, 403},
		"another machine":      {func(r *http.Request) { r.RemoteAddr = "192.0.2.1:40000" }, 403},
		"no address":           {func(r *http.Request) { r.RemoteAddr = "@" }, 403},
		"a proxy":              {func(r *http.Request) { r.Header.Set("X-Forwarded-For", "192.0.2.1") }, 403},
		"a proxy, new style":   {func(r *http.Request) { r.Header.Set("Forwarded", "for=192.0.2.1") }, 403},
		"a token":              {bearer(mint()), 401},
		"curl that posts":      {func(r *http.Request) { r.Method = "POST" }, 204},
		"this site that posts": {func(r *http.Request) { r.Method = "POST"; r.Header.Set("Origin", "http://127.0.0.1:8460") }, 204},
		"another site":         {func(r *http.Request) { r.Method = "POST"; r.Header.Set("Origin", "http://skerry.invalid") }, 403},
		"another port":         {func(r *http.Request) { r.Method = "DELETE"; r.Header.Set("Origin", "http://127.0.0.1:9999") }, 403},
		"a browser's word": {func(r *http.Request) {
			r.Method = "POST"
			r.Header.Set("Sec-Fetch-Site", "cross-site")
		}, 403},
		"another site that looks": {func(r *http.Request) { r.Header.Set("Sec-Fetch-Site", "cross-site") }, 204},
	} {
		res, p := ask(g, c.edit)
		if res.StatusCode != c.want || (p.Name != "") != (c.want == 204) {
			t.Errorf("%s: %d, want %d", name, res.StatusCode, c.want)
		}
	}
}

func TestCrossSiteIsRefusedWithATokenToo(t *testing.T) {
	f := newFile(t)
	ada := add(t, f, "ada", Operate)
	g := guard(t, Options{TokensFile: string(f)})
	res, _ := ask(g, func(r *http.Request) {
		bearer(ada)(r)
		r.Method = "POST"
		r.Header.Set("Origin", "https://skerry.invalid")
	})
	if res.StatusCode != 403 {
		t.Errorf("%d", res.StatusCode)
	}
	if _, p := ask(g, func(r *http.Request) { bearer(ada)(r); r.Host = "laser.skerry.invalid" }); p.Name != "ada" {
		t.Error("with tokens the service may have any name")
	}
}

func TestPublicAndRequire(t *testing.T) {
	f := newFile(t)
	add(t, f, "ada", Operate)
	ok := http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) { w.WriteHeader(204) })
	status := func(h http.Handler, p Person, host, origin string) int {
		r := httptest.NewRequest("POST", "http://"+host+"/", nil)
		r.RemoteAddr = "192.0.2.1:1"
		if origin != "" {
			r.Header.Set("Origin", origin)
		}
		w := httptest.NewRecorder()
		h.ServeHTTP(w, r.WithContext(WithPerson(r.Context(), p)))
		return w.Code
	}
	named, nameless := guard(t, Options{TokensFile: string(f)}), guard(t, Options{})
	for _, c := range []struct {
		g            *Guard
		host, origin string
		want         int
	}{
		{named, "laser.skerry.invalid", "", 204}, {named, "laser.skerry.invalid", "http://skerry.invalid", 403},
		{nameless, "127.0.0.1:8460", "", 204}, {nameless, "skerry.invalid", "", 403},
	} {
		if got := status(c.g.Public(ok), Person{}, c.host, c.origin); got != c.want {
			t.Errorf("public at %s: %d, want %d", c.host, got, c.want)
		}
	}
	if got := status(named.Require(Act, ok), Person{Name: "ada", Role: Operate}, "a", ""); got != 204 {
		t.Errorf("an operator: %d", got)
	}
	if got := status(named.Require(Act, ok), Person{Name: "display", Role: Read}, "a", ""); got != 403 {
		t.Errorf("a display: %d", got)
	}
	if got := status(named.Require(See, ok), Person{}, "a", ""); got != 403 {
		t.Errorf("nobody: %d", got)
	}
	if _, ok := PersonOf(t.Context()); ok {
		t.Error("somebody is there without a guard")
	}
}
