#include "app/large_memory.hpp"

#include <malloc.h>
#include <sys/mman.h>
#include <unistd.h>

#include <climits>
#include <cstdint>
#include <cstdlib>

namespace ringwright::app {

#if defined(__GLIBC__) && !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)

void keep_freed_memory() {
    ::mallopt(M_MMAP_MAX, 0);  // Large blocks come from the heap too, of whatever thread.
    ::mallopt(M_TRIM_THRESHOLD, INT_MAX);
    // The heap grows once, untouched, so that the advice covers what is allocated later; addresses cost
    // nothing.
    constexpr std::size_t room = std::size_t{1} << 30U;
    void* heap = std::malloc(room);
    if (heap == nullptr) return;
    const auto page = static_cast<std::uintptr_t>(::sysconf(_SC_PAGESIZE));
    const std::uintptr_t begin = (reinterpret_cast<std::uintptr_t>(heap) + page - 1) / page * page;
    ::madvise(reinterpret_cast<void*>(begin), room - page, MADV_HUGEPAGE);
    std::free(heap);
}

#else

void keep_freed_memory() {}

#endif

}  // namespace ringwright::app
