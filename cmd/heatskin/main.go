// Heatskin computes along-surface distances and heat on a meshed surface.
package main

import (
	"os"

	"heatskin/internal/cli"
)

func main() {
	os.Exit(cli.Main(os.Args[1:], cli.Streams{In: os.Stdin, Out: os.Stdout, Err: os.Stderr}))
}
