#include <fcntl.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <chrono>
#include <csignal>
#include <cstdlib>
#include <random>
#include <set>
#include <thread>

#include "ledger/ledger_fixture.hpp"

using namespace ringwright;
using namespace ringwright_test;

namespace {

/// Files entries until the count is reached, and tells each number through the pipe once it is filed.
[[noreturn]] void write_entries(const std::string& path, int pipe_end, int entries) {
    try {
        for (int i = 0; i < entries; ++i) {
            const EntrySummary filed = Ledger::open_or_create(path).add(new_entry());
            if (write(pipe_end, &filed.number, sizeof filed.number) != sizeof filed.number) _exit(2);
        }
    } catch (...) {
        _exit(3);
    }
    _exit(0);
}

struct Writer {
    pid_t process = 0;
    bool to_be_killed = false;
};

std::vector<Writer> start_writers(const std::string& path, int pipe_end, int count, int entries) {
    std::vector<Writer> writers;
    for (int i = 0; i < count; ++i) {
        const pid_t process = fork();
        if (process == 0) write_entries(path, pipe_end, entries);
        writers.push_back({process, i % 2 == 1});
    }
    return writers;
}

/// Kills half of them, each at a random moment within `span`.
void kill_half(const std::vector<Writer>& writers, std::mt19937_64& generator,
               std::chrono::milliseconds span) {
    std::uniform_int_distribution<long> moment(0, span.count());
    std::vector<std::pair<long, pid_t>> victims;
    for (const Writer& writer : writers)
        if (writer.to_be_killed) victims.emplace_back(moment(generator), writer.process);
    std::ranges::sort(victims);
    long now = 0;
    for (const auto& [when, process] : victims) {
        std::this_thread::sleep_for(std::chrono::milliseconds(when - now));
        now = when;
        kill(process, SIGKILL);
    }
}

/// The numbers that the writers said were filed, all of them or up to the moment of their end.
std::vector<std::int64_t> read_acknowledged(int pipe_end) {
    std::vector<std::int64_t> numbers;
    std::int64_t number = 0;
    while (read(pipe_end, &number, sizeof number) == sizeof number) numbers.push_back(number);
    return numbers;
}

/// How many writers: sixty with RINGWRIGHT_LONG_TESTS set, else twelve, which shows the same in a second.
int writer_count() {
    return std::getenv("RINGWRIGHT_LONG_TESTS") ? 60 : 12;
}

}  // namespace

// Seed 20313 for the moments of the kills. No tolerance: every acknowledged entry must be there.
TEST_CASE("many writers, half of them killed: every acknowledged entry is there and the chain holds") {
    const Folder folder;
    const std::string path = folder.file("shop.ledger");
    constexpr int entries_each = 8;
    int ends[2];
    REQUIRE(pipe(ends) == 0);
    const auto writers = start_writers(path, ends[1], writer_count(), entries_each);
    close(ends[1]);
    std::mt19937_64 generator(20313);
    std::thread killer(
        [&] { kill_half(writers, generator, std::chrono::milliseconds(25) * writer_count()); });
    const auto acknowledged = read_acknowledged(ends[0]);
    killer.join();
    close(ends[0]);
    int survivors = 0;
    for (const Writer& writer : writers) {
        int status = 0;
        REQUIRE(waitpid(writer.process, &status, 0) == writer.process);
        if (WIFEXITED(status)) survivors += WEXITSTATUS(status) == 0 ? 1 : 0;
        if (!writer.to_be_killed) CHECK((WIFEXITED(status) && WEXITSTATUS(status) == 0));
    }

    Ledger ledger = Ledger::open_or_create(path);
    const LedgerCheck checked = ledger.check();
    INFO(checked.fault);
    CHECK(checked.intact);
    std::set<std::int64_t> present;
    for (const auto& entry : ledger.list()) present.insert(entry.number);
    const std::set<std::int64_t> told(acknowledged.begin(), acknowledged.end());
    CHECK(told.size() == acknowledged.size());
    CHECK(std::ranges::includes(present, told));
    CHECK(survivors >= writer_count() / 2);
    // No lock is left: one more entry is filed at once.
    const auto begin = std::chrono::steady_clock::now();
    CHECK(ledger.add(new_entry()).number == static_cast<std::int64_t>(present.size()) + 1);
    CHECK(std::chrono::steady_clock::now() - begin < std::chrono::seconds(2));
}
