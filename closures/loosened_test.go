package closures

import (
	"fmt"
	"reflect"
	"slices"
	"testing"
	"time"

	"github.com/golang/geo/s1"
)

// clone copies rules deeply enough to change any of their parts.
func clone(r *Rules) *Rules {
	c := *r
	c.Beams, c.Authorities, c.Sources = slices.Clone(r.Beams), slices.Clone(r.Authorities), slices.Clone(r.Sources)
	c.Neighbours, c.Watches = slices.Clone(r.Neighbours), slices.Clone(r.Watches)
	for i := range c.Beams {
		c.Beams[i].Launches = slices.Clone(r.Beams[i].Launches)
	}
	return &c
}

func TestLoosened(t *testing.T) {
	for name, c := range map[string]struct {
		change func(*Rules)
		want   []string
	}{
		"nothing":          {func(*Rules) {}, nil},
		"a name":           {func(r *Rules) { r.Site.Name = "Elsewhere" }, nil},
		"a longer lead":    {func(r *Rules) { r.Authorities[0].Lead += time.Second }, nil},
		"a shorter lead":   {func(r *Rules) { r.Authorities[0].Lead -= time.Second }, []string{"authorities[orbital-desk].lead"}},
		"authority gone":   {func(r *Rules) { r.Authorities = nil }, []string{"authorities[orbital-desk]"}},
		"not required":     {func(r *Rules) { r.Sources[0].Required = false }, []string{"sources[catwalk].required"}},
		"stale later":      {func(r *Rules) { r.Sources[0].StaleAfter += time.Second }, []string{"sources[catwalk].stale_after"}},
		"lower limit":      {func(r *Rules) { r.Beams[0].Limits.ElevationMin -= s1.Degree }, []string{"beams[north].limits.elevation_min_deg"}},
		"higher limit":     {func(r *Rules) { r.Beams[0].Limits.ElevationMin += s1.Degree }, nil},
		"smaller error":    {func(r *Rules) { r.Beams[0].Aim.Error /= 2 }, []string{"beams[north].aim.error_arcsec"}},
		"another beam":     {func(r *Rules) { b := r.Beams[0]; b.ID = "south"; r.Beams = append(r.Beams, b) }, []string{"beams[south]"}},
		"no aircraft":      {func(r *Rules) { r.Aircraft.Configured = false }, []string{"aircraft"}},
		"smaller keep-out": {func(r *Rules) { r.Aircraft.KeepOutRadius /= 2 }, []string{"aircraft.keep_out.radius_m"}},
		"by itself":        {func(r *Rules) { r.ByItself = AllCodes }, nil},
		"fewer by itself":  {func(r *Rules) { r.ByItself = 0 }, nil},
		"two":              {func(r *Rules) { r.Watches = nil; r.Neighbours[0].Field = 0 }, []string{"neighbours[ridge-2].field_radius_deg", "watches[east-lot]"}},
	} {
		next := clone(busyRules())
		c.change(next)
		if got := busyRules().Loosened(next); !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", name, got, c.want)
		}
	}
	old := busyRules()
	old.ByItself = AllCodes.Without(CodeFault)
	if got := old.Loosened(busyRules()); !slices.Equal(got, []string{"rearm.by_itself"}) {
		t.Errorf("one more by itself: %v", got)
	}
}

// harmless are fields whose change opens nothing by itself.
var harmless = []string{
	"Site.Name", "Site.TimeZone", "Digest", "Authorities.ID", "Authorities.Folder", "Authorities.Layout", "Authorities.Phone", "Authorities.SubmitBy",
	"Beams.ID", "Beams.PowerW", // power bears on exposure figures, not on decisions
	"Sources.ID", "Neighbours.ID", "Watches.Post",
}

// Every field of the rules is either harmless or one of its two directions is
// called loosening, so that a field added later cannot be forgotten.
func TestEveryRuleIsLookedAt(t *testing.T) {
	seen := 0
	try := func(path string, set func(*Rules, int)) {
		seen++
		if slices.Contains(harmless, path) {
			return
		}
		found := false
		for _, direction := range []int{1, -1} {
			a, b := clone(busyRules()), clone(busyRules())
			a.ByItself, b.ByItself = 1<<3, 1<<3
			set(b, direction)
			if len(a.Loosened(b)) > 0 || len(b.Loosened(a)) > 0 {
				found = true
			}
		}
		if !found {
			t.Errorf("no change of %s is called loosening", path)
		}
	}
	nudge := func(v reflect.Value, by int) bool {
		switch v.Kind() {
		case reflect.Float64:
			v.SetFloat(v.Float() + float64(by)*0.5)
		case reflect.Int, reflect.Int64:
			v.SetInt(v.Int() + int64(by))
		case reflect.Uint8, reflect.Uint32:
			v.SetUint(v.Uint() ^ 1)
		case reflect.Bool:
			v.SetBool(!v.Bool())
		case reflect.String:
			v.SetString(v.String() + "x")
		default:
			return false
		}
		return true
	}
	var visit func(path string, typ reflect.Type, reach func(*Rules) reflect.Value)
	visit = func(path string, typ reflect.Type, reach func(*Rules) reflect.Value) {
		switch {
		case typ == reflect.TypeFor[time.Time]() || typ.Kind() == reflect.Array:
			return
		case typ.Kind() == reflect.Struct:
			for i := range typ.NumField() {
				f := typ.Field(i)
				visit(path+"."+f.Name, f.Type, func(r *Rules) reflect.Value { return reach(r).Field(i) })
			}
		case typ.Kind() == reflect.Slice:
			if v := reach(clone(busyRules())); v.Len() > 0 {
				visit(path, typ.Elem(), func(r *Rules) reflect.Value { return reach(r).Index(0) })
			}
		default:
			try(path[1:], func(r *Rules, by int) {
				if !nudge(reach(r), by) {
					t.Errorf("%s: a %v", path, typ)
				}
			})
		}
	}
	visit("", reflect.TypeFor[Rules](), func(r *Rules) reflect.Value { return reflect.ValueOf(r).Elem() })
	if seen < 60 {
		t.Error(fmt.Sprint("only ", seen, " fields were looked at"))
	}
}
