// Package unit holds the two quantities of route speed data as exact
// integers: distances in millimetres and speeds in kilometres an hour.
//
// Both are read from decimal text and written back without a detour over
// binary fractions, so that "12.4" is 12,400,000 mm on every machine:
//
//	d, err := unit.ParseKM("12.4") // 12400000
//	d.KM()                         // "12.400"
package unit

import (
	"errors"
	"strconv"
	"strings"
)

// Distance is a length or a chainage in whole millimetres. Chainages may be
// negative.
type Distance int64

// The units that distances are written in.
const (
	Millimetre Distance = 1
	Metre               = 1000 * Millimetre
	Kilometre           = 1000 * Metre
)

// Counts, sizes and speeds are ints all over the program, and their bounds were
// chosen for 64 bits: on a machine with fewer it does not compile.
const _ = uint(1 << 63)

// MaxKM bounds the chainages that are read: six digits before the point. It
// keeps every sum of distances far inside 64 bits.
const MaxKM = 999_999

// The ways in which a text is no chainage.
var (
	ErrKM         = errors.New("not a number of kilometres with at most six digits before and six after a decimal point")
	ErrKMComma    = errors.New("written with a comma, the decimal sign is a point")
	ErrKMDecimals = errors.New("finer than a millimetre, at most six decimals are allowed")
)

// ParseKM reads a chainage in kilometres with a decimal point and at most six
// decimals (one millimetre); exponents and thousands separators are refused.
func ParseKM(s string) (Distance, error) {
	digits, negative := strings.CutPrefix(s, "-")
	whole, fraction, point := strings.Cut(digits, ".")
	if strings.Contains(digits, ",") {
		return 0, ErrKMComma
	}
	if !allDigits(whole) || point && !allDigits(fraction) {
		return 0, ErrKM
	}
	if len(fraction) > 6 {
		if strings.Trim(fraction[6:], "0") != "" || len(fraction) > 18 {
			return 0, ErrKMDecimals
		}
		// A spreadsheet may pad with zeros; they add nothing.
		fraction = fraction[:6]
	}
	whole = strings.TrimLeft(whole, "0")
	if len(whole) > 6 {
		return 0, ErrKM
	}
	n, err := strconv.ParseInt(whole+fraction+"000000"[len(fraction):], 10, 64)
	if err != nil {
		return 0, ErrKM
	}
	if negative {
		n = -n
	}
	return Distance(n), nil
}

func allDigits(s string) bool {
	for i := range len(s) {
		if s[i] < '0' || s[i] > '9' {
			return false
		}
	}
	return s != ""
}

// KM writes a distance in kilometres with three decimals, and up to six where
// the value has them.
func (d Distance) KM() string { return d.decimal(6, 3) }

// M writes a distance in metres with as many decimals, up to three, as the
// value has.
func (d Distance) M() string { return d.decimal(3, 0) }

// decimal writes d / 10^places with at least least decimals.
func (d Distance) decimal(places, least int) string {
	sign, n := "", uint64(d)
	if d < 0 {
		sign, n = "-", -n
	}
	s := strconv.FormatUint(n, 10)
	if len(s) <= places {
		s = strings.Repeat("0", places+1-len(s)) + s
	}
	whole, fraction := s[:len(s)-places], s[len(s)-places:]
	for len(fraction) > least && fraction[len(fraction)-1] == '0' {
		fraction = fraction[:len(fraction)-1]
	}
	if fraction == "" {
		return sign + whole
	}
	return sign + whole + "." + fraction
}
