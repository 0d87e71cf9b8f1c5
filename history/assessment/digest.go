package assessment

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"
)

// DigestOf gives the digest of a stored document from its bytes, without writing
// any of them anew.
func DigestOf(body []byte) (string, error) {
	var parts struct {
		Computed jsontext.Value `json:"computed"`
		Format   string         `json:"format"`
		Named    jsontext.Value `json:"named"`
	}
	if err := json.Unmarshal(body, &parts, json.RejectUnknownMembers(true)); err != nil {
		return "", err
	}
	if parts.Format != Format {
		return "", fmt.Errorf("the format is %q, this version reads %q", parts.Format, Format)
	}
	sum := sha256.New()
	sum.Write([]byte(Format + "\n"))
	sum.Write(parts.Computed)
	return hex.EncodeToString(sum.Sum(nil)), nil
}
