#pragma once
/// The instruction sets that the cell kernels are compiled for.

#include "accumulate/cell_kernel.h"

namespace evenfield {
CellKernels cell_kernels_portable(PixelType type);
#ifdef EVENFIELD_AVX2
CellKernels cell_kernels_avx2(PixelType type);
#endif
}  // namespace evenfield
