#include "accumulate/cell_kernel_sets.h"
#include "accumulate/cell_whole_avx2.h"
// The loops take whichever set of functions came first.
#include "accumulate/cell_kernel_loops.h"

namespace evenfield {
CellKernels cell_kernels_avx2(PixelType type) { return kernels_for(type); }
}  // namespace evenfield
