package export

import "math"

// Colours of values. A ratio of achieved to specified prestress is shown on a
// scale of two hues around 1: blue below (the fabric is slacker than asked), a
// pale neutral at 1, orange above (tighter). Blue and orange stay apart for all
// common kinds of colour blindness, and both arms darken equally, so that the
// size of a deviation can be read without hue. Slope has a scale of one hue.
//
// Steps are even in OKLab (Björn Ottosson, "A perceptual color space for image
// processing", 2020, from memory), so equal steps of a value look equal.

// rgb is a colour in linear light, each part from 0 to 1.
type rgb [3]float64

type oklab struct{ l, a, b float64 }

// The ends and middles of the scales.
var (
	below   = oklab{0.45, -0.03, -0.13}
	neutral = oklab{0.95, 0.002, 0.012}
	above   = oklab{0.45, 0.09, 0.085}
	steep   = oklab{0.40, -0.075, 0.02}
)

// deviationColour returns the colour of t from −1 (below) over 0 to 1 (above).
func deviationColour(t float64) rgb {
	if math.IsNaN(t) {
		return rgb{0.5, 0.5, 0.5}
	}
	t = max(-1, min(1, t))
	if t < 0 {
		return mix(neutral, below, -t).linear()
	}
	return mix(neutral, above, t).linear()
}

// shareColour returns the colour of t from 0 to 1 on a scale of one hue.
func shareColour(t float64) rgb {
	if math.IsNaN(t) {
		return rgb{0.5, 0.5, 0.5}
	}
	return mix(neutral, steep, max(0, min(1, t))).linear()
}

func mix(a, b oklab, t float64) oklab {
	return oklab{a.l + t*(b.l-a.l), a.a + t*(b.a-a.a), a.b + t*(b.b-a.b)}
}

func (c oklab) linear() rgb {
	l := c.l + 0.3963377774*c.a + 0.2158037573*c.b
	m := c.l - 0.1055613458*c.a - 0.0638541728*c.b
	s := c.l - 0.0894841775*c.a - 1.2914855480*c.b
	l, m, s = l*l*l, m*m*m, s*s*s
	clip := func(v float64) float64 { return max(0, min(1, v)) }
	return rgb{
		clip(+4.0767416621*l - 3.3077115913*m + 0.2309699292*s),
		clip(-1.2684380046*l + 2.6097574011*m - 0.3413193965*s),
		clip(-0.0041960863*l - 0.7034186147*m + 1.7076147010*s),
	}
}

// srgb returns the colour for a screen, each part from 0 to 255 (IEC 61966-2-1).
func (c rgb) srgb() [3]uint8 {
	var out [3]uint8
	for i, v := range c {
		if v <= 0.0031308 {
			v *= 12.92
		} else {
			v = 1.055*math.Pow(v, 1/2.4) - 0.055
		}
		out[i] = uint8(math.Round(255 * max(0, min(1, v))))
	}
	return out
}

// fromScreen is the inverse of srgb.
func fromScreen(r, g, b uint8) rgb {
	var out rgb
	for i, c := range [3]uint8{r, g, b} {
		v := float64(c) / 255
		if v <= 0.04045 {
			out[i] = v / 12.92
		} else {
			out[i] = math.Pow((v+0.055)/1.055, 2.4)
		}
	}
	return out
}
