package assessment

import (
	"bytes"
	"reflect"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/history/canon"
)

// The long lists of a document are written in one pass.
func TestLongListsAreInOrder(t *testing.T) {
	for _, x := range []reflect.Type{reflect.TypeFor[Route](), reflect.TypeFor[SourceFile](), reflect.TypeFor[Finding](), reflect.TypeFor[RunFigure](), reflect.TypeFor[Stretch](), reflect.TypeFor[File]()} {
		if !canon.InOrder(x) {
			t.Errorf("the members of %v do not stand in the order of their names", x)
		}
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
			n, most := 0, 1
			if depth == 1 {
				most = 3
			}
			if depth < 7 {
				n = rapid.IntRange(0, most).Draw(t, "elements")
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
