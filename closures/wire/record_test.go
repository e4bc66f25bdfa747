package wire

import (
	"errors"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"beamward/closures"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// bodies returns the zero value of every body of a fact.
func bodies() []closures.Body {
	return []closures.Body{
		closures.RulesSet{}, closures.ListOffered{}, closures.ListConfirmed{}, closures.ListWithdrawn{}, closures.NightReady{}, closures.AimSeen{},
		closures.AircraftSeen{}, closures.Sighted{}, closures.DetectorSeen{}, closures.InterlockSeen{}, closures.ShutterSeen{}, closures.LaserSeen{},
		closures.WatchKept{}, closures.WeatherSeen{}, closures.Heard{}, closures.HoldPlaced{}, closures.HoldReleased{}, closures.Rearmed{},
		closures.TrackReleased{}, closures.ClockState{}, closures.RecordState{}, closures.Started{}, closures.Veto{}, closures.Fault{}, closures.Tick{},
	}
}

// TestEveryBodyIsKnown reads the core's sources for the bodies that there are.
func TestEveryBodyIsKnown(t *testing.T) {
	var want, got []string
	files, err := filepath.Glob("../*.go")
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range files {
		if strings.HasSuffix(name, "_test.go") {
			continue
		}
		src, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		file, err := parser.ParseFile(token.NewFileSet(), name, src, parser.SkipObjectResolution)
		if err != nil {
			t.Skipf("the core cannot be read now: %v", err)
		}
		for _, d := range file.Decls {
			if f, ok := d.(*ast.FuncDecl); ok && f.Recv != nil && f.Name.Name == "fact" {
				want = append(want, f.Recv.List[0].Type.(*ast.Ident).Name)
			}
		}
	}
	for _, b := range bodies() {
		got = append(got, reflect.TypeOf(b).Name())
	}
	slices.Sort(want)
	slices.Sort(got)
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
}

// world is what the record's names stand for in these tests.
type world struct {
	rules *closures.Rules
	list  *closures.List
	night *sky.Night
}

func (w *world) resolver() Resolver {
	return Resolver{
		Rules: func(d closures.Digest) (*closures.Rules, error) {
			if w.rules == nil || d != w.rules.Digest {
				return nil, errors.New("no such rules")
			}
			return w.rules, nil
		},
		List: func(d closures.Digest) (*closures.List, error) {
			if w.list == nil || d != w.list.Digest() {
				return nil, errors.New("no such list")
			}
			return w.list, nil
		},
		Night: func(bin time.Time) (*sky.Night, error) {
			if w.night == nil || !bin.Equal(closures.BinOf(w.night).From) {
				return nil, errors.New("no such night")
			}
			return w.night, nil
		},
	}
}

func newWorld(t testing.TB) *world {
	t.Helper()
	night, err := sky.Prepare(earth.Position{Lat: -31.5 * deg, Lon: -4 * deg, Height: 2450}, received, sky.UT1{})
	if err != nil {
		t.Fatal(err)
	}
	list, err := closures.Index(&closures.ListText{
		ID: "2031-045-B", Authority: "orbital-desk", Issued: said, Covers: span.Span{From: said, Until: said.Add(time.Hour)}, Digest: closures.Digest{1, 2},
	})
	if err != nil {
		t.Fatal(err)
	}
	return &world{rules: &closures.Rules{Digest: closures.Digest{7}}, list: list, night: night}
}

// oddNumbers are the ones that text is likely to lose.
var oddNumbers = []float64{
	0, math.Copysign(0, -1), 1, -1, 0.1, 1.0 / 3, math.Pi, math.MaxFloat64, -math.MaxFloat64, math.SmallestNonzeroFloat64, 1 << 53, 1e21, 1e-7,
	math.NaN(), math.Inf(1), math.Inf(-1), math.Nextafter(1, 2), 1e22, 5e-324,
}

var (
	listPointer  = reflect.TypeFor[*closures.List]()
	rulesPointer = reflect.TypeFor[*closures.Rules]()
	nightPointer = reflect.TypeFor[*sky.Night]()
)

// small bounds the numbers that stand for words, by type.
var small = map[reflect.Type]int{
	reflect.TypeFor[closures.AimFrame]():        int(closures.Table),
	reflect.TypeFor[closures.Motion]():          int(closures.Fixed),
	reflect.TypeFor[closures.Tristate]():        int(closures.No),
	reflect.TypeFor[closures.AltitudeFrom]():    int(closures.PressureAltitude),
	reflect.TypeFor[closures.DetectorState]():   int(closures.DetectorClear),
	reflect.TypeFor[closures.ShutterPosition](): int(closures.ShutterClosed),
	reflect.TypeFor[closures.HeardScope]():      int(closures.HeardReception),
	reflect.TypeFor[closures.Shape]():           int(closures.WholeSky),
	reflect.TypeFor[closures.Throughout]():      int(closures.ThroughoutOpen),
	reflect.TypeFor[closures.Code]():            int(closures.NumCodes) - 1,
	reflect.TypeFor[closures.Verdict]():         int(closures.Clear),
	reflect.TypeFor[closures.Unit]():            int(closures.Second),
	reflect.TypeFor[closures.ListStatus]():      int(closures.ListGone),
}

// draw fills v with random values, every field of every struct on the way.
func draw(t *rapid.T, w *world, v reflect.Value) {
	switch v.Type() {
	case timeType:
		at := time.Time{}
		if rapid.Bool().Draw(t, "set") {
			at = time.Unix(rapid.Int64Range(-62135596800, 253402300799).Draw(t, "s"), rapid.Int64Range(0, 999999999).Draw(t, "ns")).UTC()
		}
		v.Set(reflect.ValueOf(at))
		return
	case listPointer:
		v.Set(reflect.ValueOf(w.list))
		return
	case rulesPointer:
		v.Set(reflect.ValueOf(w.rules))
		return
	case nightPointer:
		v.Set(reflect.ValueOf(w.night))
		return
	case reflect.TypeFor[closures.Codes]():
		v.SetUint(uint64(rapid.Uint32Range(0, uint32(closures.AllCodes)).Draw(t, "codes")))
		return
	}
	if most, ok := small[v.Type()]; ok {
		v.SetUint(uint64(rapid.IntRange(0, most).Draw(t, "word")))
		return
	}
	switch v.Kind() {
	case reflect.Struct:
		for i := range v.NumField() {
			draw(t, w, v.Field(i))
		}
	case reflect.Pointer:
		if rapid.Bool().Draw(t, "there") {
			v.Set(reflect.New(v.Type().Elem()))
			draw(t, w, v.Elem())
		}
	case reflect.Slice:
		v.SetZero()
		for range rapid.IntRange(0, 3).Draw(t, "n") {
			one := reflect.New(v.Type().Elem()).Elem()
			draw(t, w, one)
			v.Set(reflect.Append(v, one))
		}
	case reflect.Array:
		for i := range v.Len() {
			draw(t, w, v.Index(i))
		}
	case reflect.String:
		v.SetString(rapid.OneOf(rapid.String(), rapid.StringMatching(`[ -~\n"\\]{0,8}`)).Draw(t, "text"))
	case reflect.Bool:
		v.SetBool(rapid.Bool().Draw(t, "yes"))
	case reflect.Float64:
		v.SetFloat(rapid.OneOf(rapid.SampledFrom(oddNumbers), rapid.Float64()).Draw(t, "number"))
	case reflect.Int64, reflect.Int:
		v.SetInt(rapid.Int64().Draw(t, "whole"))
	case reflect.Uint64, reflect.Uint8:
		v.SetUint(rapid.Uint64().Draw(t, "whole") >> (64 - v.Type().Bits()))
	default:
		t.Fatalf("a %v is not drawn", v.Type())
	}
}

// exact compares to the bit, but an empty slice with none; lists, rules and
// nights are themselves.
var exact = cmp.Options{
	same, cmpopts.EquateEmpty(), cmp.Comparer(func(a, b time.Time) bool { return a == b }),
	cmp.Comparer(func(a, b *closures.List) bool { return a == b }), cmp.Comparer(func(a, b *closures.Rules) bool { return a == b }),
	cmp.Comparer(func(a, b *sky.Night) bool { return a == b }),
}

func TestTheRecordKeepsEveryBodyToTheBit(t *testing.T) {
	w := newWorld(t)
	for _, zero := range bodies() {
		t.Run(reflect.TypeOf(zero).Name(), func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				v := reflect.New(reflect.TypeOf(zero)).Elem()
				draw(t, w, v)
				checkBody(t, w, closures.Fact{From: closures.Source(rapid.String().Draw(t, "via")), Body: v.Interface().(closures.Body)})
			})
		})
	}
}

type failer interface{ Fatalf(string, ...any) }

func checkBody(t failer, w *world, f closures.Fact) {
	kind, body, err := EncodeBody([]byte("kept"), f)
	if err != nil {
		t.Fatalf("%+v: %v", f, err)
	}
	if string(body[:4]) != "kept" {
		t.Fatalf("what was there is gone: %s", body)
	}
	got, err := DecodeBody(kind, body[4:], w.resolver())
	if err != nil {
		t.Fatalf("%s: %v", body, err)
	}
	if diff := cmp.Diff(f, got, exact); diff != "" {
		t.Fatalf("%s\n%s", body, diff)
	}
	// What one function reads encoding/json must be able to read too.
	var any any
	if err := Strict(body[4:], &any); err != nil {
		t.Fatalf("%s: %v", body, err)
	}
}

// TestTheRecordKeepsEachFieldAlone sets one field of each struct at a time, so
// that a field added to the core and forgotten here is found.
func TestTheRecordKeepsEachFieldAlone(t *testing.T) {
	w := newWorld(t)
	for _, zero := range bodies() {
		base := reflect.New(reflect.TypeOf(zero)).Elem()
		for i := range base.NumField() {
			switch f := base.Field(i); f.Type() {
			case listPointer, rulesPointer, nightPointer:
				draw(nil, w, f)
			}
		}
		eachLeaf(base, func(path string, set func()) {
			v := reflect.New(base.Type()).Elem()
			v.Set(base)
			set()
			t.Run(base.Type().Name()+path, func(t *testing.T) {
				checkBody(t, w, closures.Fact{Body: base.Interface().(closures.Body)})
			})
			base.Set(v)
		})
	}
	var d closures.Decision
	eachLeaf(reflect.ValueOf(&d).Elem(), func(path string, set func()) {
		set()
		t.Run("Decision"+path, func(t *testing.T) { checkDecision(t, &d) })
		d = closures.Decision{}
	})
	var all closures.Durable
	eachLeaf(reflect.ValueOf(&all).Elem(), func(path string, set func()) {
		set()
		for i := range all.Lists {
			all.Lists[i].List = w.list
		}
		t.Run("Durable"+path, func(t *testing.T) { checkDurable(t, w, &all) })
		all = closures.Durable{}
	})
}

// eachLeaf calls visit for each number, text and the like within v, with what
// makes it other than zero.
func eachLeaf(v reflect.Value, visit func(path string, set func())) {
	leaves(v, "", func() reflect.Value { return v }, visit)
}

func leaves(shape reflect.Value, path string, reach func() reflect.Value, visit func(string, func())) {
	t := shape.Type()
	zero := func(t reflect.Type) reflect.Value { return reflect.New(t).Elem() }
	switch {
	case t == listPointer || t == rulesPointer || t == nightPointer:
	case t == timeType:
		visit(path, func() { reach().Set(reflect.ValueOf(said)) })
	case t.Kind() == reflect.Struct:
		for i := range t.NumField() {
			leaves(zero(t.Field(i).Type), path+"."+t.Field(i).Name, func() reflect.Value { return reach().Field(i) }, visit)
		}
	case t.Kind() == reflect.Pointer:
		leaves(zero(t.Elem()), path, func() reflect.Value {
			p := reach()
			if p.IsNil() {
				p.Set(reflect.New(t.Elem()))
			}
			return p.Elem()
		}, visit)
	case t.Kind() == reflect.Slice:
		leaves(zero(t.Elem()), path+"[0]", func() reflect.Value {
			s := reach()
			if s.Len() == 0 {
				s.Set(reflect.MakeSlice(t, 1, 1))
			}
			return s.Index(0)
		}, visit)
	case t.Kind() == reflect.Array:
		visit(path, func() { reach().Index(0).SetUint(1) })
	case t.Kind() == reflect.String:
		visit(path, func() { reach().SetString("x") })
	case t.Kind() == reflect.Bool:
		visit(path, func() { reach().SetBool(true) })
	case shape.CanFloat():
		visit(path, func() { reach().SetFloat(0.1) })
	case shape.CanInt():
		visit(path, func() { reach().SetInt(-3) })
	case shape.CanUint():
		visit(path, func() { reach().SetUint(1) })
	}
}

func checkDecision(t failer, d *closures.Decision) {
	body, err := EncodeDecision(nil, d)
	if err != nil {
		t.Fatalf("%v", err)
	}
	got, err := DecodeDecision(body)
	if err != nil {
		t.Fatalf("%s: %v", body, err)
	}
	if diff := cmp.Diff(*d, got, exact); diff != "" {
		t.Fatalf("%s\n%s", body, diff)
	}
}

func checkDurable(t failer, w *world, d *closures.Durable) {
	body, err := EncodeDurable(nil, d)
	if err != nil {
		t.Fatalf("%v", err)
	}
	got, err := DecodeDurable(body, w.resolver())
	if err != nil {
		t.Fatalf("%s: %v", body, err)
	}
	if diff := cmp.Diff(*d, got, exact); diff != "" {
		t.Fatalf("%s\n%s", body, diff)
	}
}

func TestTheRecordKeepsDecisionsAndWhatOutlivesARestart(t *testing.T) {
	w := newWorld(t)
	rapid.Check(t, func(t *rapid.T) {
		var d closures.Decision
		draw(t, w, reflect.ValueOf(&d).Elem())
		checkDecision(t, &d)
		var all closures.Durable
		draw(t, w, reflect.ValueOf(&all).Elem())
		checkDurable(t, w, &all)
	})
}

func TestTheRecordKeepsFactsFromOutside(t *testing.T) {
	w := newWorld(t)
	for _, l := range seeds() {
		name, body, err := ParseFact([]byte(l), received)
		if err != nil {
			t.Fatal(err)
		}
		checkBody(t, w, closures.Fact{From: name, Body: body})
	}
}

func TestTheRecordRefusesWhatItCouldNotGiveBack(t *testing.T) {
	for name, f := range map[string]closures.Fact{
		"nothing":             {},
		"rules without":       {Body: closures.RulesSet{}},
		"rules, no digest":    {Body: closures.RulesSet{Rules: &closures.Rules{}}},
		"no list":             {Body: closures.ListOffered{}},
		"no night":            {Body: closures.NightReady{}},
		"not UTF-8":           {Body: closures.Rearmed{By: "\xff"}},
		"sender not UTF-8":    {From: "\xff", Body: closures.Tick{}},
		"no such word":        {Body: closures.DetectorSeen{State: 9}},
		"year 10000":          {Body: closures.DetectorSeen{Said: time.Date(10000, 1, 1, 0, 0, 0, 0, time.UTC)}},
		"year below 0":        {Body: closures.DetectorSeen{Said: time.Date(-1, 1, 1, 0, 0, 0, 0, time.UTC)}},
		"no such frame":       {Body: closures.AimSeen{Aim: &closures.Aim{Frame: 77}}},
		"no such shape, deep": {Body: closures.HoldPlaced{Region: &closures.Region{Shape: 77}}},
	} {
		kind, body, err := EncodeBody(nil, f)
		if err == nil || kind != "" || body != nil {
			t.Errorf("%s: %s %s, %v", name, kind, body, err)
		}
	}
	if _, err := EncodeDecision(nil, &closures.Decision{Codes: 1 << 31}); err == nil {
		t.Error("a decision with a code that is none was written")
	}
	if _, err := EncodeDecision(nil, &closures.Decision{Reasons: []closures.Finding{{Code: closures.NumCodes}}}); err == nil {
		t.Error("a finding with a code that is none was written")
	}
	if _, err := EncodeDurable(nil, &closures.Durable{Lists: make([]closures.DurableList, 1)}); err == nil {
		t.Error("a list that is not there was written")
	}
}

func TestTheRecordIsReadStrictly(t *testing.T) {
	w := newWorld(t)
	other := *w
	other.rules = &closures.Rules{Digest: closures.Digest{8}}
	lying := Resolver{
		Rules: func(closures.Digest) (*closures.Rules, error) { return other.rules, nil },
		List:  func(closures.Digest) (*closures.List, error) { return w.list, nil },
		Night: func(time.Time) (*sky.Night, error) { return w.night, nil },
	}
	empty := Resolver{
		Rules: func(closures.Digest) (*closures.Rules, error) { return nil, nil },
		List:  func(closures.Digest) (*closures.List, error) { return nil, nil },
		Night: func(time.Time) (*sky.Night, error) { return nil, nil },
	}
	d := w.list.Digest().String()
	for _, c := range []struct {
		kind, body string
		r          Resolver
	}{
		{KindTick, ``, empty},
		{KindTick, `{`, empty},
		{KindTick, `{}x`, empty},
		{KindTick, ` {}`, empty},
		{KindTick, `{"x":1}`, empty},
		{KindTick, `{,"via":"x"}`, empty},
		{KindTick, `{"via":"x",}`, empty},
		{KindTick, `{"via":"x""via":"x"}`, empty},
		{"nothing", `{}`, empty},
		{KindDecision, `{}`, empty},
		{KindDetector, `{"said":"2031-02-14T03:10:01Z","source":"x"}`, empty},
		{KindDetector, `{"source":"x","source":"y"}`, empty},
		{KindDetector, `{"state":"open"}`, empty},
		{KindDetector, `{"said":"2031-02-14T03:10:60Z"}`, empty},
		{KindInterlock, `{"safe":false}`, empty},
		{KindInterlock, `{"safe":1}`, empty},
		{KindWeather, `{"pressure_hpa":"nan"}`, empty},
		{KindWeather, `{"pressure_hpa":1e999}`, empty},
		{KindSighting, `{"direction":[1,2]}`, empty},
		{KindSighting, `{"direction":[1,2,3,4]}`, empty},
		{KindSighting, `{"for_ns":1.5}`, empty},
		{KindSighting, `{"for_ns":9223372036854775808}`, empty},
		{KindWatch, `{"by":[]}`, empty},
		{KindWatch, `{"by":["a",]}`, empty},
		{KindWatch, `{"by":["a"`, empty},
		{KindRules, `{"digest":"` + d + `"}`, Resolver{}},
		{KindRules, `{"digest":"` + d + `"}`, empty},
		{KindRules, `{"digest":"` + d + `"}`, lying},
		{KindRules, `{"digest":"sha256:00"}`, lying},
		{KindRules, `{}`, lying},
		{KindListOffered, `{"authority":"orbital-desk","id":"another","digest":"` + d + `"}`, w.resolver()},
		{KindListOffered, `{"authority":"another","id":"2031-045-B","digest":"` + d + `"}`, w.resolver()},
		{KindListOffered, `{"authority":"orbital-desk","id":"2031-045-B","digest":"` + closures.Digest{9}.String() + `"}`, lying},
		{KindListOffered, `{"authority":"orbital-desk","id":"2031-045-B","digest":"` + d + `"}`, empty},
		{KindNight, `{"bin":"2031-02-14T12:00:00Z"}`, lying},
		{KindNight, `{"bin":"2031-02-14T00:00:00Z"}`, empty},
		{KindNight, `{}`, lying},
	} {
		if f, err := DecodeBody(c.kind, []byte(c.body), c.r); err == nil || f.Body != nil || f.From != "" {
			t.Errorf("%s %s: %+v, %v", c.kind, c.body, f, err)
		}
	}
	for _, body := range []string{``, `{}{}`, `{"reasons":[{}]}`, `{"reasons":[{"code":"nothing"}]}`, `{"codes":["nothing"]}`, `{"open":true`, `{"beam":"a","seq":1}`} {
		if d, err := DecodeDecision([]byte(body)); err == nil || !reflect.ValueOf(d).IsZero() {
			t.Errorf("%s: %+v, %v", body, d, err)
		}
	}
	if d, err := DecodeDurable([]byte(`{"holds":[{"id":"h"}],"lists":[]}`), empty); err == nil || d.Holds != nil {
		t.Errorf("%+v, %v", d, err)
	}
}

// FuzzDecodeBody checks that what is read is written again and read the same.
func FuzzDecodeBody(f *testing.F) {
	w := newWorld(f)
	for _, l := range seeds() {
		name, body, err := ParseFact([]byte(l), received)
		if err != nil {
			f.Fatal(err)
		}
		kind, text, err := EncodeBody(nil, closures.Fact{From: name, Body: body})
		if err != nil {
			f.Fatal(err)
		}
		f.Add(kind, text)
	}
	f.Add(KindHold, []byte(`{"id":"h","beam":"*","region":{"id":"r","shape":"track","points":[{"at":"2031-02-14T03:10:01Z","direction":[1,0,null]}]}}`))
	f.Add(KindClock, []byte(`{"step_ns":-5,"max_error_ns":-1}`))
	f.Add(KindNight, []byte(`{"bin":"2031-02-14T00:00:00Z"}`))
	f.Add(KindDecision, []byte(`{"seq":1,"reasons":[{"code":"aircraft","margin":"-inf","unit":"m"}],"codes":["aircraft"]}`))
	f.Add(KindDurable, fmt.Appendf(nil, `{"lists":[{"authority":"orbital-desk","id":"2031-045-B","digest":%q}],"latches":[{"beam":"b","need":["hold"]}]}`, w.list.Digest()))
	f.Fuzz(func(t *testing.T, kind string, text []byte) {
		switch kind {
		case KindDecision:
			if d, err := DecodeDecision(text); err == nil {
				checkDecision(t, &d)
			}
		case KindDurable:
			if d, err := DecodeDurable(text, w.resolver()); err == nil {
				checkDurable(t, w, &d)
			}
		default:
			if fact, err := DecodeBody(kind, text, w.resolver()); err == nil {
				checkBody(t, w, fact)
			}
		}
	})
}
