//go:build !amd64 || purego

package dense

const (
	useAVX512 = false
	useAVX2   = false
)

func subtractAVX512(*Product)                           { panic("dense: no assembly in this build") }
func subtractAVX2(*Product)                             { panic("dense: no assembly in this build") }
func solveRightAVX512(x, l *float64, blocks int)        { panic("dense: no assembly in this build") }
func solveRightTransAVX512(x, l *float64)               { panic("dense: no assembly in this build") }
func mulSubAVX512(y, p, x *float64, blocks, n int)      { panic("dense: no assembly in this build") }
func mulTransSubAVX512(s, p, y *float64, blocks, n int) { panic("dense: no assembly in this build") }
