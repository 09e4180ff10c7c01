//go:build !amd64

package dense

// The processors that Go still supports fuse in hardware or, as 32-bit ones, have no choice of ours to make.
const hasFMA = true
