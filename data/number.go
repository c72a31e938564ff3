package data

import (
	"encoding/binary"
	"math"
	"strconv"
	"strings"
)

// Powers of ten that a float64 holds exactly; up to these a decimal number of at most 15 digits is one correctly
// rounded multiplication or division away (Clinger 1990, "How to read floating point numbers accurately").
var exact = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// parse reads a decimal number, correctly rounded. Beyond strconv it takes the exponents of Fortran (1.5D-03),
// and it refuses the hexadecimal digits and underscores that only a programmer would write. NaN and Inf are
// numbers here; where they are not wanted the caller says so.
func parse[T string | []byte](s T) (v float64, ok bool) {
	mantissa, exponent, negative, short := decimal(s)
	if !short {
		return parseSlow(string(s))
	}
	v = float64(mantissa)
	if exponent < 0 {
		v /= exact[-exponent]
	} else {
		v *= exact[exponent]
	}
	if negative {
		v = -v
	}
	return v, true
}

// decimal takes s apart if it is a plain decimal number whose digits fit 2⁵³ and whose power of ten is exact;
// short is false for everything else, right or wrong.
func decimal[T string | []byte](s T) (mantissa uint64, exponent int, negative, short bool) {
	i := 0
	if len(s) > 0 && (s[0] == '-' || s[0] == '+') {
		negative = s[0] == '-'
		i++
	}
	digits, point := 0, -1
	for ; i < len(s); i++ {
		if c := s[i] - '0'; c <= 9 {
			mantissa = mantissa*10 + uint64(c)
			digits++
		} else if s[i] == '.' && point < 0 {
			point = digits
		} else {
			break
		}
	}
	// 19 digits cannot overflow a uint64.
	if digits == 0 || digits > 19 || mantissa > 1<<53 {
		return 0, 0, false, false
	}
	if point >= 0 {
		exponent = point - digits
	}
	if i < len(s) {
		e, ok := power(s[i:])
		if !ok {
			return 0, 0, false, false
		}
		exponent += e
	}
	return mantissa, exponent, negative, exponent >= -22 && exponent <= 22
}

// plain reads the number that b begins with, in one pass over its bytes and eight digits at a time, if it is written
// in the way that nearly all numbers of a matrix are: at most fifteen digits or so and a small exponent or none. ok is
// false for all others, right or wrong. b must be longer than the number.
func plain(b []byte) (v float64, end int, ok bool) {
	i, negative := 0, b[0] == '-'
	if negative {
		i++
	}
	mantissa, from := digits(b, i, 0)
	count, exponent := from-i, 0
	if from < len(b) && b[from] == '.' {
		var to int
		mantissa, to = digits(b, from+1, mantissa)
		exponent = from + 1 - to
		count -= exponent
		from = to
	}
	// 19 digits cannot overflow a uint64.
	if count == 0 || count > 19 || mantissa > 1<<53 || from == len(b) {
		return 0, 0, false
	}
	if kinds[b[from]] == inNumber {
		to := min(from+5, len(b))
		for j := from; j < to; j++ {
			if kinds[b[j]] != inNumber {
				to = j
			}
		}
		e, ok := power(b[from:to])
		if !ok {
			return 0, 0, false
		}
		exponent += e
		from = to
	}
	if exponent < -22 || exponent > 22 || from == len(b) {
		return 0, 0, false
	}
	v = float64(mantissa)
	if exponent < 0 {
		v /= exact[-exponent]
	} else {
		v *= exact[exponent]
	}
	if negative {
		v = -v
	}
	return v, from, true
}

// digits appends the decimal digits of b from i on to a number and returns where they end. Eight at a time are added
// up in pairs, fours and eights within one word (from memory; common practice).
func digits(b []byte, i int, number uint64) (uint64, int) {
	for i+8 <= len(b) {
		w := binary.LittleEndian.Uint64(b[i:])
		if (w&0xf0f0f0f0f0f0f0f0)|((w+0x0606060606060606)&0xf0f0f0f0f0f0f0f0)>>4 != 0x3333333333333333 {
			break
		}
		w -= 0x3030303030303030
		w = w*10 + w>>8
		w = ((w&0x000000ff000000ff)*(100+1000000<<32) + (w>>16&0x000000ff000000ff)*(1+10000<<32)) >> 32
		number = number*1e8 + w
		i += 8
	}
	for ; i < len(b); i++ {
		c := uint64(b[i] - '0')
		if c > 9 {
			break
		}
		number = number*10 + c
	}
	return number, i
}

// power reads an exponent of one to three digits, such as e-05.
func power[T string | []byte](s T) (e int, ok bool) {
	if s[0]|0x20 != 'e' && s[0]|0x20 != 'd' {
		return 0, false
	}
	i, negative := 1, false
	if i < len(s) && (s[i] == '-' || s[i] == '+') {
		negative = s[i] == '-'
		i++
	}
	if i == len(s) || len(s)-i > 3 {
		return 0, false
	}
	for ; i < len(s); i++ {
		c := s[i] - '0'
		if c > 9 {
			return 0, false
		}
		e = e*10 + int(c)
	}
	if negative {
		e = -e
	}
	return e, true
}

func parseSlow(s string) (float64, bool) {
	if strings.ContainsAny(s, "xX_pP") {
		return math.NaN(), false
	}
	v, err := strconv.ParseFloat(s, 64)
	if err == nil {
		return v, true
	}
	if e, is := err.(*strconv.NumError); is && e.Err == strconv.ErrRange {
		return v, true
	}
	if d := strings.IndexAny(s, "dD"); d > 0 && !strings.ContainsAny(s, "eE") {
		return parseSlow(s[:d] + "e" + s[d+1:])
	}
	return math.NaN(), false
}
