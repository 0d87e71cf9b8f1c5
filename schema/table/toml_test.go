package table

import (
	"fmt"
	"strings"
	"testing"

	"github.com/pelletier/go-toml/v2"

	"speedtrail/schema/source"
)

// write writes a value with the places of its parts.
func write(b *strings.Builder, v *Value) {
	fmt.Fprintf(b, "@%d:%d ", v.Pos.Line, v.Pos.Column)
	switch v.Kind {
	case ArrayKind:
		b.WriteString("[")
		for i := range v.Items {
			write(b, &v.Items[i])
			b.WriteString(";")
		}
		b.WriteString("]")
	case TableKind:
		writeMap(b, v.Table)
	default:
		fmt.Fprintf(b, "%s %q", v.Kind, v.Text)
	}
}

func writeMap(b *strings.Builder, m *Map) {
	fmt.Fprintf(b, "{@%d:%d", m.Pos.Line, m.Pos.Column)
	for _, key := range m.Keys() {
		fmt.Fprintf(b, " %s@%d:%d=", key, m.Place(key).Line, m.Place(key).Column)
		write(b, m.Get(key))
	}
	b.WriteString("}")
}

func written(m *Map) string {
	var b strings.Builder
	writeMap(&b, m)
	return b.String()
}

func TestReadTOML(t *testing.T) {
	tests := []struct{ name, content, want string }{
		{"empty", "", `{@1:0}`},
		{"kinds", "a = 'x'\nb = 12.40\nc = 2027-06-30\nd = true\n", `{@1:0 a@1:1=@1:5 a text "x" b@2:1=@2:5 a number "12.40" c@3:1=@3:5 a date "2027-06-30" d@4:1=@4:5 a boolean "true"}`},
		{"numbers as they are written", "a = -0.350\nb = 0x1F\nc = 1_000\nd = 1e3\ne = +5\nf = inf\ng = 12.400000\n",
			`{@1:0 a@1:1=@1:5 a number "-0.350" b@2:1=@2:5 a number "0x1F" c@3:1=@3:5 a number "1_000" d@4:1=@4:5 a number "1e3" e@5:1=@5:5 a number "+5" f@6:1=@6:5 a number "inf" g@7:1=@7:5 a number "12.400000"}`},
		{"texts", "a = \"x\\ty \\u00d8\"\nb = \"\"\"\nlong\"\"\"\n\"c d\" = ''\n", `{@1:0 a@1:1=@1:5 a text "x\ty Ø" b@2:1=@2:5 a text "long" c d@4:1=@4:9 a text ""}`},
		{"tables", "a = 1\n[limits]\nb = 2\n\n[limits.more]\nc = 3\n", `{@1:0 a@1:1=@1:5 a number "1" limits@2:2=@2:2 {@2:2 b@3:1=@3:5 a number "2" more@5:9=@5:9 {@5:9 c@6:1=@6:5 a number "3"}}}`},
		{"dotted", "limits.a = 1\nlimits.b = 2\n", `{@1:0 limits@1:1=@1:1 {@1:1 a@1:8=@1:12 a number "1" b@2:8=@2:12 a number "2"}}`},
		{"array of tables", "[[t]]\na = 1\n[[t]]\na = 2\n[t.x]\nb = 3\n", `{@1:0 t@1:3=@1:3 [@1:3 {@1:3 a@2:1=@2:5 a number "1"};@3:3 {@3:3 a@4:1=@4:5 a number "2" x@5:4=@5:4 {@5:4 b@6:1=@6:5 a number "3"}};]}`},
		{"byte order mark, CRLF, comments", "\ufeff# why\r\na = 1 # one\r\n", `{@1:0 a@2:1=@2:5 a number "1"}`},
		{"columns count bytes", "a = [\"Ä\", \"ö\"]\n", `{@1:0 a@1:1=@1:1 [@1:6 a text "Ä";@1:12 a text "ö";]}`},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			var faults source.Collector
			m := ReadTOML("t.toml", []byte(c.content), &faults)
			if m == nil || faults.Count() > 0 {
				t.Fatal(faultText(&faults))
			}
			if got := written(m); got != c.want {
				t.Errorf("got\n%s\nwant\n%s", got, c.want)
			}
		})
	}
}

// TOML takes the occurrence of a position for a comment where it is not quoted: the
// number has it as its mark.
func TestMarks(t *testing.T) {
	for content, want := range map[string]string{
		"a = 31.180#2\n": "#2", "a = 31.180#12": "#12", "a = 31.180#2 second": "#2", "a = 31.180#2:\n": "#2", "a = 31.180#2/\n": "#2",
		"a = 31.180 #2\n": "", "a = 31.180#\n": "", "a = 31.180#x2\n": "", "a = 31.180##2\n": "", "a = 31.180": "",
		"a = [31.180,2]\n": "", "a = [31.180#2\n]\n": "#2",
	} {
		var faults source.Collector
		m := ReadTOML("t.toml", []byte(content), &faults)
		if m == nil || faults.Count() > 0 {
			t.Fatalf("%q: %s", content, faultText(&faults))
		}
		v := m.Get("a")
		if v.Kind == ArrayKind {
			v = &v.Items[0]
		}
		if v.Mark != want {
			t.Errorf("%q: mark %q, want %q", content, v.Mark, want)
		}
	}
}

// A file whose form is faulty gives one fault with its place.
func TestReadTOMLFaults(t *testing.T) {
	tests := []struct {
		name, content string
		line, column  int
	}{
		{"no value", "a = 1\nb =\n", 2, 4},
		{"no key", "a = 1\n= 2\n", 2, 1},
		{"open text", "a = \"x\nb = 1\n", 1, 7},
		{"open array", "a = [1\n", 1, 7},
		{"open header", "[a\n", 1, 3},
		{"key twice", "a = 1\nb = 2\na = 3\n", 3, 1},
		{"key of a table twice", "[t]\na = 1\n[t]\nb = 1\n", 3, 2},
		{"table over a value", "t = 1\n[t]\n", 2, 2},
		{"array of tables over an array", "t = [1]\n[[t]]\n", 2, 3},
		{"array of tables over a table", "[t]\n[[t]]\n", 2, 3},
		{"key in an inline table", "t = {a = 1}\n[t.b]\n", 2, 2},
		{"dotted key into a value", "a = 1\na.b = 2\n", 2, 1},
		{"number with a leading zero", "a = 012\n", 1, 5},
		{"number above 64 bits", "a = 99999999999999999999\n", 1, 5},
		{"two values", "a = 1 b = 2\n", 1, 7},
		{"control code", "a = \"x\x01\"\n", 1, 7},
		{"table in an empty array", "t = []\n[t.b]\n", 2, 2},
		{"key in an empty array", "t = []\nt.b = 1\n", 2, 1},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			var faults source.Collector
			if m := ReadTOML("t.toml", []byte(c.content), &faults); m != nil || faults.Count() != 1 {
				t.Fatalf("%v: %s", m, faultText(&faults))
			}
			got, place := faultText(&faults), fmt.Sprintf("t.toml:%d:%d: not valid TOML: ", c.line, c.column)
			if !strings.HasPrefix(got, place) || strings.HasSuffix(got, ": ") {
				t.Errorf("got %s, want %s", got, place)
			}
		})
	}
}

// The library compares each key with those beside it, so that their number is
// bounded; elements of arrays have keys of their own.
func TestManyKeys(t *testing.T) {
	list := func(n int, item func(i int) string) string {
		var b strings.Builder
		for i := range n {
			b.WriteString(item(i))
		}
		return b.String()
	}
	pad := "# " + strings.Repeat("x", fewKeys) + "\n"
	const want = "more than 1000 keys in a table, or tables of different names"
	tests := []struct{ name, content, want string }{
		{"as many as there may be", pad + list(1000, func(i int) string { return fmt.Sprintf("a%d = 1\n", i) }), ""},
		{"one too many", pad + list(1001, func(i int) string { return fmt.Sprintf("a%d = 1\n", i) }), "t.toml:1002:1: " + want},
		{"in an element", pad + "[[t]]\na = 1\n[[t]]\n" + list(1001, func(i int) string { return fmt.Sprintf("a%d = 1\n", i) }), "t.toml:1005:1: " + want},
		{"over elements", list(3000, func(i int) string { return "[[t]]\na = 1\nb = 2\n" }), ""},
		{"over inline elements", "t = [" + list(3000, func(i int) string { return "{a = 1, b = 2}, " }) + "]\n", ""},
		{"in an inline table", "t = {" + list(2000, func(i int) string { return fmt.Sprintf("k%d = [{}], ", i) }) + "z = 1}\n", "t.toml:1:1: " + want},
		{"tables of different names", list(2000, func(i int) string { return fmt.Sprintf("[t%d]\na = 1\n", i) }), "t.toml:2001:2: " + want},
		{"arrays of tables of different names", list(2000, func(i int) string { return fmt.Sprintf("[[t%d]]\na = 1\n", i) }), "t.toml:2001:3: " + want},
		{"a form that is faulty", pad + "a =\n", ""},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			var faults source.Collector
			r := ReadTOML("t.toml", []byte(c.content), &faults)
			switch {
			case c.want != "" && (r != nil || faultText(&faults) != c.want):
				t.Errorf("got %s, want %s", faultText(&faults), c.want)
			case c.want == "" && strings.Contains(faultText(&faults), want):
				t.Errorf("refused: %s", faultText(&faults))
			}
		})
	}
}

func TestReader(t *testing.T) {
	const content = `text = "  x "
blank = " "
hidden = "a\u202eb"
number = 12
list = ["a", " b ", 3, "c\u0007"]
mixed = [{a = 1}, 2]
inner.a = 1
unknown = 1
"other\u0000" = 2
`
	var faults source.Collector
	r := Reader{ReadTOML("t.toml", []byte(content), &faults), &faults}
	if got := r.Text("text", true); got != "x" {
		t.Errorf("text %q", got)
	}
	if got := r.Text("blank", false); got != "" || faults.Count() != 0 {
		t.Errorf("blank text %q, %s", got, faultText(&faults))
	}
	var texts []string
	for _, v := range r.Texts("list") {
		texts = append(texts, fmt.Sprintf("%q@%d", v.Text, v.Pos.Column))
	}
	if got, want := strings.Join(texts, " "), `"a"@9 "b"@14`; got != want {
		t.Errorf("list %s, want %s", got, want)
	}
	if got := r.Tables("mixed"); len(got) != 1 || got[0].Get("a").Text != "1" {
		t.Errorf("mixed %v", got)
	}
	if inner, ok := r.Inner("inner"); !ok || inner.Number("a", true).Text != "1" {
		t.Errorf("inner %v, %v", inner, ok)
	}
	if _, ok := r.Inner("nothing"); ok || r.Number("nothing", false) != nil || r.Texts("nothing") != nil || r.Tables("nothing") != nil || r.Text("nothing", false) != "" {
		t.Error("something for a key that is not there")
	}
	// Whatever has another type or is not there is told, with its place.
	r.Text("blank", true)
	r.Text("hidden", false)
	r.Text("number", false)
	r.Text("missing", true)
	r.Number("absent", true)
	if v := r.Number("text", true); v != nil {
		t.Errorf("number %v", v)
	}
	r.Texts("text")
	r.Tables("number")
	r.Inner("number")
	r.Finish("blank", "hidden")
	const want = `t.toml:1: missing is missing
t.toml:1: absent is missing
t.toml:1:8: text is a text, a number is needed
t.toml:1:8: text is a text, an array is needed
t.toml:2:9: blank is empty
t.toml:3:10: hidden "a\u202eb" is holding an invisible mark that can deceive a reader, only visible characters are allowed
t.toml:4:10: number is a number, a text is needed
t.toml:4:10: number is a number, an array is needed
t.toml:4:10: number is a number, a table is needed
t.toml:5:21: list holds a number, only texts are allowed
t.toml:5:24: list holds "c\a", which is holding a control code, only visible characters are allowed
t.toml:6:19: mixed holds a number, only tables are allowed
t.toml:8:1: unknown key "unknown", known are absent, blank, hidden, inner, list, missing, mixed, nothing, number, text
t.toml:9:1: unknown key "other\x00", known are absent, blank, hidden, inner, list, missing, mixed, nothing, number, text`
	if got := faultText(&faults); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	if got := r.Place("number"); got.Line != 4 || got.Column != 1 {
		t.Errorf("number stands at %v", got)
	}
	if got := r.Place("missing"); got.Line != 1 || got.Column != 0 {
		t.Errorf("a key that is not there stands at %v", got)
	}
}

// agree compares a value with what the library's decoder makes of it.
func agree(v *Value, decoded any) bool {
	switch d := decoded.(type) {
	case map[string]any:
		if v.Kind != TableKind || len(v.Table.Keys()) != len(d) {
			return false
		}
		for key, inner := range d {
			w := v.Table.Get(key)
			if w == nil || !agree(w, inner) {
				return false
			}
		}
		return true
	case []any:
		if v.Kind != ArrayKind || len(v.Items) != len(d) {
			return false
		}
		for i, inner := range d {
			if !agree(&v.Items[i], inner) {
				return false
			}
		}
		return true
	case string:
		return v.Kind == StringKind && v.Text == d
	case bool:
		return v.Kind == BoolKind && v.Text == fmt.Sprint(d)
	case int64, float64:
		return v.Kind == NumberKind
	}
	return v.Kind == DateKind
}

func FuzzReadTOML(f *testing.F) {
	for _, s := range []string{"a = 1\n", "[[t]]\na = [1, {b = 2027-06-30}]\n[t.c]\nd = ''\n", "\ufeffa.b = \"x\\u0041\"\r\n", "t = [1]\n[[t]]\n", "a = {b = {}}\n[a.b]\n", "[a]\n[a.b]\n[[a.c]]\n",
		"a = [[], [# x\n1,\n]]\n", "'' = 1\n", "a = 12:00:00\nb = 1e3\n", "a=\"\"\"\n\\\n x\"\"\"", "[x.y]\nx.y = 1\n[x]\n", "a = \xff\n"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, content []byte) {
		var faults source.Collector
		m := ReadTOML("t.toml", content, &faults)
		if (m == nil) != (faults.Count() > 0) {
			t.Fatalf("%v with %s", m, faultText(&faults))
		}
		if m == nil {
			return
		}
		var decoded map[string]any
		if err := toml.Unmarshal([]byte(strings.TrimPrefix(string(content), "\ufeff")), &decoded); err != nil {
			t.Fatal(err)
		}
		if !agree(&Value{Kind: TableKind, Table: m}, decoded) {
			t.Fatalf("read\n%s\nthe decoder\n%v", written(m), decoded)
		}
		var places func(m *Map)
		lines := strings.Split(strings.TrimPrefix(string(content), "\ufeff"), "\n")
		places = func(m *Map) {
			for _, key := range m.Keys() {
				for _, p := range []source.Position{m.Place(key), m.Get(key).Pos} {
					if p.File != "t.toml" || p.Line < 1 || p.Line > len(lines) || p.Column < 1 || p.Column > len(lines[p.Line-1]) {
						t.Fatalf("%q stands at %v", key, p)
					}
				}
				if v := m.Get(key); v.Kind == TableKind {
					places(v.Table)
				}
			}
		}
		places(m)
	})
}
