// Outputs under a full disk, a target that cannot be written, a limit, a kill at any moment and a closed
// pipe: the old file or the whole new one, never a part, never litter, and always a message with status 6.

#include <sys/mount.h>

#include <catch2/catch.hpp>

#include "faults/archive.hpp"
#include "support/draws.hpp"

using namespace ringwright::test;
using Catch::Contains;

namespace {

/// A file system of its own, where this user may make one.
class SmallDisk {
  public:
    SmallDisk(std::string folder, const char* size, unsigned long flags = 0) : folder_(std::move(folder)) {
        std::filesystem::create_directories(folder_);
        mounted_ = ::mount("none", folder_.c_str(), "tmpfs", flags, size) == 0;
    }
    SmallDisk(const SmallDisk&) = delete;
    SmallDisk& operator=(const SmallDisk&) = delete;
    ~SmallDisk() {
        if (mounted_) ::umount2(folder_.c_str(), MNT_DETACH);
    }
    [[nodiscard]] bool there() const { return mounted_; }
    void make_read_only() const {
        ::mount("none", folder_.c_str(), "tmpfs", MS_REMOUNT | MS_RDONLY, nullptr);
    }

  private:
    std::string folder_;
    bool mounted_ = false;
};

std::vector<std::string> entries_of(const std::string& folder) {
    std::vector<std::string> names;
    for (const auto& entry : std::filesystem::directory_iterator(folder))
        names.push_back(entry.path().filename().string());
    std::ranges::sort(names);
    return names;
}

/// Each way to write a file, as the arguments before its name.
std::vector<std::vector<std::string>> writers(const std::string& recording) {
    return {{"identify", recording, "-o"},
            {"identify", recording, "--format", "json", "-o"},
            {"identify", "--separate", recording, "--format", "csv", "-o"},
            {"inspect", recording, "-o"}};
}

double processor_seconds_of_children() {
    rusage used{};
    ::getrusage(RUSAGE_CHILDREN, &used);
    const auto seconds = [](timeval time) {
        return static_cast<double>(time.tv_sec) + 1e-6 * static_cast<double>(time.tv_usec);
    };
    return seconds(used.ru_utime) + seconds(used.ru_stime);
}

void check_refused(const Workplace& place, const Ending& ending) {
    INFO(place.read("err"));
    CHECK(ending.status == 6);
    CHECK(place.read("err").starts_with("ringwright: "));
    CHECK_THAT(place.read("err"), Contains("cannot be written"));
}

}  // namespace

TEST_CASE("a device without room ends with 6 and a message") {
    const Workplace place;
    const std::string recording = place.write("pluck.csv", pluck_csv(0.05, 1));
    for (std::vector<std::string> arguments : writers(recording)) {
        arguments.push_back("/dev/full");
        check_refused(place, run(arguments, {place.path("out"), place.path("err")}));
        arguments.resize(arguments.size() - 2);
        check_refused(place, run(arguments, {"/dev/full", place.path("err")}));
    }
}

TEST_CASE("a full disk leaves the old file") {
    const Workplace place;
    const std::string recording = place.write("pluck.csv", pluck_csv(0.05, 1));
    const SmallDisk disk(place.path("disk"), "size=8k");
    if (!disk.there()) {
        WARN("this user cannot make a small file system; a limit on the size of a file stands for it below");
        return;
    }
    place.write("disk/old.txt", "the old answer");
    place.write("disk/filler", std::string(4096, 'x'));
    for (std::vector<std::string> arguments : writers(recording)) {
        arguments.push_back(place.path("disk/old.txt"));
        check_refused(place, run(arguments, {place.path("out"), place.path("err")}));
        CHECK(place.read("disk/old.txt") == "the old answer");
        CHECK(entries_of(place.path("disk")) == std::vector<std::string>{"filler", "old.txt"});
    }
    // A batch keeps what is whole, and goes on when there is room.
    const std::vector<std::string> batch{"identify", "--separate", place.archive("archive", 4), "--resume",
                                         place.path("disk/run.jsonl")};
    std::filesystem::remove(place.path("disk/filler"));
    place.write("disk/old.txt", "");
    const Ending full = run(batch, {place.path("out"), place.path("err")});
    check_refused(place, full);
    CHECK_THAT(place.read("err"), Contains("run the same command again"));
    const std::string kept = place.read("disk/run.jsonl");
    CHECK((kept.empty() || kept.ends_with('\n')));
}

TEST_CASE("a file that may not grow leaves the old one, and a batch whole lines") {
    const Workplace place;
    const std::string recording = place.write("pluck.csv", pluck_csv(0.05, 1));
    const std::string old = place.write("kept/old.txt", "the old answer");
    const Circumstances limited{place.path("out"), place.path("err"), {}, {}, 200};
    for (std::vector<std::string> arguments : writers(recording)) {
        arguments.push_back(old);
        const Ending ending = run(arguments, limited);
        INFO(place.read("err"));
        CHECK(ending.status == 6);
        CHECK(bytes_of(old) == "the old answer");
        CHECK(entries_of(place.path("kept")) == std::vector<std::string>{"old.txt"});
    }
    const std::vector<std::string> batch{"identify", "--separate", place.archive("archive", 6), "--resume",
                                         place.path("run.jsonl")};
    CHECK(run(batch, {place.path("whole"), place.path("err")}).status == 3);
    const std::string whole = place.read("whole");
    std::filesystem::remove(place.path("run.jsonl"));
    const Circumstances roomy{"/dev/null", place.path("err"), {}, {}, 2 * whole.size() / 3};
    CHECK(run(batch, roomy).status == 6);
    const std::string kept = place.read("run.jsonl");
    CHECK_FALSE(kept.empty());
    CHECK(kept.ends_with('\n'));
    CHECK(whole.starts_with(kept));
    CHECK(run(batch, {place.path("out"), place.path("err")}).status == 3);
    CHECK(place.read("run.jsonl") == whole);
}

TEST_CASE("a target that cannot be written ends with 6") {
    const Workplace place;
    const std::string recording = place.write("pluck.csv", pluck_csv(0.05, 1));
    const SmallDisk disk(place.path("read-only"), "size=64k");
    place.write("read-only/old.txt", "the old answer");
    if (disk.there())
        disk.make_read_only();
    else
        ::chmod(place.path("read-only").c_str(), 0555);
    for (std::vector<std::string> arguments : writers(recording))
        for (const char* target :
             {"read-only/old.txt", "read-only/new.txt", "absent/new.txt", "pluck.csv/new.txt"}) {
            arguments.push_back(place.path(target));
            check_refused(place, run(arguments, {place.path("out"), place.path("err")}));
            arguments.pop_back();
        }
    CHECK(place.read("read-only/old.txt") == "the old answer");
    CHECK(run({"identify", "--separate", recording, "--resume", place.path("read-only/run.jsonl")},
              {place.path("out"), place.path("err")})
              .status == 6);
}

TEST_CASE("a kill at any moment of writing leaves the old file or the whole new one, and no litter") {
    const Workplace place;
    const std::string folder = place.archive("archive", 2);
    const std::string target = place.path("kept/answers.jsonl");
    const std::vector<std::string> arguments{"identify", "--separate", folder, "--format",
                                             "json",     "-o",         target};
    place.write("kept/answers.jsonl", "the old answers");
    CHECK(run(arguments).status == 0);
    const std::string whole = place.read("kept/answers.jsonl");
    Draws draws(20310511);
    int killed_before = 0;
    for (int i = 0; i < 40; ++i) {
        place.write("kept/answers.jsonl", "the old answers");
        Process process(arguments, {});
        process.kill_after(std::chrono::microseconds(static_cast<long>(6e4 * draws.uniform())));
        (void)process.wait();
        const std::string now = place.read("kept/answers.jsonl");
        CHECK((now == "the old answers" || now == whole));
        killed_before += now == whole ? 0 : 1;
        CHECK(entries_of(place.path("kept")) == std::vector<std::string>{"answers.jsonl"});
    }
    CHECK(killed_before > 0);
}

TEST_CASE("a closed pipe ends a batch quietly, long before its end") {
    const Workplace place;
    const std::string folder = place.archive("archive", 3), many = place.path("many");
    std::filesystem::create_directories(many);
    for (int i = 0; i < 2000; ++i)
        std::filesystem::create_hard_link(folder + "/000.csv", fmt::format("{}/{:04}.csv", many, i));
    const double begun = processor_seconds_of_children();
    const std::string command =
        fmt::format("'{}' identify --separate '{}' --format json 2>'{}' | head -n 1 >'{}'",
                    RINGWRIGHT_PROGRAM, many, place.path("err"), place.path("out"));
    CHECK(std::system(command.c_str()) == 0);
    CHECK(lines_of(place.read("out")).size() == 1);
    CHECK(place.read("err").empty());
    // 2,000 recordings take more than ten seconds of processor time; those that are begun before the first is
    // read, less than one. Wall time would be that of whoever else uses the machine.
    CHECK(processor_seconds_of_children() - begun < 5.0);
}
