package assessment

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"reflect"
	"runtime"
	"slices"
	"strings"
	"sync"

	"speedtrail/history/canon"
	"speedtrail/schema/parallel"
)

// mostParts is into how many parts a member of the document is cut.
const mostParts = 16

// textPart is a stretch of the text of a document.
type textPart struct {
	before, after string
	value         any
	inner         bool // without the brackets around the value
	count         int  // of the parts of one list, at the first of them
	text          []byte
}

// Encode writes the document as canonical JSON and gives its digest.
func (d *Document) Encode() (body []byte, digest string, err error) {
	var w partWriter
	parts := cut(nil, "", reflect.ValueOf(&d.Computed).Elem())
	// A text of many megabytes is not held twice: the first part of each list
	// tells how long the text becomes about, and the others are copied into it as
	// they come.
	w.encode(slices.DeleteFunc(slices.Clone(parts), func(p *textPart) bool { return p.count == 0 }))
	const start = `{"computed":`
	size := len(start) + 10_000
	for _, p := range parts {
		size += len(p.text) * p.count * 17 / 16
	}
	body = append(make([]byte, 0, size), start...)
	for wave := range slices.Chunk(parts, 2*runtime.GOMAXPROCS(0)) {
		w.encode(wave)
		for _, p := range wave {
			body = p.append(body)
		}
	}
	sum := sha256.New()
	sum.Write([]byte(Format + "\n"))
	sum.Write(body[len(start):])
	last := []*textPart{{before: `,"format":"` + Format + `","named":`, value: d.Named, after: "}"}}
	w.encode(last)
	if w.err != nil {
		return nil, "", w.err
	}
	return last[0].append(body), hex.EncodeToString(sum.Sum(nil)), nil
}

// partWriter writes parts side by side.
type partWriter struct {
	memory sync.Pool // of buffers, which grow to the size of the longest part
	err    error
}

// encode fills in the text of parts that have none.
func (w *partWriter) encode(parts []*textPart) {
	errs := make([]error, len(parts))
	parallel.Each(len(parts), func(i int) {
		p := parts[i]
		if p.text != nil {
			return
		}
		b, ok := w.memory.Get().(*bytes.Buffer)
		if !ok {
			b = new(bytes.Buffer)
		}
		errs[i] = canon.Append(b, p.value)
		p.text = bytes.Clone(b.Bytes())
		b.Reset()
		w.memory.Put(b)
	})
	w.err = errors.Join(w.err, errors.Join(errs...))
}

// append adds the text to a body and lets go of it.
func (p *textPart) append(body []byte) []byte {
	text := p.text
	if p.inner && len(text) > 1 {
		text = text[1 : len(text)-1]
	}
	p.text = nil
	return append(append(append(body, p.before...), text...), p.after...)
}

// cut cuts the text of a value into parts that can be written side by side: the
// members of structs, by name, and stretches of the lists among them.
func cut(list []*textPart, before string, v reflect.Value) []*textPart {
	switch {
	case v.Kind() == reflect.Struct:
		fields := reflect.VisibleFields(v.Type())
		slices.SortFunc(fields, func(a, b reflect.StructField) int { return strings.Compare(a.Tag.Get("json"), b.Tag.Get("json")) })
		before += "{"
		for _, f := range fields {
			list = cut(list, before+`"`+f.Tag.Get("json")+`":`, v.FieldByIndex(f.Index))
			before = ","
		}
		list[len(list)-1].after += "}"
	case v.Kind() == reflect.Slice && v.Len() > 1:
		n := min(v.Len(), mostParts)
		before += "["
		for k := range n {
			p := &textPart{before: before, inner: true, value: v.Slice(k*v.Len()/n, (k+1)*v.Len()/n).Interface()}
			if k == 0 {
				p.count = n
			}
			list, before = append(list, p), ","
		}
		list[len(list)-1].after = "]"
	default:
		list = append(list, &textPart{before: before, value: v.Addr().Interface(), count: 1})
	}
	return list
}
