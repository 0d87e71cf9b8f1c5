package render

import (
	"strings"
	"testing"
)

func TestLeftToRight(t *testing.T) {
	const name, two = "\u05e8\u05db\u05d1\u05ea", "\u05e7\u05d5 \u05d4\u05e6\u05e4\u05d5\u05df"
	for _, x := range []struct{ page, want string }{
		{"<p>none 3.000 km</p>", "<p>none 3.000 km</p>"},
		{"<p>" + name + " 3.000 km, " + two + "  7</p>", "<p>" + name + "\u200e 3.000 km, " + two + "\u200e  7</p>"},
		{"<b>" + name + "</b> 3", "<b>" + name + "\u200e</b> 3"},
		{`<article data-route="` + name + `"><option>` + name + `</option><pre>` + name + ` <b>1</b> ` + name + `</pre>` + name, `<article data-route="` + name + `"><option>` + name + `</option><pre>` + name + ` <b>1</b> ` + name + `</pre>` + name + "\u200e"},
		{"a < b", "a < b"},
	} {
		var b strings.Builder
		if err := writeMarked(&b, []byte(x.page)); err != nil || b.String() != x.want {
			t.Errorf("%q: got %q, want %q (%v)", x.page, b.String(), x.want, err)
		}
	}
}
