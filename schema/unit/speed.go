package unit

import (
	"errors"
	"strconv"
)

// Speed is a speed in whole km/h. The speeds of a data set are multiples of
// SpeedStep from SpeedStep to MaxSpeed; 0 stands for "not given".
type Speed int32

// Resolution and range of the speeds that the standard can transmit
// (SUBSET-026 7.5.1: V_STATIC, V_DIFF, V_AXLELOAD, V_TSR, V_MAXTRAIN).
const (
	SpeedStep Speed = 5
	MaxSpeed  Speed = 600
)

// ErrSpeed says what a speed may be.
var ErrSpeed = errors.New("not a multiple of 5 from 5 to 600 (km/h), in digits alone")

// ParseSpeed reads a speed in whole km/h. Zero is refused: a stretch that no
// train may enter is not described by a speed.
func ParseSpeed(s string) (Speed, error) {
	if len(s) > 3 || !allDigits(s) {
		return 0, ErrSpeed
	}
	n, err := strconv.Atoi(s)
	v := Speed(n)
	if err != nil || v < SpeedStep || v > MaxSpeed || v%SpeedStep != 0 {
		return 0, ErrSpeed
	}
	return v, nil
}

// String writes the number alone; the unit stands in the head of a column.
func (v Speed) String() string { return strconv.Itoa(int(v)) }
