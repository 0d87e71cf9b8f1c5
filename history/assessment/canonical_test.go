package assessment

import (
	"bytes"
	"reflect"
	"slices"
	"strings"
	"testing"
	"unicode/utf16"

	"pgregory.net/rapid"

	"speedtrail/history/canon"
)

// Encode writes in one pass, which is canonical if every type has its members
// in the order of RFC 8785, 3.2.3 (UTF-16 code units), and holds nothing that
// has several ways to be written.
func TestMembersInOrder(t *testing.T) {
	seen := map[reflect.Type]bool{}
	var walk func(reflect.Type)
	walk = func(x reflect.Type) {
		if seen[x] {
			return
		}
		seen[x] = true
		switch x.Kind() {
		case reflect.Slice, reflect.Pointer:
			walk(x.Elem())
		case reflect.Bool, reflect.Int, reflect.Int64, reflect.String:
		case reflect.Struct:
			var last []uint16
			for i := range x.NumField() {
				f := x.Field(i)
				name := f.Tag.Get("json")
				if name == "" || strings.Contains(name, ",") || f.Anonymous || !f.IsExported() {
					t.Errorf("%v.%s: a plain name is needed, not %q", x, f.Name, name)
				}
				units := utf16.Encode([]rune(name))
				if slices.Compare(last, units) >= 0 {
					t.Errorf("%v: %q does not stand in order", x, name)
				}
				last = units
				walk(f.Type)
			}
		default:
			t.Errorf("%v: values of kind %v are not known to be written in one way", x, x.Kind())
		}
		if m, ok := reflect.PointerTo(x).MethodByName("MarshalJSON"); ok {
			t.Errorf("%v writes itself: %v", x, m.Name)
		}
	}
	walk(reflect.TypeFor[Document]())
	if len(seen) < 30 {
		t.Errorf("%d types were looked at", len(seen))
	}
}

// Any document has the bytes that a canonicalisation would give it.
func TestEncodeIsCanonical(t *testing.T) {
	var fill func(*rapid.T, reflect.Value, int)
	fill = func(t *rapid.T, v reflect.Value, depth int) {
		switch v.Kind() {
		case reflect.Struct:
			for i := range v.NumField() {
				fill(t, v.Field(i), depth+1)
			}
		case reflect.Slice:
			n := 0
			if depth < 7 {
				n = rapid.IntRange(0, 1).Draw(t, "elements")
			}
			v.Set(reflect.MakeSlice(v.Type(), n, n))
			for i := range n {
				fill(t, v.Index(i), depth+1)
			}
		case reflect.Pointer:
			if rapid.Bool().Draw(t, "given") {
				v.Set(reflect.New(v.Type().Elem()))
				fill(t, v.Elem(), depth+1)
			}
		case reflect.Bool:
			v.SetBool(rapid.Bool().Draw(t, ""))
		case reflect.String:
			v.SetString(strings.ToValidUTF8(rapid.String().Draw(t, ""), ""))
		default:
			v.SetInt(rapid.Int64Range(-(1<<53)+1, 1<<53-1).Draw(t, ""))
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		d := &Document{}
		fill(t, reflect.ValueOf(&d.Computed).Elem(), 0)
		fill(t, reflect.ValueOf(&d.Named).Elem(), 0)
		d.Format = Format
		body, _, err := d.Encode()
		if err != nil {
			t.Fatal(err)
		}
		want, err := canon.Marshal(d)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(body, want) {
			t.Fatalf("got\n%s\nwant\n%s", body, want)
		}
	})
}
