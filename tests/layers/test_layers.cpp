// The rooms of src/ and the arrows between them: reads every include of src/ and include/ and fails on one
// that runs back. What each room may use stands once, in the ringwright_room() calls of CMakeLists.txt.
#include <algorithm>
#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <map>
#include <regex>
#include <set>
#include <sstream>
#include <string>
#include <vector>

namespace fs = std::filesystem;

namespace {

struct Room {
    std::string name;
    std::set<std::string> uses;  ///< besides itself
};
using Rooms = std::vector<Room>;  ///< in the order of the pipeline

/// Room of each public header, by file name.
using HeaderRooms = std::map<std::string, std::string>;

struct SourceFile {
    std::string path;  ///< relative to the project
    std::string text;
};

const fs::path project = RINGWRIGHT_SOURCE;

std::string read(const fs::path& path) {
    std::ifstream file(path);
    std::ostringstream text;
    text << file.rdbuf();
    return text.str();
}

Rooms rooms_of(const std::string& cmake_lists) {
    Rooms rooms;
    const std::regex call(R"(\nringwright_room\((\w+)(?:\s+USES([\w\s]+))?\))");
    for (std::sregex_iterator found(cmake_lists.begin(), cmake_lists.end(), call), end; found != end;
         ++found) {
        std::istringstream used((*found)[2].str());
        rooms.push_back({(*found)[1].str(), {std::istream_iterator<std::string>(used), {}}});
    }
    return rooms;
}

std::vector<SourceFile> source_files() {
    std::vector<SourceFile> files;
    for (const char* folder : {"src", "include"})
        for (const auto& entry : fs::recursive_directory_iterator(project / folder))
            if (entry.path().extension() == ".cpp" || entry.path().extension() == ".hpp")
                files.push_back({fs::relative(entry.path(), project).generic_string(), read(entry.path())});
    return files;
}

std::vector<std::string> quoted_includes(const std::string& text) {
    std::vector<std::string> includes;
    const std::regex include(R"rx((?:^|\n)\s*#\s*include\s*"([^"]+)")rx");
    for (std::sregex_iterator found(text.begin(), text.end(), include), end; found != end; ++found)
        includes.push_back((*found)[1].str());
    return includes;
}

/// Public headers whose code is divided over several sources of a room, none of which has their name.
const HeaderRooms divided_headers{{"quality_statistics.hpp", "ledger"}};

/// A public header belongs to the room that has a source of its name, or else to the room of its name.
HeaderRooms rooms_of_headers(const std::vector<SourceFile>& files, const Rooms& rooms) {
    HeaderRooms of_header = divided_headers;
    for (const auto& room : rooms) of_header[room.name + ".hpp"] = room.name;
    for (const auto& file : files) {
        const fs::path path = file.path;
        if (path.extension() != ".cpp" || *path.begin() != "src") continue;
        const std::string header = path.stem().string() + ".hpp";
        if (fs::exists(project / "include/ringwright" / header))
            of_header[header] = path.parent_path().filename().string();
    }
    return of_header;
}

std::string room_of(const std::string& path, const HeaderRooms& of_header) {
    const std::string public_folder = "include/ringwright/", source_folder = "src/";
    if (path.starts_with(public_folder)) {
        const auto found = of_header.find(path.substr(public_folder.size()));
        return found == of_header.end() ? "" : found->second;
    }
    return path.substr(source_folder.size(), path.find('/', source_folder.size()) - source_folder.size());
}

bool may_use(const Rooms& rooms, const std::string& user, const std::string& used) {
    if (user == used || user == "app") return true;
    const auto room = std::find_if(rooms.begin(), rooms.end(), [&](const Room& r) { return r.name == user; });
    return room != rooms.end() && room->uses.contains(used);
}

/// What is wrong with the includes of one file; one sentence a fault.
std::vector<std::string> faults_of(const SourceFile& file, const Rooms& rooms, const HeaderRooms& of_header) {
    const std::string room = room_of(file.path, of_header);
    if (room.empty())
        return {file.path + " belongs to no room: name its source or the header after the room"};
    std::vector<std::string> faults;
    for (const std::string& include : quoted_includes(file.text)) {
        const bool is_public = include.starts_with("ringwright/");
        const std::string used =
            is_public ? room_of("include/" + include, of_header) : include.substr(0, include.find('/'));
        if (!is_public && used != room)
            faults.push_back(file.path + " includes " + include + ", which is private to another room");
        else if (!may_use(rooms, room, used))
            faults.push_back(file.path + " includes " + include + ": " + room + " may not use " + used);
    }
    return faults;
}

}  // namespace

TEST_CASE("no include runs back") {
    const Rooms rooms = rooms_of(read(project / "CMakeLists.txt"));
    const auto files = source_files();
    REQUIRE(rooms.size() >= 9);
    REQUIRE(files.size() > rooms.size());
    const HeaderRooms of_header = rooms_of_headers(files, rooms);
    for (const auto& file : files)
        for (const auto& fault : faults_of(file, rooms, of_header)) FAIL_CHECK(fault);
}

TEST_CASE("each room uses only rooms before it") {
    std::set<std::string> before;
    for (const auto& room : rooms_of(read(project / "CMakeLists.txt"))) {
        INFO("room " << room.name);
        for (const auto& used : room.uses) CHECK(before.contains(used));
        before.insert(room.name);
    }
}

TEST_CASE("the library neither prints nor exits") {
    const std::regex speech(
        R"((std::c(out|err|log)\b|\bprintf\s*\(|\bputs\s*\(|fmt::print|std::(quick_)?exit\b|\babort\s*\())");
    for (const auto& file : source_files()) {
        if (file.path.starts_with("src/app/")) continue;
        std::smatch found;
        if (std::regex_search(file.text, found, speech)) FAIL_CHECK(file.path << " calls " << found.str());
    }
}

TEST_CASE("the reader of includes sees a bad one") {
    const Rooms rooms = rooms_of(
        "\nringwright_room(value)\nringwright_room(recording USES value)\n"
        "ringwright_room(event   USES value recording)\n");
    REQUIRE(rooms.size() == 3);
    const HeaderRooms of_header{
        {"value.hpp", "value"}, {"recording.hpp", "recording"}, {"event.hpp", "event"}};
    const auto faults = [&](const std::string& path, const std::string& text) {
        return faults_of({path, text}, rooms, of_header).size();
    };
    CHECK(faults("src/event/find.cpp",
                 "#include \"ringwright/recording.hpp\"\n#include \"event/parts.hpp\"\n") == 0);
    CHECK(faults("src/app/main.cpp", "#include \"ringwright/event.hpp\"\n") == 0);
    CHECK(faults("src/recording/read.cpp", "// up\n #  include \"ringwright/event.hpp\"\n") == 1);
    CHECK(faults("include/ringwright/recording.hpp", "#include \"ringwright/event.hpp\"\n") == 1);
    CHECK(faults("src/event/find.cpp", "#include \"recording/csv.hpp\"\n") == 1);
    CHECK(faults("src/value/error.cpp", "#include \"ringwright/unknown.hpp\"\n") == 1);
    CHECK(faults("include/ringwright/unknown.hpp", "") == 1);
}

TEST_CASE("every page that a source names is there") {
    const std::regex page(R"(\bdocs/[a-z/_-]+\.md)");
    std::size_t named = 0;
    for (const auto& file : source_files())
        for (std::sregex_iterator found(file.text.begin(), file.text.end(), page), end; found != end;
             ++found) {
            INFO(file.path << " names " << found->str());
            CHECK(fs::exists(project / found->str()));
            ++named;
        }
    CHECK(named > 0);
}
