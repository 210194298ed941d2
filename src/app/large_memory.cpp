#include "app/large_memory.hpp"

#include <malloc.h>
#include <sys/mman.h>
#include <unistd.h>

#include <climits>
#include <cstdint>
#include <cstdlib>

namespace ringwright::app {

#if defined(__GLIBC__) && !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)

namespace {

// Moves the end of the heap to one small page before a large one. The C library writes a word there before
// any advice can be given, and a large page that has been touched stays one of small pages.
void start_before_large_page(std::uintptr_t small_page) {
    constexpr std::uintptr_t large_page = std::uintptr_t{1} << 21U;
    const auto end = reinterpret_cast<std::uintptr_t>(::sbrk(0));
    const std::uintptr_t rest = (2 * large_page - small_page - end % large_page) % large_page;
    static_cast<void>(::sbrk(static_cast<std::intptr_t>(rest)));
}

}  // namespace

void keep_freed_memory() {
    ::mallopt(M_MMAP_MAX, 0);  // Large blocks come from the heap too, of whatever thread.
    ::mallopt(M_TRIM_THRESHOLD, INT_MAX);
    // The heap grows once, untouched, so that the advice covers what is allocated later; addresses cost
    // nothing.
    const auto page = static_cast<std::uintptr_t>(::sysconf(_SC_PAGESIZE));
    start_before_large_page(page);
    constexpr std::size_t room = std::size_t{1} << 30U;
    void* heap = std::malloc(room);
    if (heap == nullptr) return;
    const std::uintptr_t begin = (reinterpret_cast<std::uintptr_t>(heap) + page - 1) / page * page;
    ::madvise(reinterpret_cast<void*>(begin), room - page, MADV_HUGEPAGE);
    std::free(heap);
}

#else

void keep_freed_memory() {}

#endif

}  // namespace ringwright::app
