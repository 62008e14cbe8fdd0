package spec

import (
	"math"
	"strconv"
	"unsafe"
)

// pow10 are the powers of ten that a float64 holds exactly.
var pow10 = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// scanNumber reads the decimal number at the start of b and returns it,
// correctly rounded, with the number of bytes it takes; 0 bytes when there is
// none. Numbers too large for a float64 come back infinite. It allocates
// nothing.
//
// A number is sign, digits with at most one decimal point, exponent; nothing
// else (no "1_000", "0x1F", "inf").
func scanNumber(b []byte) (float64, int) {
	i, neg := 0, false
	if i < len(b) && (b[i] == '-' || b[i] == '+') {
		neg = b[i] == '-'
		i++
	}
	var (
		mant      uint64
		exp       int
		sig       int // significant digits in mant
		digits    bool
		truncated bool
	)
	for ; i < len(b) && b[i]-'0' <= 9; i++ {
		digits = true
		if sig < 19 {
			mant = mant*10 + uint64(b[i]-'0')
			if mant != 0 {
				sig++
			}
		} else {
			truncated = true
			exp++
		}
	}
	if i < len(b) && b[i] == '.' {
		j := i + 1
		for ; j < len(b) && b[j]-'0' <= 9; j++ {
			digits = true
			if sig < 19 {
				mant = mant*10 + uint64(b[j]-'0')
				if mant != 0 {
					sig++
				}
				exp--
			} else {
				truncated = true
			}
		}
		if digits {
			i = j
		}
	}
	if !digits {
		return 0, 0
	}
	if i < len(b) && (b[i] == 'e' || b[i] == 'E') {
		j, eneg := i+1, false
		if j < len(b) && (b[j] == '-' || b[j] == '+') {
			eneg = b[j] == '-'
			j++
		}
		if j < len(b) && b[j]-'0' <= 9 {
			e := 0
			for ; j < len(b) && b[j]-'0' <= 9; j++ {
				if e < 100000 {
					e = e*10 + int(b[j]-'0')
				}
			}
			if eneg {
				e = -e
			}
			exp += e
			i = j
		}
	}
	// An integer below 2⁵³ times or over an exact power of ten is rounded
	// once, hence correctly (Clinger 1990).
	if !truncated && mant < 1<<53 && exp >= -22 && exp <= 22 {
		f := float64(mant)
		if exp < 0 {
			f /= pow10[-exp]
		} else {
			f *= pow10[exp]
		}
		if neg {
			f = -f
		}
		return f, i
	}
	f, err := strconv.ParseFloat(unsafe.String(&b[0], i), 64)
	if err != nil && !math.IsInf(f, 0) {
		return 0, 0
	}
	return f, i
}

// scanInt reads b as a whole number without sign; ok is false when b holds
// anything else or more than 18 digits.
func scanInt(b []byte) (v int64, ok bool) {
	if len(b) == 0 || len(b) > 18 {
		return 0, false
	}
	for _, c := range b {
		if c-'0' > 9 {
			return 0, false
		}
		v = v*10 + int64(c-'0')
	}
	return v, true
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
