#include "accumulate/cell_kernel_loops.h"
#include "accumulate/cell_kernel_sets.h"

namespace evenfield {
CellKernels cell_kernels_avx2(PixelType type) { return kernels_for(type); }
}  // namespace evenfield
