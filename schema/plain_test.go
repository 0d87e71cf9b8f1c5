package schema

import (
	"reflect"

	"speedtrail/schema/source"
)

// plain copies a data set without what depends on where things are written:
// positions and the content of the files. Two plain data sets that are deeply
// equal say the same.
func plain(d *Dataset) *Dataset {
	c := copyValue(reflect.ValueOf(d)).Interface().(*Dataset)
	c.Files = nil
	return c
}

var positionType = reflect.TypeFor[source.Position]()

func copyValue(v reflect.Value) reflect.Value {
	switch v.Kind() {
	case reflect.Pointer:
		// A time zone or a track is not changed by anybody.
		if v.IsNil() || v.Elem().Kind() != reflect.Struct || v.Elem().NumField() == 0 || !v.Elem().Type().Field(0).IsExported() {
			return v
		}
		p := reflect.New(v.Elem().Type())
		p.Elem().Set(copyValue(v.Elem()))
		return p
	case reflect.Slice:
		if v.IsNil() {
			return v
		}
		s := reflect.MakeSlice(v.Type(), v.Len(), v.Len())
		for i := range v.Len() {
			s.Index(i).Set(copyValue(v.Index(i)))
		}
		return s
	case reflect.Struct:
		if v.Type() == positionType {
			return reflect.Zero(positionType)
		}
		s := reflect.New(v.Type()).Elem()
		s.Set(v)
		for i := range v.NumField() {
			if v.Type().Field(i).IsExported() {
				s.Field(i).Set(copyValue(v.Field(i)))
			}
		}
		return s
	}
	return v
}
