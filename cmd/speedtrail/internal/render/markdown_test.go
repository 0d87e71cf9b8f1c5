package render

import "testing"

func TestMarkdownText(t *testing.T) {
	for text, want := range map[string]string{
		"km 1.5":           "km 1.5",
		"a*b_c[d](e)":      `a\*b\_c\[d\]\(e\)`,
		"<b>&":             "&lt;b&gt;&amp;",
		"a|b":              `a\|b`,
		"$1 60^{2}$":       `\$1 60\^\{2\}\$`, // 160 squared where formulas are set
		"line\nline\u202e": `line\\nline\\u202e`,
	} {
		if got := md(text); got != want {
			t.Errorf("%q became %q, want %q", text, got, want)
		}
	}
}
