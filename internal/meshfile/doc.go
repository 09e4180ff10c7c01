// Package meshfile reads triangle meshes from STL, PLY, OBJ and OFF files, each
// also gzip-compressed. What the bytes say decides the format; a file's extension
// or a format named by the user only help where the bytes leave it open.
//
// The formats, as published: STL is the facet list of 3D Systems' stereolithography
// interface (80-byte header, uint32 count, 50 bytes a triangle, little endian; or
// its ASCII twin). PLY is Greg Turk's polygon format, version 1.0 (1994). OBJ is the
// Wavefront object file, of which v and f are read. OFF is the object file format
// of Geomview's manual, in three dimensions.
//
// All readers pull from one buffer of fixed size (source), so memory follows the
// mesh data that was really there: neither a header's promise nor a gzip bomb can
// claim more. A file is refused with a *SyntaxError that names line or byte, a
// *NoTrianglesError, or the reader's own error; oddities that leave the triangles
// readable are warnings.
package meshfile
