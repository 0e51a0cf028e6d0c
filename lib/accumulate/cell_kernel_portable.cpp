#include "accumulate/cell_kernel_loops.h"
#include "accumulate/cell_kernel_sets.h"

namespace evenfield {
CellKernels cell_kernels_portable(PixelType type) { return kernels_for(type); }
}  // namespace evenfield
