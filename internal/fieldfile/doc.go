// Package fieldfile writes and reads what belongs to the points of a mesh: fields as
// CSV and PLY, tables of named columns, and files that appear whole or not at all.
//
// CSV is that of RFC 4180 with LF line ends: a header row, commas, a point as decimal
// mark. Numbers are the shortest that read back to the same double; inf, -inf and nan
// stand for what is not finite. PLY is Greg Turk's polygon format, version 1.0 (1994),
// binary little endian.
package fieldfile
