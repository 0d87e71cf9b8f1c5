package canon

import (
	"bytes"
	"encoding/json"
	"errors"
	"strings"
	"testing"

	"github.com/gowebpki/jcs"
	"pgregory.net/rapid"
)

// RFC 8785, 3.2.3: members in the order of UTF-16 code units; 3.2.2.2: how texts
// are escaped. The expected bytes are those of the RFC's rules, worked by hand.
func TestMarshal(t *testing.T) {
	for _, test := range []struct {
		name string
		v    any
		want string
	}{
		{"order", map[string]any{"b": 1, "a": []string{}, "A": true}, `{"A":true,"a":[],"b":1}`},
		{"UTF-16 order", map[string]int{"\uFB33": 1, "\U0001F600": 2, "\u20ac": 3}, "{\"\u20ac\":3,\"\U0001F600\":2,\"\uFB33\":1}"},
		{"escapes", "\u0000\b\t\n\f\r\"\\/\u007f\u2028<>&", "\"\\u0000\\b\\t\\n\\f\\r\\\"\\\\/\u007f\u2028<>&\""},
		{"nil slice", struct {
			List []int `json:"list"`
		}{}, `{"list":[]}`},
		{"large number", int64(1)<<53 - 1, "9007199254740991"},
	} {
		got, err := Marshal(test.v)
		if err != nil || string(got) != test.want {
			t.Errorf("%s: got %s, %v, want %s", test.name, got, err, test.want)
		}
		if err := Check(got); err != nil {
			t.Errorf("%s: %v", test.name, err)
		}
	}
	if _, err := Marshal("\xff"); err == nil {
		t.Error("a text that is not UTF-8 was written")
	}
}

func TestCheckRefuses(t *testing.T) {
	for _, body := range []string{``, ` {}`, `{"b":1,"a":1}`, `{"a": 1}`, `{"a":1,"a":1}`, `"\u0041"`, `1.0`, `1e3`, `{} {}`, "\"\xff\"", `[1,]`} {
		if err := Check([]byte(body)); !errors.Is(err, ErrNotCanonical) {
			t.Errorf("%q: %v", body, err)
		}
	}
}

func TestUnmarshalRefusesUnknownMembers(t *testing.T) {
	var v struct {
		A int `json:"a"`
	}
	if err := Unmarshal([]byte(`{"a":1,"b":2}`), &v); err == nil {
		t.Error("an unknown member was passed over")
	}
}

// The same bytes as another implementation of RFC 8785 (gowebpki/jcs).
func TestAgainstAnotherImplementation(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := map[string]any{}
		for range rapid.IntRange(0, 6).Draw(t, "members") {
			key := rapid.String().Draw(t, "key")
			switch rapid.IntRange(0, 3).Draw(t, "type") {
			case 0:
				v[key] = rapid.Int64Range(-(1<<53)+1, 1<<53-1).Draw(t, "number")
			case 1:
				v[key] = rapid.String().Draw(t, "text")
			case 2:
				v[key] = rapid.SliceOf(rapid.Bool()).Draw(t, "list")
			default:
				v[key] = map[string]any{rapid.String().Draw(t, "inner"): nil}
			}
		}
		got, err := Marshal(v)
		if err != nil {
			t.Skip("not UTF-8")
		}
		plain, err := json.Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		want, err := jcs.Transform(plain)
		if err != nil {
			t.Skip("the other implementation refuses it: ", err)
		}
		if !bytes.Equal(got, want) {
			t.Fatalf("got %s, want %s", got, want)
		}
	})
}

// What is taken at sight to be canonical is so for the library as well, and the
// bodies that the ledger holds are taken at sight.
func TestPlainly(t *testing.T) {
	for _, x := range []struct {
		body  string
		plain bool // taken at sight
		canon bool
	}{
		{`{}`, true, true}, {`[]`, true, true}, {`{"a":[1,true,null,"x"],"b":{"c":-12}}`, true, true}, {`0`, true, true}, {`""`, true, true},
		{`{"":1,"A":1,"a":2}`, true, true}, {`{"a":1,"aa":2}`, true, true}, {`{"aa":1,"a":2}`, false, false}, {`{"a":1,"a":2}`, false, false},
		{`{"b":1,"a":2}`, false, false}, {`{"":1,"":2}`, false, false}, {`[{"b":1},{"a":1}]`, true, true},
		{`"\b\t\n\f\r\"\\"`, true, true}, {`"\u0000\u000b\u000e\u001f"`, true, true}, {`"\u0008"`, false, false}, {`"\u0009"`, false, false},
		{`"\u001g"`, false, false}, {`"\u001:"`, false, false}, {`"\u0010"`, true, true}, {`"\u001a"`, true, true},
		{`"\u000a"`, false, false}, {`"\u000c"`, false, false}, {`"\u000d"`, false, false}, {`"\u001F"`, false, false}, {`"\u0020"`, false, false},
		{`"\/"`, false, false}, {`"\u00"`, false, false}, {`"\`, false, false}, {`"\u`, false, false}, {`"\x"`, false, false},
		{"\"\u00e9\u20ac\U0001f600\u007f\"", true, true}, {"\"\xc3\"", false, false}, {"\"\xed\xa0\x80\"", false, false}, {"\"\x1f\"", false, false}, {"\"\n\"", false, false},
		{"{\"\u00e9\":1}", false, true}, {`{"\n":1}`, false, true},
		{`999999999999999`, true, true}, {`9007199254740991`, false, true}, {`-0`, false, false}, {`01`, false, false}, {`-01`, false, false}, {`-`, false, false},
		{`1.5`, false, true}, {`1e3`, false, false}, {`+1`, false, false}, {`1.`, false, false},
		{`tru`, false, false}, {`nul`, false, false}, {`falsey`, false, false}, {`true,`, false, false}, {`[1,]`, false, false}, {`[,1]`, false, false}, {`[1 ,2]`, false, false},
		{`{"a":1,}`, false, false}, {`{,}`, false, false}, {`{"a"}`, false, false}, {`{"a":}`, false, false}, {`{"a":1`, false, false}, {`[1`, false, false}, {`[`, false, false},
		{`{`, false, false}, {``, false, false}, {` 1`, false, false}, {`1 `, false, false}, {`{a:1}`, false, false}, {`[1]]`, false, false}, {`[1}`, false, false}, {`{"a":1]`, false, false},
		{strings.Repeat("[", mostDepth) + strings.Repeat("]", mostDepth), true, true}, {strings.Repeat("[", mostDepth+1) + strings.Repeat("]", mostDepth+1), false, true},
	} {
		if got := plainly([]byte(x.body)); got != x.plain {
			t.Errorf("%q: at sight %v", x.body, got)
		}
		if got := checkByLibrary([]byte(x.body)) == nil; got != x.canon {
			t.Errorf("%q: by the library %v", x.body, got)
		}
	}
}

func FuzzCheck(f *testing.F) {
	f.Add([]byte(`{"a":[1,true,null,"x"]}`))
	f.Add([]byte(`{"b":1,"a":1}`))
	f.Add([]byte(`{"\u0001":-10,"a":"\n","b":{"c":[]}}`))
	f.Fuzz(func(t *testing.T, body []byte) {
		if plainly(body) {
			if err := checkByLibrary(body); err != nil {
				t.Fatalf("%q is taken for canonical: %v", body, err)
			}
		}
		if Check(body) != nil {
			return
		}
		var v any
		if err := json.Unmarshal(body, &v); err != nil {
			t.Fatalf("%q is canonical and no JSON: %v", body, err)
		}
	})
}
