package wire

import (
	"encoding/json"
	"errors"
	"fmt"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestProblemsReadBackAsTheyWere(t *testing.T) {
	p := Problem{
		Type: "https://example.com/probs/list", Title: "The list was refused", Status: 422, Detail: "3 bad lines", Instance: "/v1/lists",
		Errors: []ProblemEntry{{Line: 3, Detail: "no such day", Mend: "write a day that exists", Text: "2031-02-30"}, {Pointer: "/windows/2", Field: "at", Detail: "missing"}},
	}
	b, err := json.Marshal(p)
	if err != nil {
		t.Fatal(err)
	}
	got, err := ParseProblem(b)
	if err != nil || !cmp.Equal(&p, got) {
		t.Errorf("%v\n%s", err, cmp.Diff(&p, got))
	}
	if got := fmt.Sprint(got); got != "The list was refused: 3 bad lines (2 errors, the first: no such day)" {
		t.Error(got)
	}
	b, err = json.Marshal(Problem{Title: "Not Found", Status: 404})
	if err != nil || string(b) != `{"type":"about:blank","title":"Not Found","status":404}` {
		t.Errorf("%s, %v", b, err)
	}
}

// TestProblemsOfOthersAreRead reads the example of RFC 9457, section 3, whose
// members balance and accounts are extensions.
func TestProblemsOfOthersAreRead(t *testing.T) {
	got, err := ParseProblem([]byte(`{
		"type": "https://example.com/probs/out-of-credit", "title": "You do not have enough credit.",
		"detail": "Your current balance is 30, but that costs 50.", "instance": "/account/12345/msgs/abc",
		"balance": 30, "accounts": ["/account/12345", "/account/67890"], "status": "403", "errors": [{"detail": "x"}, 7]}`))
	want := &Problem{
		Type: "https://example.com/probs/out-of-credit", Title: "You do not have enough credit.",
		Detail: "Your current balance is 30, but that costs 50.", Instance: "/account/12345/msgs/abc", Errors: []ProblemEntry{{Detail: "x"}},
	}
	if err != nil || !cmp.Equal(want, got) {
		t.Errorf("%v\n%s", err, cmp.Diff(want, got))
	}
	for _, bad := range []string{``, `[]`, `{"type":"a","type":"b"}`, `{} x`} {
		if p, err := ParseProblem([]byte(bad)); err == nil {
			t.Errorf("%s: %+v", bad, p)
		}
	}
	if p, err := ParseProblem([]byte(`{"type":null}`)); err != nil || p.Type != "about:blank" || p.Error() != "status 0" {
		t.Errorf("%+v, %v", p, err)
	}
}

func TestProblemEntriesKeepWhatParsersSay(t *testing.T) {
	_, _, fact := ParseFact([]byte(`{"kind":"detector","source":"a",`+at+`}`), received)
	if got := ProblemOf(7, fact); got != (ProblemEntry{Line: 7, Field: "state", Detail: "missing", Mend: "the kind detector needs it"}) {
		t.Errorf("%+v", got)
	}
	var into struct{}
	if got := ProblemOf(0, Strict([]byte("{\n\"x\":1}"), &into)); got != (ProblemEntry{Line: 2, Pointer: "/x", Detail: `unknown key "x"`}) {
		t.Errorf("%+v", got)
	}
	if got := ProblemOf(2, errors.New("another")); got != (ProblemEntry{Line: 2, Detail: "another"}) {
		t.Errorf("%+v", got)
	}
}

func TestLinesAreCounted(t *testing.T) {
	var got []string
	for n, line := range Lines([]byte("a\r\n\n b\n\r\nc\rd\n")) {
		got = append(got, fmt.Sprintf("%d %q", n, line))
	}
	if diff := cmp.Diff([]string{`1 "a"`, `3 " b"`, `5 "c\rd"`}, got); diff != "" {
		t.Error(diff)
	}
	for range Lines([]byte("a\nb")) {
		break
	}
	for n, line := range Lines(nil) {
		t.Error(n, line)
	}
}
