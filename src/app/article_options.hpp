#pragma once
// Options about the article, and the FILEs with the added mass that each belongs to.

#include <optional>
#include <string>
#include <vector>

#include "ringwright/property.hpp"

namespace CLI {
class App;
class Option;
}  // namespace CLI

namespace ringwright::app {

struct ArticleArguments {
    std::string mass, inertia, spring_mass, gravity;
};
void add_article_options(CLI::App& command, ArticleArguments& arguments);
/// Throws UsageError naming the option that has no meaning.
[[nodiscard]] Article article_from(const ArticleArguments& arguments);

/// FILE… with `--added-mass`, which follows the FILE that it belongs to.
struct FileArguments {
    std::vector<std::string> files, added_masses;
    CLI::Option* file_option = nullptr;
    CLI::Option* added_mass_option = nullptr;
};
/// An option --added-mass, which may be given once for each FILE.
CLI::Option* add_added_mass_option(CLI::App& command, std::vector<std::string>& added_masses);
void add_file_arguments(CLI::App& command, FileArguments& arguments);

struct LoadedFile {
    std::string file;
    std::optional<MeasuredValue> added_mass;
};
/// One option that takes FILEs, and its FILEs with the added masses that follow them.
struct FileSide {
    const CLI::Option* option = nullptr;
    std::vector<std::string> files;
    std::vector<LoadedFile> loaded = {};
};
/// Fills `loaded` of each side in the order of the command line. Throws UsageError for an added mass before
/// any FILE or a second one for the same, and for standard input named twice.
void load_sides(const CLI::App& command, const CLI::Option* added_mass_option,
                const std::vector<std::string>& added_masses, std::vector<FileSide>& sides);
/// In the order of the command line. Throws UsageError for an added mass before any FILE or a second one for
/// the same.
[[nodiscard]] std::vector<LoadedFile> files_from(const CLI::App& command, const FileArguments& arguments);

}  // namespace ringwright::app
