package fieldfile

import "math"

// A Colour is red, green, blue in sRGB (IEC 61966-2-1), 8 bits each.
type Colour [3]uint8

// NoValue is the colour of what is not finite: a neutral grey, which the scale never
// comes near, being coloured all along.
var NoValue = Colour{128, 128, 128}

// scale holds 256 steps of the path below.
var scale = func() (scale [256]Colour) {
	for i := range scale {
		scale[i] = pathColour(float64(i) / 255)
	}
	return scale
}()

// ColourAt is the colour of a value that lies the fraction t of the way from the
// smallest to the largest, from dark petrol over violet and rose to pale sand. t is
// clamped to [0, 1]; NaN gives NoValue.
//
// The scale is a helix in OKLab (B. Ottosson, A perceptual color space for image
// processing, 2020): lightness 0.28 + 0.65 t, so that equal steps look equal and a
// grey print keeps their order; hue 220° + 225° t; chroma 0.045 + 0.09 sin(π t), which
// stays inside sRGB along the whole path.
func ColourAt(t float64) Colour {
	if t != t {
		return NoValue
	}
	return scale[int(math.Round(255*max(0, min(1, t))))]
}

func pathColour(t float64) Colour {
	sin, cos := math.Sincos((220 + 225*t) * math.Pi / 180)
	chroma := 0.045 + 0.09*math.Sin(math.Pi*t)
	linear := okLabToLinear(0.28+0.65*t, chroma*cos, chroma*sin)
	var c Colour
	for i, v := range linear {
		c[i] = uint8(math.Round(255 * gammaEncoded(v)))
	}
	return c
}

// okLabToLinear is Ottosson's inverse transform, to linear sRGB.
func okLabToLinear(lightness, a, b float64) [3]float64 {
	cube := func(x float64) float64 { return x * x * x }
	l := cube(lightness + 0.3963377774*a + 0.2158037573*b)
	m := cube(lightness - 0.1055613458*a - 0.0638541728*b)
	s := cube(lightness - 0.0894841775*a - 1.2914855480*b)
	return [3]float64{
		+4.0767416621*l - 3.3077115913*m + 0.2309699292*s,
		-1.2684380046*l + 2.6097574011*m - 0.3413193965*s,
		-0.0041960863*l - 0.7034186147*m + 1.7076147010*s,
	}
}

// gammaEncoded is the transfer function of sRGB.
func gammaEncoded(v float64) float64 {
	if v <= 0.0031308 {
		return 12.92 * v
	}
	return 1.055*math.Pow(v, 1/2.4) - 0.055
}
