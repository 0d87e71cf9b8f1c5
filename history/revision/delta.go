package revision

import (
	"bytes"
	"encoding/binary"
	"errors"
)

var errDelta = errors.New("malformed difference")

// applyDelta makes an object from its base and a difference, by gitformat-pack(5):
// the sizes of both, then pieces that are copied from the base and pieces that
// stand in the difference itself. Of a tree mostly one line differs, so that nearly
// all of the base stays where it is: an object of the same size begins as its copy.
func applyDelta(base, delta []byte) ([]byte, error) {
	from, n := binary.Uvarint(delta)
	if n <= 0 || from != uint64(len(base)) {
		return nil, errDelta
	}
	delta = delta[n:]
	size, n := binary.Uvarint(delta)
	if n <= 0 || size > maxRebuilt {
		return nil, errDelta
	}
	delta = delta[n:]
	var out []byte
	alike := size == from
	if alike {
		out = bytes.Clone(base)[:0]
	} else {
		out = make([]byte, 0, min(size, believed))
	}
	for len(delta) > 0 {
		op := delta[0]
		delta = delta[1:]
		if op&0x80 == 0 {
			length := int(op)
			if length == 0 || length > len(delta) || length > int(size)-len(out) {
				return nil, errDelta
			}
			out, delta = append(out, delta[:length]...), delta[length:]
			continue
		}
		// Each bit stands for a byte of the offset, then of the length, that is given.
		var number uint64
		for i := range 7 {
			if op&(1<<i) == 0 {
				continue
			}
			if len(delta) == 0 {
				return nil, errDelta
			}
			number |= uint64(delta[0]) << (8 * i)
			delta = delta[1:]
		}
		offset, length := int(number&0xffffffff), int(number>>32)
		if length == 0 {
			length = 0x10000
		}
		if offset > len(base)-length || length > int(size)-len(out) {
			return nil, errDelta
		}
		if alike && offset == len(out) {
			out = out[:offset+length] // it is there
		} else {
			out = append(out, base[offset:offset+length]...)
		}
	}
	if len(out) != int(size) {
		return nil, errDelta
	}
	return out, nil
}
