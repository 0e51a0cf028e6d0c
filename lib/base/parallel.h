#pragma once
/// Independent pieces of work on a few threads.

#include <functional>

#include "base/error.h"

namespace evenfield {

/// Hardware threads of this machine, at least 1.
int hardware_threads();

/// Calls work(item, worker) for each item from 0 to items - 1, on `threads` workers numbered from 0. Items
/// are handed out in ascending order. After the first error no further item starts; the error of the lowest
/// item that failed is returned, so that the same input gives the same message for any number of threads. An
/// interrupt (see interrupt.h) ends it likewise, with Errc::interrupted.
Status for_each_item(int items, int threads, const std::function<Status(int item, int worker)>& work);

}  // namespace evenfield
