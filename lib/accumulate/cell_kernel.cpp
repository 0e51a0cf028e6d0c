#include "accumulate/cell_kernel.h"

#include "accumulate/cell_kernel_sets.h"

namespace evenfield {

CellKernels cell_kernels(PixelType type, [[maybe_unused]] bool portable) {
#ifdef EVENFIELD_AVX2
  static const bool kHasAvx2 = __builtin_cpu_supports("avx2") != 0;
  if (kHasAvx2 && !portable) return cell_kernels_avx2(type);
#endif
  return cell_kernels_portable(type);
}

}  // namespace evenfield
