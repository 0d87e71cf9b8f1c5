package assessment

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"

	"speedtrail/history/canon"
)

// Decode reads a stored document, and gives its digest from the very bytes,
// without writing any of them anew.
func Decode(body []byte) (d *Document, digest string, err error) {
	d = new(Document)
	stored := struct {
		Computed *computedPart `json:"computed"`
		Format   *string       `json:"format"`
		Named    *Named        `json:"named"`
	}{&computedPart{into: &d.Computed}, &d.Format, &d.Named}
	part := stored.Computed
	if err := canon.Unmarshal(body, &stored); err != nil {
		return nil, "", err
	}
	if d.Format != Format {
		return nil, "", fmt.Errorf("the format is %q, this version reads %q", d.Format, Format)
	}
	if part.end == 0 {
		return nil, "", errors.New("there is no member \"computed\"")
	}
	if err := d.Computed.check(); err != nil {
		return nil, "", err
	}
	sum := sha256.New()
	sum.Write([]byte(Format + "\n"))
	sum.Write(part.in(body))
	return d, hex.EncodeToString(sum.Sum(nil)), nil
}

// computedPart is the member "computed", which is read where it stands.
type computedPart struct {
	into       *Computed
	start, end int64 // what lies between, the colon before it included
}

// UnmarshalJSONFrom implements json.UnmarshalerFrom.
func (p *computedPart) UnmarshalJSONFrom(from *jsontext.Decoder) error {
	p.start = from.InputOffset()
	err := json.UnmarshalDecode(from, p.into)
	p.end = from.InputOffset()
	return err
}

// in gives the bytes of the member.
func (p *computedPart) in(body []byte) []byte {
	return bytes.TrimLeft(body[p.start:p.end], ": \t\r\n")
}
