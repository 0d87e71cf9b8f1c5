package history

import (
	"bytes"
	"strings"
	"testing"

	"github.com/go-json-experiment/json"

	"speedtrail/schema/source"
)

// A body is refused just where its line would be too long, whatever the escapes in
// it: the bytes of the rest of a line aside, which are reckoned at a thousand.
func TestCheckBody(t *testing.T) {
	for name, body := range map[string]string{
		"plain":               strings.Repeat("a", 6000),
		"quotes":              strings.Repeat(`"`, 6000),
		"backslashes":         strings.Repeat(`\`, 6000),
		"letters of others":   strings.Repeat("\u00fc", 3000),
		"codes of a terminal": strings.Repeat("\x7f", 6000),
		"marks of direction":  strings.Repeat("\u202e", 2000),
		"tags":                strings.Repeat("\U000e0041", 1500),
	} {
		t.Run(name, func(t *testing.T) {
			text, err := json.Marshal(exported{Body: body, Hash: strings.Repeat("f", 64), Kind: "assessment", Previous: strings.Repeat("f", 64), Seq: 1 << 60, Time: "2026-03-01T12:00:00Z"})
			if err != nil {
				t.Fatal(err)
			}
			var line bytes.Buffer
			if _, err := source.InertJSON(&line).Write(text); err != nil {
				t.Fatal(err)
			}
			if err := checkBody([]byte(body), line.Len()-1); err == nil {
				t.Errorf("a line of %d bytes is let through where %d may be", line.Len(), line.Len()-1)
			}
			if err := checkBody([]byte(body), line.Len()+1000); err != nil {
				t.Errorf("a line of %d bytes is refused where %d may be: %v", line.Len(), line.Len()+1000, err)
			}
		})
	}
}
