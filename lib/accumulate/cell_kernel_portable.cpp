#include "accumulate/cell_kernel_sets.h"
#include "accumulate/cell_whole_portable.h"
// The loops take whichever set of functions came first.
#include "accumulate/cell_kernel_loops.h"

namespace evenfield {
CellKernels cell_kernels_portable(PixelType type) { return kernels_for(type); }
}  // namespace evenfield
