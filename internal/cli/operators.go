package cli

import (
	"errors"

	"heatskin/kernel"
)

// verticesOf are the surface vertices of datum i: the one where a point lies, or those
// along a line, with the ones that cutting faces has added there. After makeSolver.
func (g *ground) verticesOf(i int) []int32 {
	if v := g.surface.Site(i); v >= 0 {
		return []int32{v}
	}
	var list []int32
	for v, length := range g.solver.Along(i) {
		if length > 0 {
			list = append(list, int32(v))
		}
	}
	return list
}

// judged is sorted for what the kernel says of problems that do not fit the mesh.
func judged(err error) error {
	var (
		field  *kernel.FieldError
		steady *kernel.SteadyError
		target *kernel.TargetError
		option *kernel.OptionError
	)
	if errors.As(err, &field) || errors.As(err, &steady) || errors.As(err, &target) || errors.As(err, &option) {
		return refuse(err)
	}
	return sorted(err)
}
