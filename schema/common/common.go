// Package common finds what two texts have in common at their ends. Versions of a
// file mostly differ in one place, and a history has thousands of them.
package common

import "bytes"

// Pieces that are equal are passed over as a whole.
const piece = 64

// Start gives the number of bytes that two texts have in common at their
// beginning.
func Start(a, b []byte) int {
	most, n := min(len(a), len(b)), 0
	for n+piece <= most && bytes.Equal(a[n:n+piece], b[n:n+piece]) {
		n += piece
	}
	for n < most && a[n] == b[n] {
		n++
	}
	return n
}

// End gives the number of bytes that two texts have in common at their end.
func End(a, b []byte) int {
	most, n := min(len(a), len(b)), 0
	a, b = a[len(a)-most:], b[len(b)-most:]
	for n+piece <= most && bytes.Equal(a[most-n-piece:most-n], b[most-n-piece:most-n]) {
		n += piece
	}
	for n < most && a[most-1-n] == b[most-1-n] {
		n++
	}
	return n
}
