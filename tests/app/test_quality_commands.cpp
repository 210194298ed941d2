// verify, compare, sheet and ledger as a service shop runs them.

#include <SQLiteCpp/SQLiteCpp.h>

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

#include "app/bench_recordings.hpp"
#include "app/run_program.hpp"
#include "ringwright/conformity.hpp"
#include "ringwright/distributions.hpp"

using namespace ringwright;
using namespace ringwright::test;
using Catch::Detail::Approx;
using nlohmann::json;

namespace {

/// Three releases of one article.
std::vector<std::string> releases(const Bench& bench, const std::string& name, double damping_ratio,
                                  std::uint64_t seed) {
    std::vector<std::string> files;
    for (std::uint64_t i = 0; i < 3; ++i)
        files.push_back(bench.write(fmt::format("{}-{}.csv", name, i), pluck_csv(damping_ratio, seed + i)));
    return files;
}

std::vector<std::string> with(std::vector<std::string> first, const std::vector<std::string>& more) {
    first.insert(first.end(), more.begin(), more.end());
    return first;
}

std::string sheet(const std::string& limits, const std::string& serial = "0417",
                  const std::string& who = "day", const std::string& date = "2031-04-02") {
    return fmt::format(
        "[article]\ntype = \"sash damper S2\"\nserial = \"{}\"\nmass = \"3.20(1) kg\"\n[test]\n"
        "operator = \"{}\"\ndate = {}\n[limits]\n{}\n",
        serial, who, date, limits);
}

}  // namespace

TEST_CASE(
    "verify: conforms 0, does not conform 1, undecided 5, and the probability follows from the result") {
    const Bench bench;
    const auto files = releases(bench, "sash", 0.27, 1);
    const auto verify = [&](const std::string& limits) {
        const std::string path = bench.write("sheet.toml", sheet(limits));
        return bench.run(with({"verify", "--sheet", path, "--format", "json"}, files));
    };
    const Outcome good =
        verify("damping_ratio = { min = 0.22, max = 0.34 }\nnatural_frequency = { min = \"4 Hz\" }");
    CHECK(good.status == 0);
    const json result = json::parse(good.out);
    CHECK(result["schema"] == "ringwright.identification.v1");
    CHECK(result["verdict"]["decision"] == "conforms");
    CHECK(result["verdict"]["rule"] == "guarded acceptance");
    for (const json& limit : result["verdict"]["limits"]) {
        const json& estimate = result["result"]["quantities"][limit["quantity"].get<std::string>()];
        CHECK(limit["value"] == estimate["value"]);
        const double y = limit["value"], u = limit["standard_uncertainty"];
        double probability =
            limit.contains("upper") ? normal_probability((limit["upper"].get<double>() - y) / u) : 1.0;
        if (limit.contains("lower"))
            probability -= normal_probability((limit["lower"].get<double>() - y) / u);
        CHECK(limit["probability_of_conformity"].get<double>() == Approx(probability).margin(1e-12));
    }
    const Outcome bad = verify("damping_ratio = { max = 0.20 }");
    CHECK(bad.status == 1);
    CHECK(json::parse(bad.out)["verdict"]["decision"] == "does_not_conform");
    const double measured = result["result"]["quantities"]["damping_ratio"]["value"];
    const Outcome near = verify(fmt::format("damping_ratio = {{ max = {:.8f} }}", measured + 1e-5));
    CHECK(near.status == 5);
    const json limit = json::parse(near.out)["verdict"]["limits"][0];
    CHECK(limit["decision"] == "undecided");
    CHECK(limit["remedy"]["standard_uncertainty_needed"].get<double>() <
          limit["standard_uncertainty"].get<double>());
    // Not measured is undecided, too.
    CHECK(verify("friction_force = { max = \"1 N\" }").status == 4);  // more certainty would not help
}

TEST_CASE("verify: the command line wins over the sheet") {
    const Bench bench;
    const auto files = releases(bench, "sash", 0.27, 1);
    const std::string path = bench.write("sheet.toml", sheet("damping_ratio = { max = 0.268 }"));
    const auto mass = [&](const std::vector<std::string>& more) {
        const Outcome outcome =
            bench.run(with(with({"verify", "--sheet", path, "--format", "json"}, files), more));
        return json::parse(outcome.out)["article"]["mass"]["value"].get<double>();
    };
    CHECK(mass({}) == Approx(3.2));
    CHECK(mass({"--mass", "4.0 kg"}) == Approx(4.0));
    const Outcome simple = bench.run(
        with({"verify", "--sheet", path, "--rule", "simple acceptance", "--format", "json"}, files));
    CHECK(json::parse(simple.out)["verdict"]["rule"] == "simple acceptance");
    CHECK(bench.run(with({"verify", "--sheet", path, "--rule", "kind"}, files)).status == 2);
}

TEST_CASE("verify: recordings may be named in the sheet; what cannot be used is named") {
    const Bench bench;
    releases(bench, "sash", 0.27, 1);
    const std::string named = bench.write(
        "named.toml", sheet("damping_ratio = { min = 0.2 }") +
                          "[[recordings]]\nfile = \"sash-0.csv\"\n[[recordings]]\nfile = \"sash-1.csv\"\n");
    const Outcome outcome = bench.run({"verify", "--sheet", named, "--format", "json"});
    CHECK(outcome.status == 0);
    CHECK(json::parse(outcome.out)["recordings"].size() == 2);

    const std::string misspelt = bench.write("bad.toml", sheet("damping_ration = { min = 0.2 }"));
    const Outcome refused = bench.run({"verify", "--sheet", misspelt, bench.path("sash-0.csv")});
    CHECK(refused.status == 3);
    CHECK(refused.err.find("damping_ration") != std::string::npos);
    CHECK(refused.err.find("line 9") != std::string::npos);
    CHECK(bench.run({"verify", "--sheet", misspelt + ".absent", bench.path("sash-0.csv")}).status == 3);
    CHECK(bench.run({"verify", bench.path("sash-0.csv")}).status == 2);
    const std::string torsion = bench.write("torsion.toml", sheet("stiffness = { min = \"2 N m/rad\" }"));
    CHECK(bench.run({"verify", "--sheet", torsion, bench.path("sash-0.csv")}).status == 3);
    CHECK(bench.run({"verify", "--sheet", named, bench.write("flat.csv", "t,x\n0,0\n1,0\n2,0\n3,0\n")})
              .status != 0);
}

TEST_CASE("verify: a sheet without limits is refused, a limit on what the result lacks names the remedy") {
    const Bench bench;
    const auto files = releases(bench, "sash", 0.27, 1);
    const Outcome none = bench.run(
        with({"verify", "--sheet", bench.write("none.toml", "[article]\nserial = \"1\"\n")}, files));
    CHECK(none.status == 3);
    CHECK(none.err.find("no limit") != std::string::npos);
    CHECK(none.out.empty());
    const auto judged = [&](const std::string& limits) {
        const std::string path = bench.write("massless.toml", "[limits]\n" + limits);
        return bench.run(with({"verify", "--sheet", path, "--format", "json"}, files));
    };
    const std::string stiffness = "stiffness = { min = \"1 N/mm\" }\n";
    const Outcome lacking = judged(stiffness);
    CHECK(lacking.status == 4);
    CHECK(lacking.err.find("--mass") != std::string::npos);
    CHECK(json::parse(lacking.out)["verdict"]["decision"] == "undecided");
    CHECK(judged(stiffness + "damping_ratio = { min = 0.2 }\n").status == 4);
    CHECK(judged(stiffness + "damping_ratio = { min = 0.5 }\n").status == 1);  // what fails, fails
}

TEST_CASE("sheet: the template checks, a bad sheet does not") {
    const Bench bench;
    CHECK(bench.run({"sheet", "--template", "-o", bench.path("new.toml")}).status == 0);
    CHECK(bench.run({"sheet", bench.path("new.toml")}).status == 0);
    CHECK(bench.run({"sheet", bench.write("bad.toml", "[limit]\n")}).status == 3);
    CHECK(bench.run({"sheet", bench.write("far.toml", "[[recordings]]\nfile = \"absent.csv\"\n")}).status ==
          3);
    CHECK(bench.run({"sheet"}).status == 2);
}

TEST_CASE("compare: a changed damper is changed, an unchanged one is not") {
    const Bench bench;
    const auto before = releases(bench, "before", 0.27, 10);
    const auto worn = releases(bench, "worn", 0.19, 20);
    const auto same = releases(bench, "same", 0.27, 30);
    const auto compare = [&](const std::vector<std::string>& after) {
        return bench.run(with(
            with(with({"compare", "--format", "json", "--within", "5 %", "--before"}, before), {"--after"}),
            after));
    };
    const Outcome changed = compare(worn);
    REQUIRE(changed.status == 0);
    const json first = json::parse(changed.out);
    CHECK(first["schema"] == "ringwright.comparison.v1");
    const json damping = first["quantities"]["damping_ratio"];
    CHECK(damping["changed"] == true);
    CHECK(damping["ratio"]["value"].get<double>() == Approx(0.19 / 0.27).epsilon(0.05));
    CHECK(damping["equivalence"]["equivalent"] == false);
    const json second = json::parse(compare(same).out)["quantities"]["damping_ratio"];
    CHECK(second["changed"] == false);
    CHECK(second["p_value"].get<double>() > 0.05);
    CHECK(second["equivalence"]["equivalent"] == true);
    CHECK(
        bench.run({"compare", "--before", before[0], "--after", before[1], "--within", "nonsense"}).status ==
        2);
    CHECK(bench.run({"compare", "--before", before[0]}).status == 2);
}

TEST_CASE("ledger: filed, listed, charted, checked, exported, superseded, replayed") {
    const Bench bench;
    const std::string ledger = bench.path("shop.ledger");
    const auto run = [&](std::vector<std::string> arguments) {
        arguments.insert(arguments.begin(), "ledger");
        return bench.run(with(arguments, {"--ledger", ledger}));
    };
    CHECK(run({"list"}).status == 3);
    const std::string limits = "damping_ratio = { min = 0.22, max = 0.34 }";
    for (int i = 0; i < 4; ++i) {
        const std::string path = bench.write(fmt::format("sheet-{}.toml", i),
                                             sheet(limits, i < 2 ? "0417" : "0418", i % 2 ? "day" : "night",
                                                   fmt::format("203{}-04-02", i + 1)));
        const auto files = releases(bench, fmt::format("run{}", i), 0.27 + 0.003 * i, 100 + 10 * i);
        CHECK(bench.run(with({"verify", "--sheet", path, "--ledger", ledger}, files)).status == 0);
    }
    const Outcome listed = run({"list", "--serial", "0418", "--format", "json"});
    CHECK(listed.status == 0);
    CHECK(json::parse(listed.out)["entries"].size() == 2);
    CHECK(run({"list"}).out.find("sash damper S2") != std::string::npos);
    CHECK(run({"show", "3"}).out.find("damping ratio") != std::string::npos);
    CHECK(run({"show", "99"}).status == 3);
    CHECK(run({"chart"}).out.find("upper limit") != std::string::npos);
    CHECK(json::parse(run({"chart", "--format", "json"}).out)["values"].size() == 4);
    CHECK(json::parse(run({"capability", "--format", "json"}).out).contains("cpk"));
    CHECK(run({"capability", "--quantity", "stiffness"}).status == 2);
    CHECK(run({"capability", "--quantity", "stiffness", "--min", "2 N/mm"}).status == 0);
    CHECK(run({"gauge"}).status == 3);  // one measurement of each article by each operator
    CHECK(run({"check"}).status == 0);

    // The figures come out the same to the last digit from the same recordings, found by hash.
    const Outcome replayed = run({"replay", "2", "--format", "json"});
    CHECK(replayed.status == 0);
    CHECK(json::parse(replayed.out)["same"] == true);
    std::filesystem::create_directories(bench.path("archive"));
    for (int i = 0; i < 3; ++i)
        std::filesystem::rename(bench.path(fmt::format("run1-{}.csv", i)),
                                bench.path(fmt::format("archive/{}", i)));
    CHECK(run({"replay", "2"}).status == 3);
    CHECK(run({"replay", "2", bench.path("archive")}).status == 0);

    const Outcome result = bench.run({"identify", bench.path("run0-0.csv"), "--mass", "3.3 kg", "--format",
                                      "json", "-o", bench.path("one.json")});
    REQUIRE(result.status == 0);
    CHECK(run({"add", bench.path("one.json"), "--sheet", bench.path("sheet-0.toml")}).status == 0);
    CHECK(run({"replay", "5"}).status == 0);
    CHECK(run({"supersede", "5", "--reason", "loose cable"}).status == 0);
    CHECK(run({"supersede", "5", "--reason", "again"}).status == 3);
    CHECK(json::parse(run({"chart", "--format", "json"}).out)["values"].size() == 4);
    CHECK(run({"export"}).out.find("standard_uncertainty") != std::string::npos);
    CHECK(json::parse(run({"export", "--format", "json"}).out).size() == 6);

    {
        SQLite::Database database(ledger, SQLite::OPEN_READWRITE);
        database.exec("DROP TRIGGER entries_are_never_changed");
        database.exec(
            "UPDATE entries SET result = replace(result, 'curve_fit', 'curve_fid') WHERE number = 2");
    }
    const Outcome altered = run({"check"});
    CHECK(altered.status == 1);
    CHECK(altered.out.find("entry 2") != std::string::npos);
}

TEST_CASE("ledger: what cannot be used is refused with 3, what cannot be written with 6") {
    const Bench bench;
    const std::string notes = bench.write("notes.txt", std::string(4096, 'x'));
    CHECK(bench.run({"ledger", "list", "--ledger", notes}).status == 3);
    CHECK(bench.run({"ledger", "check", "--ledger", bench.path("absent")}).status == 3);
    const std::string file = bench.write("a.csv", pluck_csv(0.2, 5));
    CHECK(bench.run({"identify", file, "--ledger", bench.path("no/such/folder")}).status == 6);
    CHECK(bench.run({"identify", file, "--ledger", notes}).status == 3);
    CHECK(bench.run({"ledger", "add", bench.write("x.json", "{}"), "--ledger", bench.path("new")}).status ==
          3);
    CHECK(bench.run({"identify", file, "--ledger", bench.path("new")}).status == 0);
    CHECK(bench.run({"ledger", "list", "--since", "2031-02-30", "--ledger", bench.path("new")}).status == 2);
}
