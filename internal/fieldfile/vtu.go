package fieldfile

import (
	"encoding/binary"
	"encoding/xml"
	"io"
	"math"
	"strconv"
	"strings"

	"heatskin/mesh"
)

// WriteVTU writes m with its fields as an unstructured grid of VTK's XML format, version
// 1.0 (VTK User's Guide, chapter "VTK File Formats"): points and fields as doubles,
// triangles as cells. The numbers follow the XML as appended raw data, each array after
// its length in bytes, little endian, which is the form that needs no second copy in
// memory and keeps every bit. It panics if a column is not as long as m. The error is w's.
func WriteVTU(w io.Writer, m *mesh.Mesh, columns []Column) error {
	n, triangles := m.NumVertices(), m.NumTriangles()
	var arrays []vtuArray
	for _, c := range columns {
		if len(c.Values) != n {
			panic("fieldfile: a column is not as long as the mesh")
		}
		arrays = append(arrays, vtuFloats(c.Values))
	}
	points := vtuFloats(m.Positions)
	corners := vtuArray{4 * len(m.Triangles), len(m.Triangles), func(b []byte, i int) []byte {
		return binary.LittleEndian.AppendUint32(b, uint32(m.Triangles[i]))
	}}
	ends := vtuArray{8 * triangles, triangles, func(b []byte, i int) []byte {
		return binary.LittleEndian.AppendUint64(b, uint64(3*i+3))
	}}
	const vtkTriangle = 5
	kinds := vtuArray{triangles, triangles, func(b []byte, _ int) []byte { return append(b, vtkTriangle) }}
	arrays = append(arrays, points, corners, ends, kinds)

	var head strings.Builder
	offset := 0
	next := 0
	declare := func(attributes string) {
		head.WriteString(`<DataArray ` + attributes + ` format="appended" offset="` + strconv.Itoa(offset) + "\"/>\n")
		offset += 8 + arrays[next].bytes
		next++
	}
	head.WriteString("<?xml version=\"1.0\"?>\n" +
		"<VTKFile type=\"UnstructuredGrid\" version=\"1.0\" byte_order=\"LittleEndian\" header_type=\"UInt64\">\n<UnstructuredGrid>\n")
	head.WriteString(`<Piece NumberOfPoints="` + strconv.Itoa(n) + `" NumberOfCells="` + strconv.Itoa(triangles) + "\">\n<PointData")
	if len(columns) > 0 {
		head.WriteString(` Scalars="` + escaped(columns[0].Name) + `"`)
	}
	head.WriteString(">\n")
	for _, c := range columns {
		declare(`type="Float64" Name="` + escaped(c.Name) + `"`)
	}
	head.WriteString("</PointData>\n<Points>\n")
	declare(`type="Float64" NumberOfComponents="3" Name="Points"`)
	head.WriteString("</Points>\n<Cells>\n")
	declare(`type="Int32" Name="connectivity"`)
	declare(`type="Int64" Name="offsets"`)
	declare(`type="UInt8" Name="types"`)
	head.WriteString("</Cells>\n</Piece>\n</UnstructuredGrid>\n<AppendedData encoding=\"raw\">\n_")
	if _, err := io.WriteString(w, head.String()); err != nil {
		return err
	}
	for _, a := range arrays {
		if err := a.write(w); err != nil {
			return err
		}
	}
	_, err := io.WriteString(w, "\n</AppendedData>\n</VTKFile>\n")
	return err
}

// A vtuArray is one array of appended data: its size in bytes, its number of values,
// and how to append value i.
type vtuArray struct {
	bytes, count int
	append       func(b []byte, i int) []byte
}

func vtuFloats(values []float64) vtuArray {
	return vtuArray{8 * len(values), len(values), func(b []byte, i int) []byte {
		return binary.LittleEndian.AppendUint64(b, math.Float64bits(values[i]))
	}}
}

func (a vtuArray) write(w io.Writer) error {
	if _, err := w.Write(binary.LittleEndian.AppendUint64(nil, uint64(a.bytes))); err != nil {
		return err
	}
	return writeBlocks(w, (a.count+blockRows-1)/blockRows, func(b []byte, block int) []byte {
		for i := block * blockRows; i < min(a.count, (block+1)*blockRows); i++ {
			b = a.append(b, i)
		}
		return b
	})
}

// escaped is a name as an XML attribute may hold it.
func escaped(name string) string {
	var b strings.Builder
	_ = xml.EscapeText(&b, []byte(name)) // a Builder takes everything
	return b.String()
}
