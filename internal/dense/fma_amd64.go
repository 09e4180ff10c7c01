package dense

import "golang.org/x/sys/cpu"

var hasFMA = cpu.X86.HasFMA
