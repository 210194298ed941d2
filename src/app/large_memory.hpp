#pragma once
// How this process takes memory from the system.

namespace ringwright::app {

/// Keeps freed memory for what comes next, and asks for it in large pages. The fit of a long recording takes
/// and gives back blocks of many megabytes again and again; each time the system would hand out new pages,
/// zeroed one by one, which was more than half of the time of such a run (docs/speed.md). Does nothing where
/// the C library or the system cannot.
void keep_freed_memory();

}  // namespace ringwright::app
