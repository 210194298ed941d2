// Many recordings: killed, interrupted, continued, split; and that none of it changes an answer.

#include <catch2/catch.hpp>

#include "faults/archive.hpp"
#include "support/draws.hpp"

using namespace ringwright::test;
using Catch::Contains;

namespace {

std::vector<std::string> batch_over(const std::string& folder, std::vector<std::string> more = {}) {
    std::vector<std::string> arguments{"identify", "--separate", folder, "--format", "json"};
    arguments.insert(arguments.end(), more.begin(), more.end());
    return arguments;
}

/// The answer of one run that nothing disturbs.
std::string undisturbed(const Workplace& place, const std::string& folder) {
    CHECK(run(batch_over(folder), {place.path("undisturbed"), place.path("err")}).status == 3);
    return place.read("undisturbed");
}

}  // namespace

TEST_CASE("a batch that is killed ten times and continued answers every recording once, in order") {
    const Workplace place;
    const std::string folder = place.archive("archive", 60);
    const std::string expected = undisturbed(place, folder);
    REQUIRE(lines_of(expected).size() == 60);
    Draws draws(20310402);
    const std::string kept = place.path("run.jsonl");
    std::size_t finished = 0;
    for (int kill = 0; kill < 10; ++kill) {
        Process process(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")});
        // Long enough to get on, short enough that ten kills do not see the end on an idle machine.
        process.kill_after(std::chrono::microseconds(static_cast<long>(1e5 * draws.uniform())));
        (void)process.wait();
        const std::string now = place.read("run.jsonl");
        const std::size_t whole = lines_of(now.substr(0, now.rfind('\n') + 1)).size();
        INFO("kill " << kill << " after " << whole << " lines");
        CHECK(whole >= finished);
        CHECK(expected.starts_with(now));
        finished = whole;
    }
    CHECK(run(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")}).status == 3);
    CHECK(place.read("run.jsonl") == expected);
    CHECK(place.read("out") == expected);
    // Once more, with nothing left to do: the same answer and the same status.
    CHECK(run(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")}).status == 3);
    CHECK(place.read("out") == expected);
    CHECK(place.read("run.jsonl") == expected);
}

TEST_CASE("a line that was torn is cut and its recording analysed again") {
    const Workplace place;
    const std::string folder = place.archive("archive", 6), kept = place.path("run.jsonl");
    const std::string expected = undisturbed(place, folder);
    // Torn anywhere: in the first line, in the last, between two, and with zero bytes as a loss of power
    // leaves them.
    Draws draws(7);
    for (int i = 0; i < 12; ++i) {
        const auto length = static_cast<std::size_t>(draws.uniform() * static_cast<double>(expected.size()));
        place.write("run.jsonl", expected.substr(0, length) + std::string(i % 3 == 0 ? 100 : 0, '\0'));
        CHECK(run(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")}).status ==
              3);
        INFO("torn after " << length << " bytes\n" << place.read("err"));
        CHECK(place.read("run.jsonl") == expected);
        CHECK(place.read("out") == expected);
    }
}

TEST_CASE("a resume file of another run, of other recordings or of no run is refused and left alone") {
    const Workplace place;
    const std::string folder = place.archive("archive", 4), other = place.archive("other", 4);
    const std::string kept = place.write("run.jsonl", undisturbed(place, folder));
    const auto refused = [&](const std::vector<std::string>& arguments, const char* why) {
        const std::string before = bytes_of(arguments.back());
        const Ending ending = run(arguments, {place.path("out"), place.path("err")});
        INFO(place.read("err"));
        CHECK(ending.status == 2);
        CHECK_THAT(place.read("err"), Contains(why));
        CHECK(place.read("out").empty());
        CHECK(bytes_of(arguments.back()) == before);
    };
    refused(batch_over(folder, {"--near", "5", "--resume", kept}), "its options were");
    refused(batch_over(other, {"--resume", kept}), "it is about");
    refused(batch_over(folder + "/000.csv", {"--resume", kept}), "this run has only 1 recording");
    refused(batch_over(folder, {"--resume", place.write("mine.txt", "my notes")}), "no answer of identify");
    refused(batch_over(folder, {"--resume", place.write("mine.json", "{\"a\": 1}\n")}),
            "no answer of identify");
    refused(batch_over(folder, {"--resume", place.path("archive/001.csv")}), "is one of the recordings");
    const std::string text = place.read("run.jsonl");
    std::string damaged = text;
    damaged[40] = '\x01';
    refused(batch_over(folder, {"--resume", place.write("damaged.jsonl", damaged)}), "it is damaged");
    place.write("archive/001.csv", pluck_csv(0.2, 99));
    refused(batch_over(folder, {"--resume", kept}), "other content");
    for (const std::vector<std::string>& wrong :
         {std::vector<std::string>{"--format", "text", "--separate", folder, "--resume", kept},
          {folder + "/000.csv", "--resume", kept},
          {folder + "/000.csv", "--shard", "1/2"},
          {"--separate", "-", "--resume", kept},
          {"--separate", folder, "--ledger", place.path("shop.ledger"), "--resume", kept}}) {
        std::vector<std::string> arguments{"identify"};
        arguments.insert(arguments.end(), wrong.begin(), wrong.end());
        CHECK(run(arguments).status == 2);
    }
    CHECK(place.read("run.jsonl") == text);
}

TEST_CASE("two runs do not write into one resume file") {
    const Workplace place;
    const std::string folder = place.archive("archive", 60), kept = place.path("run.jsonl");
    Process first(batch_over(folder, {"--resume", kept}), {});
    while (!std::filesystem::exists(kept) || std::filesystem::file_size(kept) == 0)
        std::this_thread::sleep_for(std::chrono::milliseconds(2));
    CHECK(run(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")}).status == 6);
    CHECK_THAT(place.read("err"), Contains("another run is writing to it"));
    CHECK(first.wait().status == 3);
    CHECK(place.read("run.jsonl") == undisturbed(place, folder));
}

TEST_CASE("Ctrl-C ends a batch at once, says what was finished, and leaves it to be continued") {
    const Workplace place;
    const std::string folder = place.archive("archive", 120), kept = place.path("run.jsonl");
    for (const int signal : {SIGINT, SIGTERM}) {
        std::filesystem::remove(kept);
        place.write("answers.jsonl", "the old answers");
        Process process(batch_over(folder, {"--resume", kept, "-o", place.path("answers.jsonl")}),
                        {place.path("out"), place.path("err")});
        while (!std::filesystem::exists(kept) || std::filesystem::file_size(kept) == 0)
            std::this_thread::sleep_for(std::chrono::milliseconds(2));
        const auto asked = std::chrono::steady_clock::now();
        process.kill(signal);
        const Ending ending = process.wait();
        // It is looked for ten times a second; the rest is for a machine that others load.
        CHECK(std::chrono::steady_clock::now() - asked < std::chrono::seconds(5));
        CHECK(ending.signal == signal);
        const std::size_t finished = lines_of(place.read("run.jsonl")).size();
        CHECK(finished < 120);
        CHECK_THAT(place.read("err"),
                   Contains(fmt::format("interrupted with {} of 120 recordings finished", finished)) &&
                       Contains("Run the same command again") && Contains("was not written"));
        CHECK(place.read("answers.jsonl") == "the old answers");
    }
    CHECK(run(batch_over(folder, {"--resume", kept}), {place.path("out"), place.path("err")}).status == 3);
    CHECK(files_in(place.read("out")).size() == 120);
}

TEST_CASE("answers do not depend on the number of threads or shards, and come in the order of the names") {
    const Workplace place;
    const std::string folder = place.archive("archive", 20);
    place.write("archive/notes.md", "not a recording");
    place.write("archive/.hidden.csv", "not meant");
    place.write("archive/deeper/000.csv", pluck_csv(0.1, 1));
    std::filesystem::rename(place.path("archive/019.csv"), place.path("archive/019.CSV"));
    const std::string expected = undisturbed(place, folder);
    CHECK_THAT(place.read("err"), Contains("3 entries were passed over") && Contains("notes.md") &&
                                      Contains("deeper") && Contains(".hidden.csv"));
    std::vector<std::string> names;
    for (int i = 0; i < 20; ++i)
        names.push_back(place.path(fmt::format("archive/{:03}.{}", i, i == 19 ? "CSV" : "csv")));
    CHECK(files_in(expected) == names);
    for (const char* jobs : {"1", "2", "5"}) {
        CHECK(run(batch_over(folder, {"--jobs", jobs}), {place.path("out"), place.path("err")}).status == 3);
        CHECK(place.read("out") == expected);
    }
    for (const int parts : {1, 2, 3, 7, 30}) {
        std::string together;
        std::vector<int> statuses;
        for (int part = 1; part <= parts; ++part) {
            statuses.push_back(run(batch_over(folder, {"--shard", fmt::format("{}/{}", part, parts)}),
                                   {place.path("out"), place.path("err")})
                                   .status);
            together += place.read("out");
        }
        CHECK(together == expected);
        CHECK(std::ranges::count(statuses, 3) == 1);
    }
    for (const char* wrong : {"0/3", "4/3", "1", "1/", "/3", "a/b", "1/0", "-1/3", "1/3/5"})
        CHECK(run(batch_over(folder, {"--shard", wrong})).status == 2);
    // The same through a pattern that no shell expanded, and as CSV.
    CHECK(run(batch_over(folder + "/*.[cC][sS][vV]"), {place.path("out"), place.path("err")}).status == 3);
    CHECK(place.read("out") == expected);
    std::string shards;
    for (const char* shard : {"1/2", "2/2"}) {
        (void)run({"identify", "--separate", folder, "--format", "csv", "--shard", shard},
                  {place.path("out"), place.path("err")});
        shards += place.read("out");
    }
    (void)run({"identify", "--separate", folder, "--format", "csv"}, {place.path("out"), place.path("err")});
    CHECK(shards == place.read("out"));
    CHECK(shards.starts_with("scope,"));
    CHECK_THAT(shards, Contains("003.csv,,,,,,,,,,,,,0.95,unusable,"));
}

TEST_CASE("a recording that cannot be used stops no other") {
    const Workplace place;
    const std::string folder = place.archive("archive", 8);
    std::filesystem::create_directories(place.path("empty"));
    const Ending ending = run({"identify", "--separate", place.path("empty"), folder,
                               place.path("absent.csv"), "--format", "json", "--from", "0.2", "--to", "2.9"},
                              {place.path("out"), place.path("err")});
    CHECK(ending.status == 3);
    const std::vector<std::string> lines = lines_of(place.read("out"));
    REQUIRE(lines.size() == 10);
    for (const std::size_t i : {0U, 4U, 9U}) {
        const Json error = Json::parse(lines[i])["recordings"][0]["error"];
        CHECK(error["exit_status"] == 3);
        CHECK_FALSE(error["cause"].get<std::string>().empty());
        CHECK_FALSE(error["remedy"].get<std::string>().empty());
    }
    CHECK_FALSE(Json::parse(lines[6])["result"].contains("method"));
    CHECK(Json::parse(lines[1])["result"]["method"] == "curve_fit");
}

TEST_CASE("the memory of a batch does not grow with the number of its recordings") {
    const Workplace place;
    const std::string one = place.write("one.csv", pluck_csv(0.05, 5));
    const auto peak_of = [&](int count) {
        const std::string folder = place.path(fmt::format("copies-{}", count));
        std::filesystem::create_directories(folder);
        for (int i = 0; i < count; ++i)
            std::filesystem::create_hard_link(one, fmt::format("{}/{:04}.csv", folder, i));
        return run(batch_over(folder, {"-o", place.path("answers.jsonl"), "--jobs", "2"})).peak_kilobytes;
    };
    const long few = peak_of(20), many = peak_of(400);
    INFO(few << " KB for 20, " << many << " KB for 400");
    // 380 answers of 9 KB alone would be 3.4 MB; the list of names and the allocator take less than 1 KB
    // each.
    CHECK(many - few < 2000);
}
