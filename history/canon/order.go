package canon

import (
	"encoding"
	"encoding/json"
	"reflect"
	"slices"
	"strings"
	"sync"
	"unicode/utf16"

	jsonv2 "github.com/go-json-experiment/json"
)

var inOrder sync.Map // of reflect.Type: bool

// InOrder tells whether the encoder's bytes for values of a type are canonical as
// they come: it is made of texts, booleans, whole numbers, slices and structs,
// and the members of every struct stand in the order of their names.
func InOrder(t reflect.Type) bool {
	if known, ok := inOrder.Load(t); ok {
		return known.(bool)
	}
	ok := !writesItself(t)
	switch t.Kind() {
	case reflect.Bool, reflect.String, reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
	case reflect.Slice, reflect.Pointer:
		ok = ok && InOrder(t.Elem())
	case reflect.Struct:
		var last []uint16
		for i := range t.NumField() {
			f := t.Field(i)
			name := f.Tag.Get("json")
			plain := f.IsExported() && !f.Anonymous && name != "" && !strings.ContainsAny(name, ",'-")
			// RFC 8785, 3.2.3: the order is that of UTF-16 code units.
			units := utf16.Encode([]rune(name))
			ok = ok && plain && slices.Compare(last, units) < 0 && InOrder(f.Type)
			last = units
		}
	default:
		ok = false
	}
	inOrder.Store(t, ok)
	return ok
}

// writesItself tells whether a type has its own form in JSON.
func writesItself(t reflect.Type) bool {
	for _, own := range [...]reflect.Type{
		reflect.TypeFor[json.Marshaler](), reflect.TypeFor[jsonv2.MarshalerTo](),
		reflect.TypeFor[encoding.TextMarshaler](), reflect.TypeFor[encoding.TextAppender](),
	} {
		if t.Implements(own) || reflect.PointerTo(t).Implements(own) {
			return true
		}
	}
	return false
}
