package cli

import (
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"runtime/pprof"

	"github.com/spf13/pflag"
)

// A profile is where to leave what the run spent its time and memory on, for
// `go tool pprof`. The flag is for those who work on the program, and hidden.
type profile struct {
	dir string
	cpu *os.File
}

func (p *profile) register(flags *pflag.FlagSet) {
	flags.StringVar(&p.dir, "profile", "", "leave cpu.prof and memory.prof in this `DIRECTORY`")
	if err := flags.MarkHidden("profile"); err != nil {
		panic(err)
	}
}

func (p *profile) start() error {
	if p.dir == "" {
		return nil
	}
	if err := os.MkdirAll(p.dir, 0o777); err != nil {
		return fmt.Errorf("--profile: %w", err)
	}
	f, err := os.Create(filepath.Join(p.dir, "cpu.prof"))
	if err != nil {
		return fmt.Errorf("--profile: %w", err)
	}
	if err := pprof.StartCPUProfile(f); err != nil {
		f.Close()
		return fmt.Errorf("--profile: %w", err)
	}
	p.cpu = f
	return nil
}

// finish writes what was gathered; a failure becomes *err unless there is one already.
func (p *profile) finish(err *error) {
	if p.cpu == nil {
		return
	}
	keep := func(e error) {
		if e != nil && *err == nil {
			*err = fmt.Errorf("--profile: %w", e)
		}
	}
	pprof.StopCPUProfile()
	keep(p.cpu.Close())
	f, e := os.Create(filepath.Join(p.dir, "memory.prof"))
	if e != nil {
		keep(e)
		return
	}
	runtime.GC() // so that the profile tells what is still held, not what is garbage
	keep(pprof.WriteHeapProfile(f))
	keep(f.Close())
}
