package table

import (
	"bytes"
	"errors"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"

	"speedtrail/schema/source"
)

// Kind is the type of a TOML value.
type Kind uint8

// The types of value. Numbers and dates are kept as they are written, so that a
// position never passes through a binary fraction.
const (
	StringKind Kind = iota
	NumberKind
	DateKind
	BoolKind
	ArrayKind
	TableKind
)

// String gives the name of the type for a message.
func (k Kind) String() string {
	return [...]string{"a text", "a number", "a date", "a boolean", "an array", "a table"}[k]
}

// Value is a TOML value with its place.
type Value struct {
	Kind Kind
	Text string // of a string its content, of a number, date or boolean as written
	// Mark is a # with digits that follows a number without a blank between: to TOML it
	// is a comment, and whoever wrote it may have meant an occurrence.
	Mark  string
	Pos   source.Position
	Items []Value // of an array
	Table *Map    // of a table
}

// Map is a TOML table with the places of its keys.
type Map struct {
	Pos    source.Position
	keys   []string
	values map[string]*Value
	places map[string]source.Position
	used   map[string]bool
}

// Keys lists the keys in the order of the file.
func (m *Map) Keys() []string { return m.keys }

// Get gives the value of a key, nil where there is none.
func (m *Map) Get(key string) *Value {
	m.used[key] = true
	return m.values[key]
}

// Place gives where a key stands, or the table where it is not there.
func (m *Map) Place(key string) source.Position {
	if p, ok := m.places[key]; ok {
		return p
	}
	return m.Pos
}

func newMap(pos source.Position) *Map {
	return &Map{Pos: pos, values: map[string]*Value{}, places: map[string]source.Position{}, used: map[string]bool{}}
}

func (m *Map) set(key string, pos source.Position, v *Value) {
	if _, ok := m.values[key]; !ok {
		m.keys = append(m.keys, key)
		m.places[key] = pos
	}
	m.values[key] = v
}

// ReadTOML reads a file into its top table; nil where its form is faulty, with
// the fault recorded.
func ReadTOML(file string, content []byte, faults *source.Collector) *Map {
	content = bytes.TrimPrefix(content, byteOrderMark)
	if !CheckUTF8(file, content, faults) {
		return nil
	}
	r := tomlReader{file: file, content: content, lines: lineStarts(content)}
	if at, many := r.manyKeys(content); many {
		faults.Add(at, "more than %d keys in a table, or tables of different names", MaxKeys)
		return nil
	}
	// The library's decoder checks what the parser alone does not: keys that
	// stand twice, tables that are opened twice, dates that do not exist.
	var checked map[string]any
	if err := toml.Unmarshal(content, &checked); err != nil {
		at := source.Position{File: file, Line: 1}
		if line, ok := MergeMarker(content); ok {
			faults.Add(source.Position{File: file, Line: line, Column: 1}, "%s", Unresolved)
			return nil
		}
		problem := err.Error()
		var d *toml.DecodeError
		if errors.As(err, &d) {
			at.Line, at.Column = d.Position()
		}
		faults.Add(at, "not valid TOML: %s", source.Visible(strings.TrimPrefix(problem, "toml: ")))
		return nil
	}
	r.p.Reset(content)
	top := newMap(source.Position{File: file, Line: 1})
	here := top
	for r.p.NextExpression() {
		e := r.p.Expression()
		switch e.Kind {
		case unstable.KeyValue:
			r.keyValue(here, e)
		case unstable.Table:
			here = r.open(top, e, false)
		case unstable.ArrayTable:
			here = r.open(top, e, true)
		}
	}
	if err := r.p.Error(); err != nil {
		faults.Add(source.Position{File: file, Line: 1}, "not valid TOML: %s", source.Visible(err.Error()))
		return nil
	}
	return top
}

type tomlReader struct {
	file    string
	content []byte
	p       unstable.Parser
	lines   []int // offsets at which lines begin
}

func lineStarts(content []byte) []int {
	lines := []int{0}
	for i, c := range content {
		if c == '\n' {
			lines = append(lines, i+1)
		}
	}
	return lines
}

func (r *tomlReader) pos(n *unstable.Node) source.Position {
	if n.Raw.Length == 0 {
		return source.Position{}
	}
	// The parser can tell the place, too, but counts the lines from the top
	// each time.
	at := int(n.Raw.Offset)
	line, begins := slices.BinarySearch(r.lines, at)
	if !begins {
		line--
	}
	return source.Position{File: r.file, Line: line + 1, Column: at - r.lines[line] + 1}
}

// fewKeys is the size, in bytes, of a file that is too short for so many keys that
// it matters.
const fewKeys = 16 << 10

// manyKeys tells whether a table has more than MaxKeys keys, or the file tables of
// more than so many names, and where. The library's decoder compares each key with
// those beside it.
func (r *tomlReader) manyKeys(content []byte) (source.Position, bool) {
	if len(content) < fewKeys {
		return source.Position{}, false
	}
	names, keys := map[string]bool{}, 0
	r.p.Reset(content)
	for r.p.NextExpression() {
		e := r.p.Expression()
		path := r.key(e)
		switch e.Kind {
		case unstable.Table, unstable.ArrayTable:
			keys = 0
			name := ""
			for _, k := range path {
				name += "\x00" + k.name
			}
			names[name] = true
		case unstable.KeyValue:
			keys += 1 + keysIn(e.Value())
		}
		if max(keys, len(names)) > MaxKeys {
			return path[0].pos, true
		}
	}
	return source.Position{}, false
}

// keysIn counts the keys of the table in a value, with those of the tables in it; of
// an array, those of its largest element.
func keysIn(n *unstable.Node) (keys int) {
	switch n.Kind {
	case unstable.Array:
		for it := n.Children(); it.Next(); {
			keys = max(keys, keysIn(it.Node()))
		}
	case unstable.InlineTable:
		for it := n.Children(); it.Next(); {
			keys += keysIn(it.Node())
		}
	case unstable.KeyValue:
		return 1 + keysIn(n.Value())
	}
	return keys
}

type tomlKey struct {
	name string
	pos  source.Position
}

func (r *tomlReader) key(e *unstable.Node) []tomlKey {
	var keys []tomlKey
	for it := e.Key(); it.Next(); {
		keys = append(keys, tomlKey{string(it.Node().Data), r.pos(it.Node())})
	}
	return keys
}

// open finds or makes the table that a header names. In an array of tables,
// the last element is meant.
func (r *tomlReader) open(top *Map, e *unstable.Node, array bool) *Map {
	keys := r.key(e)
	m := top
	for _, k := range keys[:len(keys)-1] {
		m = m.inner(k)
	}
	last := keys[len(keys)-1]
	if !array {
		return m.inner(last)
	}
	element := Value{Kind: TableKind, Pos: last.pos, Table: newMap(last.pos)}
	if v := m.values[last.name]; v != nil {
		v.Items = append(v.Items, element)
	} else {
		m.set(last.name, last.pos, &Value{Kind: ArrayKind, Pos: last.pos, Items: []Value{element}})
	}
	return element.Table
}

// inner gives the table of a key, made if need be.
func (m *Map) inner(k tomlKey) *Map {
	v := m.values[k.name]
	switch {
	case v == nil:
		v = &Value{Kind: TableKind, Pos: k.pos, Table: newMap(k.pos)}
		m.set(k.name, k.pos, v)
	case v.Kind == ArrayKind && len(v.Items) > 0:
		return v.Items[len(v.Items)-1].Table
	}
	return v.Table
}

func (r *tomlReader) keyValue(m *Map, e *unstable.Node) {
	keys := r.key(e)
	for _, k := range keys[:len(keys)-1] {
		m = m.inner(k)
	}
	last := keys[len(keys)-1]
	v := r.value(e.Value(), last.pos)
	m.set(last.name, last.pos, &v)
}

// mark gives the # and the digits at the beginning of what follows a number.
func mark(rest []byte) string {
	n := 0
	for n < len(rest) && (n == 0 && rest[n] == '#' || n > 0 && '0' <= rest[n] && rest[n] <= '9') {
		n++
	}
	if n < 2 {
		return ""
	}
	return string(rest[:n])
}

func (r *tomlReader) value(n *unstable.Node, around source.Position) Value {
	v := Value{Pos: r.pos(n), Text: string(n.Data)}
	if v.Pos.Line == 0 {
		v.Pos = around
	}
	switch n.Kind {
	case unstable.Integer, unstable.Float:
		v.Kind, v.Mark = NumberKind, mark(r.content[n.Raw.Offset+n.Raw.Length:])
	case unstable.Bool:
		v.Kind = BoolKind
	case unstable.LocalDate, unstable.LocalTime, unstable.LocalDateTime, unstable.DateTime:
		v.Kind = DateKind
	case unstable.Array:
		v.Kind, v.Text = ArrayKind, ""
		for it := n.Children(); it.Next(); {
			if it.Node().Kind != unstable.Comment {
				v.Items = append(v.Items, r.value(it.Node(), v.Pos))
			}
		}
	case unstable.InlineTable:
		v.Kind, v.Text, v.Table = TableKind, "", newMap(v.Pos)
		for it := n.Children(); it.Next(); {
			if it.Node().Kind == unstable.KeyValue {
				r.keyValue(v.Table, it.Node())
			}
		}
	}
	return v
}

// A Reader takes typed values out of a Map and records what is wrong with them.
type Reader struct {
	*Map
	Faults *source.Collector
}

// want gives the value of a key if it is of the kind.
func (r Reader) want(key string, kind Kind, required bool) *Value {
	v := r.Get(key)
	switch {
	case v == nil && required:
		r.Faults.Add(r.Pos, "%s is missing", key)
	case v != nil && v.Kind != kind:
		r.Faults.Add(v.Pos, "%s is %s, %s is needed", key, v.Kind, kind)
		return nil
	}
	return v
}

// Text gives a text without blanks at its ends; the empty string where it is
// not there or faulty. A required text may not be empty.
func (r Reader) Text(key string, required bool) string {
	v := r.want(key, StringKind, required)
	if v == nil {
		return ""
	}
	text := strings.TrimSpace(v.Text)
	switch problem := TextProblem(text); {
	case problem != "":
		r.Faults.Add(v.Pos, "%s %s is %s", key, source.Quote(text), problem)
		return ""
	case text == "" && required:
		r.Faults.Add(v.Pos, "%s is empty", key)
	}
	return text
}

// Number gives a number as it is written; nil where it is not there.
func (r Reader) Number(key string, required bool) *Value { return r.want(key, NumberKind, required) }

// Texts gives an array of texts.
func (r Reader) Texts(key string) []Value {
	v := r.want(key, ArrayKind, false)
	if v == nil {
		return nil
	}
	list := make([]Value, 0, len(v.Items))
	for _, item := range v.Items {
		if item.Kind != StringKind {
			r.Faults.Add(item.Pos, "%s holds %s, only texts are allowed", key, item.Kind)
			continue
		}
		item.Text = strings.TrimSpace(item.Text)
		if problem := TextProblem(item.Text); problem != "" {
			r.Faults.Add(item.Pos, "%s holds %s, which is %s", key, source.Quote(item.Text), problem)
			continue
		}
		list = append(list, item)
	}
	return list
}

// Tables gives an array of tables.
func (r Reader) Tables(key string) []Reader {
	if v := r.Get(key); v != nil && v.Kind == TableKind {
		r.Faults.Add(v.Pos, "%s is a table, an array is needed: write [[%s]]", key, key)
		return nil
	}
	v := r.want(key, ArrayKind, false)
	if v == nil {
		return nil
	}
	var list []Reader
	for _, item := range v.Items {
		if item.Kind != TableKind {
			r.Faults.Add(item.Pos, "%s holds %s, only tables are allowed", key, item.Kind)
			continue
		}
		list = append(list, Reader{item.Table, r.Faults})
	}
	return list
}

// Inner gives a table; false where it is not there.
func (r Reader) Inner(key string) (Reader, bool) {
	v := r.want(key, TableKind, false)
	if v == nil {
		return Reader{}, false
	}
	return Reader{v.Table, r.Faults}, true
}

// Finish records the keys that nobody asked for.
func (r Reader) Finish(known ...string) {
	for _, key := range r.keys {
		if !r.used[key] && !slices.Contains(known, key) {
			var list []string
			for k := range r.used {
				list = append(list, k)
			}
			slices.Sort(list)
			r.Faults.Add(r.places[key], "unknown key %s, known are %s", source.Quote(key), strings.Join(list, ", "))
		}
	}
}
