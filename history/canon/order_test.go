package canon

import (
	"bytes"
	"reflect"
	"testing"
	"time"
)

func TestInOrder(t *testing.T) {
	type ordered struct {
		A []string `json:"a"`
		B *int64   `json:"b"`
	}
	type disordered struct {
		B int `json:"b"`
		A int `json:"a"`
	}
	for _, test := range []struct {
		name string
		v    any
		want bool
	}{
		{"texts", "", true},
		{"ordered", ordered{}, true},
		{"a slice of pointers", []*ordered{}, true},
		{"disordered", disordered{}, false},
		{"disordered at the beginning", struct {
			B int `json:"b"`
			A int `json:"a"`
			C int `json:"c"`
		}{}, false},
		{"a fraction before others", struct {
			A float64 `json:"a"`
			B int     `json:"b"`
		}{}, false},
		{"an option before others", struct {
			A int `json:"a,omitempty"`
			B int `json:"b"`
		}{}, false},
		{"disordered within", struct {
			A []disordered `json:"a"`
		}{}, false},
		// U+1F600 is written D83D DE00 in UTF-16, before U+FB33 (RFC 8785, 3.2.3).
		{"order of UTF-16", struct {
			A int `json:"\U0001F600"`
			B int `json:"\uFB33"`
		}{}, true},
		{"order of code points", struct {
			A int `json:"\uFB33"`
			B int `json:"\U0001F600"`
		}{}, false},
		{"an option", struct {
			A int `json:"a,omitempty"`
		}{}, false},
		{"no name", struct{ A int }{}, false},
		{"embedded", struct {
			ordered `json:"a"`
		}{}, false},
		{"a fraction", 1.5, false},
		{"a map", map[string]int{}, false},
		{"anything", struct {
			A any `json:"a"`
		}{}, false},
		{"bytes", []byte{}, false},
		{"its own form", time.Time{}, false},
	} {
		if got := InOrder(reflect.TypeOf(test.v)); got != test.want {
			t.Errorf("%s: got %v", test.name, got)
		}
		if reflect.TypeOf(test.v).Kind() != reflect.Struct || test.name != "disordered" && test.name != "ordered" {
			continue
		}
		var b bytes.Buffer
		if err := Append(&b, test.v); err != nil {
			t.Errorf("%s: %v", test.name, err)
		}
		if err := Check(b.Bytes()); err != nil {
			t.Errorf("%s: %s: %v", test.name, b.Bytes(), err)
		}
	}
}
