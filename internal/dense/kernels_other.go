//go:build !amd64 || purego

package dense

const (
	useAVX512 = false
	useAVX2   = false
)

func subtractAVX512(*Product)                           { panic(missing) }
func subtractAVX2(*Product)                             { panic(missing) }
func solveRightAVX512(x, l *float64, blocks int)        { panic(missing) }
func solveRightTransAVX512(x, l *float64)               { panic(missing) }
func mulSubAVX512(y, p, x *float64, blocks, n int)      { panic(missing) }
func mulTransSubAVX512(s, p, y *float64, blocks, n int) { panic(missing) }
func solveRightAVX2(x, l *float64, blocks int)          { panic(missing) }
func mulSubAVX2(y, p, x *float64, blocks, n int)        { panic(missing) }
func mulTransSubAVX2(s, p, y *float64, blocks, n int)   { panic(missing) }

const missing = "dense: no assembly in this build"
