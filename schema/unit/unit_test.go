package unit

import (
	"errors"
	"math/big"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestParseKM(t *testing.T) {
	tests := []struct {
		text string
		want Distance
		err  error
	}{
		{"0", 0, nil},
		{"12", 12 * Kilometre, nil},
		{"12.4", 12_400_000, nil},
		{"-0.350", -350_000, nil},
		{"-0", 0, nil},
		{"-0.000000", 0, nil},
		{"0.000001", Millimetre, nil},
		{"-0.000001", -Millimetre, nil},
		{"0.1", 100 * Metre, nil}, // no binary fraction equals a tenth
		{"0.3", 300 * Metre, nil},
		{"007.5", 7_500_000, nil},
		{"999999.999999", 999_999_999_999, nil},
		{"-999999.999999", -999_999_999_999, nil},
		{"000000000000001", Kilometre, nil},
		{"1.123456000", 1_123_456, nil}, // spreadsheets pad with zeros
		{"1.000000000000000000", Kilometre, nil},
		{"1.0000000000000000000", 0, ErrKMDecimals},
		{"1.1234561", 0, ErrKMDecimals},
		{"1.0000001", 0, ErrKMDecimals},
		{"1000000", 0, ErrKM},
		{"-1000000", 0, ErrKM},
		{"99999999999999999999", 0, ErrKM},
		{"12,4", 0, ErrKMComma},
		{"1,234.5", 0, ErrKMComma},
		{"", 0, ErrKM},
		{"-", 0, ErrKM},
		{".", 0, ErrKM},
		{".5", 0, ErrKM},
		{"5.", 0, ErrKM},
		{"+5", 0, ErrKM},
		{"--5", 0, ErrKM},
		{"- 5", 0, ErrKM},
		{" 5", 0, ErrKM},
		{"5 ", 0, ErrKM},
		{"1e3", 0, ErrKM},
		{"0x10", 0, ErrKM},
		{"1_000", 0, ErrKM},
		{"1.2.3", 0, ErrKM},
		{"1.-2", 0, ErrKM},
		{"inf", 0, ErrKM},
		{"nan", 0, ErrKM},
		{"12km", 0, ErrKM},
		{"١٢", 0, ErrKM}, // digits, but not those of ASCII
		{"1\x00", 0, ErrKM},
	}
	for _, c := range tests {
		got, err := ParseKM(c.text)
		if got != c.want || !errors.Is(err, c.err) || (err == nil) != (c.err == nil) {
			t.Errorf("ParseKM(%q) = %d, %v, want %d, %v", c.text, got, err, c.want, c.err)
		}
	}
}

func TestWriteDistance(t *testing.T) {
	tests := []struct {
		d     Distance
		km, m string
	}{
		{0, "0.000", "0"},
		{Millimetre, "0.000001", "0.001"},
		{-Millimetre, "-0.000001", "-0.001"},
		{Metre, "0.001", "1"},
		{12_400_000, "12.400", "12400"},
		{12_400_010, "12.40001", "12400.01"},
		{-350_000, "-0.350", "-350"},
		{1_500, "0.0015", "1.5"},
		{999_999_999_999, "999999.999999", "999999999.999"},
		{-1 << 63, "-9223372036854.775808", "-9223372036854775.808"},
		{1<<63 - 1, "9223372036854.775807", "9223372036854775.807"},
	}
	for _, c := range tests {
		if km, m := c.d.KM(), c.d.M(); km != c.km || m != c.m {
			t.Errorf("%d mm is written %s km and %s m, want %s and %s", int64(c.d), km, m, c.km, c.m)
		}
	}
}

// Law: ParseKM(d.KM()) == d for every distance that can be read, and KM writes
// three to six decimals.
func TestKMRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Distance(rapid.Int64Range(-999_999_999_999, 999_999_999_999).Draw(t, "mm"))
		text := d.KM()
		if got, err := ParseKM(text); got != d || err != nil {
			t.Fatalf("ParseKM(%q) = %d, %v, want %d", text, got, err, d)
		}
		if _, decimals, _ := strings.Cut(text, "."); len(decimals) < 3 || len(decimals) > 6 || len(decimals) > 3 && strings.HasSuffix(decimals, "0") {
			t.Fatalf("%d is written %s", d, text)
		}
		exact(t, text, d, 1_000_000)
		exact(t, d.M(), d, 1_000)
	})
}

// exact compares a written number with d thousandths or millionths in exact
// arithmetic of the standard library.
func exact(t interface{ Fatalf(string, ...any) }, text string, d Distance, scale int64) {
	got, ok := new(big.Rat).SetString(text)
	if !ok || got.Cmp(big.NewRat(int64(d), scale)) != 0 {
		t.Fatalf("%d / %d is written %s", d, scale, text)
	}
}

// SUBSET-026 issue 4.0.0, 7.5.1: V_STATIC, V_DIFF, V_AXLELOAD and V_TSR are 0
// to 120 times 5 km/h. Zero is not a speed of a data set.
func TestParseSpeed(t *testing.T) {
	good := map[int]bool{}
	for n := 1; n <= 120; n++ {
		good[5*n] = true
	}
	for v := -10; v <= 1010; v++ {
		got, err := ParseSpeed(Speed(v).String())
		if good[v] != (err == nil) || good[v] && int(got) != v || !good[v] && got != 0 {
			t.Errorf("ParseSpeed(%d) = %d, %v", v, got, err)
		}
	}
	for _, text := range []string{"", " 50", "50 ", "+50", "-50", "5.0", "5e1", "0x5", "50km/h", "5_0", "٥", "500000000000000000000", "0050"} {
		if got, err := ParseSpeed(text); !errors.Is(err, ErrSpeed) || got != 0 {
			t.Errorf("ParseSpeed(%q) = %d, %v", text, got, err)
		}
	}
	if got, err := ParseSpeed("095"); got != 95 || err != nil {
		t.Errorf("ParseSpeed(095) = %d, %v", got, err)
	}
}

func FuzzParseKM(f *testing.F) {
	for _, s := range []string{"12.4", "-0.350", "1.000000000", "1,5", "1e3", "", "999999.999999", "-.5", "0.0000001"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		d, err := ParseKM(s)
		if err != nil {
			if d != 0 || !errors.Is(err, ErrKM) && !errors.Is(err, ErrKMComma) && !errors.Is(err, ErrKMDecimals) {
				t.Fatalf("%d beside %v", d, err)
			}
			return
		}
		// What is read is the number that is written, exactly.
		exact(t, strings.TrimPrefix(s, "-"), max(d, -d), 1_000_000)
		if d > (MaxKM+1)*Kilometre || d < -(MaxKM+1)*Kilometre {
			t.Fatalf("%q is past the bound", s)
		}
		if again, err := ParseKM(d.KM()); again != d || err != nil {
			t.Fatalf("%q reads as %d, %s as %d, %v", s, d, d.KM(), again, err)
		}
	})
}
