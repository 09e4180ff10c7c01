/* flush() has this thread, and those that it starts later, take numbers below 1e-308 for
   zero. Far from the source the factor is full of them, and each costs a hundred cycles.
   A library of its own, because it has to run before OpenBLAS is loaded and starts threads. */

#ifdef __SSE2__
#include <xmmintrin.h>
void flush(void) { _mm_setcsr(_mm_getcsr() | 0x8040); /* results, operands */ }
#else
void flush(void) {}
#endif
