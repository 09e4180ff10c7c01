package cli

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"github.com/spf13/pflag"

	"heatskin/internal/fieldfile"
	"heatskin/kernel"
	"heatskin/mesh"
)

// conditionFlags say what happens at edges and over the faces: --hold-boundary
// --hold-file --edge-loss --face-loss.
type conditionFlags struct {
	hold     sourceFlags // loops that are held, by heldAt
	heldAt   []float64
	lose     sourceFlags // loops that exchange heat, by edgeLoss
	edgeLoss []loss
	faceLoss *loss
	file     string // of vertices that are held

	said  map[int]string // what the command line says of each loop
	table *fieldfile.Table
}

// A loss is an exchange with surroundings of the value ambient.
type loss struct{ coefficient, ambient float64 }

func (c *conditionFlags) register(flags *pflag.FlagSet) {
	c.hold.word, c.lose.word, c.said = "hold", "lose", map[int]string{}
	varFunc(flags, "hold-boundary", "", "hold boundary loop K at a value, as `K=VALUE` (repeatable)", func(text string) error {
		find, values, err := c.loop(text, "held", "VALUE")
		if err == nil {
			c.hold.asked, c.heldAt = append(c.hold.asked, find), append(c.heldAt, values[0])
		}
		return err
	})
	flags.StringVar(&c.file, "hold-file", "", "hold vertices, and the edges and faces all of whose corners are held, at the values of `FILE.csv`, columns vertex,value; it goes before --hold-boundary")
	varFunc(flags, "edge-loss", "", "boundary loop K loses COEFFICIENT * (u - AMBIENT) per length and second, as `K=COEFFICIENT,AMBIENT` (repeatable)", func(text string) error {
		find, values, err := c.loop(text, "losing", "COEFFICIENT", "AMBIENT")
		if err == nil {
			c.lose.asked, c.edgeLoss = append(c.lose.asked, find), append(c.edgeLoss, loss{values[0], values[1]})
		}
		return err
	})
	varFunc(flags, "face-loss", "", "the whole face loses `COEFFICIENT,AMBIENT`: coefficient * (u - ambient) per area and second", func(text string) error {
		values, err := numbers(text, "COEFFICIENT", "AMBIENT")
		if err == nil {
			c.faceLoss = &loss{values[0], values[1]}
		}
		return err
	})
}

// loop reads K= and the numbers behind it. A loop has one condition.
func (c *conditionFlags) loop(text, state string, names ...string) (asked, []float64, error) {
	number, rest, found := strings.Cut(text, "=")
	if !found {
		return nil, nil, fmt.Errorf("want K=%s, K being a boundary loop as check numbers them", strings.Join(names, ","))
	}
	k, err := whole(number, 0)
	if err != nil {
		return nil, nil, fmt.Errorf("boundary loop %q: %w", number, err)
	}
	if was := c.said[k]; was != "" {
		return nil, nil, fmt.Errorf("boundary loop %d is %s already", k, was)
	}
	c.said[k] = state
	values, err := numbers(rest, names...)
	if err != nil {
		return nil, nil, err
	}
	find, err := atBoundary(number)
	return find, values, err
}

// numbers reads finite numbers with commas between them; a coefficient is 0 or more.
func numbers(text string, names ...string) ([]float64, error) {
	words := strings.Split(text, ",")
	if len(words) != len(names) {
		return nil, fmt.Errorf("want %s", strings.Join(names, ","))
	}
	values := make([]float64, len(words))
	for i, word := range words {
		var err error
		if values[i], err = finite(word); err != nil {
			return nil, fmt.Errorf("%s: %w", names[i], err)
		}
		if names[i] == "COEFFICIENT" && values[i] < 0 {
			return nil, errors.New("COEFFICIENT: want a number of at least 0")
		}
	}
	return values, nil
}

// any tells whether there is a condition at all.
func (c *conditionFlags) any() bool { return len(c.said) > 0 || c.file != "" || c.faceLoss != nil }

// open reads the table of held vertices, as far as that can be done without the mesh.
func (c *conditionFlags) open() (err error) {
	if c.file != "" {
		c.table, err = readTable(c.file, "vertex", "value")
	}
	return refuse(err)
}

// heldVertices are the values that the table holds the vertices of a mesh at, NaN
// where they are free.
func (c *conditionFlags) heldVertices(s *mesh.Surface, n int) ([]float64, error) {
	rows, err := c.table.Floats("value")
	if err != nil {
		return nil, err
	}
	values, lines, err := byVertex(c.table, "value", rows, n)
	if err != nil {
		return nil, err
	}
	for v, line := range lines {
		if line > 0 && s.NoValue[v] {
			return nil, &fieldfile.TableError{File: c.file, Line: line, Column: "vertex",
				Want: "a vertex in a triangle of positive area", Got: fmt.Sprint(v)}
		}
	}
	return values, nil
}

// apply adds the conditions to a problem. The ground's data from number first on are
// the held loops and then the losing ones. The error is a refusal.
func (c *conditionFlags) apply(pr *kernel.Problem, g *ground, first int) error {
	n := g.surface.NumVertices
	if len(c.heldAt) > 0 || c.table != nil {
		pr.Hold = make([]float64, n)
		for v := range pr.Hold {
			pr.Hold[v] = math.NaN()
		}
	}
	for i, value := range c.heldAt {
		for _, v := range g.verticesOf(first + i) {
			pr.Hold[v] = value
		}
	}
	if c.table != nil {
		held, err := c.heldVertices(g.surface, g.original.NumVertices())
		if err != nil {
			return refuse(err)
		}
		for v, x := range g.carry(held) {
			if !math.IsNaN(x) {
				pr.Hold[v] = x
			}
		}
	}
	first += len(c.heldAt)
	for i, l := range c.edgeLoss {
		e := g.solver.EdgeExchange(first+i, l.coefficient, l.ambient)
		e.Name = g.data[first+i].Name
		pr.Exchanges = append(pr.Exchanges, e)
	}
	if l := c.faceLoss; l != nil {
		pr.Exchanges = append(pr.Exchanges, g.solver.FaceExchange(l.coefficient, l.ambient))
	}
	return nil
}
